"""Requests to the page and their answers, with a page that is played by the test."""

from __future__ import annotations

import re
import threading
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from IPython.core.interactiveshell import InteractiveShell

from batten.errors import InputError
from batten.errors.notebook import not_inserted
from batten.notebook import insertion
from batten.notebook.insertion import Answer, current_cell_id, insert_below, new_button_token, put_in_next_cell

PLUGIN = Path(__file__).parents[2] / "src/batten/notebook/labextension/plugin.js"
CLICK = {"header": {"session": "this tab"}, "metadata": {}}
RUN = {"header": {"session": "this tab"}, "metadata": {"cellId": "c1"}}


class Shell:
    """Stands in for a kernel's shell that is handling `parent`."""

    kernel = object()

    def __init__(self, parent: dict[str, Any]) -> None:
        self.parent = parent

    def get_parent(self) -> dict[str, Any]:
        return self.parent


class Comm:
    """Stands in for a comm; `page` is called with the request and may close it there and then."""

    def __init__(self, page: Callable[[Comm], None]) -> None:
        self.page = page

    def on_close(self, callback: Callable[[dict[str, Any]], None]) -> None:
        self.callback = callback

    def open(self, *, data: dict[str, Any]) -> None:
        self.request = data
        self.page(self)

    def close_from_page(self, data: dict[str, Any] | None) -> None:
        self.callback({"content": {} if data is None else {"data": data}})


@pytest.fixture
def page(monkeypatch: pytest.MonkeyPatch) -> Callable[[Callable[[Comm], None]], list[Comm]]:
    """Return a function that installs a page and gives the list of comms it will get."""

    def install(answer: Callable[[Comm], None]) -> list[Comm]:
        comms: list[Comm] = []

        def create_comm(*, target_name: str, primary: bool) -> Comm:
            assert (target_name, primary) == ("batten.insert", False)
            comms.append(Comm(answer))
            return comms[-1]

        monkeypatch.setattr(insertion, "create_comm", create_comm)
        monkeypatch.setattr(insertion, "get_ipython", lambda: Shell(CLICK))
        return comms

    return install


def ask(**options: Any) -> tuple[list[Answer], threading.Event]:
    """Ask for a cell; return the answers so far, and an event set at the first."""
    answers: list[Answer] = []
    came = threading.Event()

    def on_reply(answer: Answer) -> None:
        answers.append(answer)
        came.set()

    insert_below("x = 1", cell_id="c1", button_token="b1", on_reply=on_reply, **options)
    return answers, came


def timers() -> list[threading.Timer]:
    return [thread for thread in threading.enumerate() if isinstance(thread, threading.Timer)]


def test_the_request_names_the_cell_the_button_and_the_tab(page: Any) -> None:
    comms = page(lambda comm: None)
    ask(unless="c7")
    assert comms[0].request == {
        "op": "insert",
        "source": "x = 1",
        "cell_id": "c1",
        "button": "b1",
        "client": "this tab",
        "unless": "c7",
    }
    comms[0].close_from_page(None)


def test_an_answer_that_comes_while_the_comm_is_being_opened_is_heard_and_ends_the_timer(page: Any) -> None:
    page(lambda comm: comm.close_from_page({"status": "inserted", "index": 3, "cell_id": "c9"}))
    answers, _ = ask(timeout=60)
    assert answers == [Answer("inserted", index=3, cell_id="c9")]
    for timer in timers():
        timer.join(10)
        assert not timer.is_alive()


@pytest.mark.parametrize("data", [None, {}])
def test_a_close_without_data_means_that_there_is_no_plugin(page: Any, data: dict[str, Any] | None) -> None:
    page(lambda comm: comm.close_from_page(data))
    assert ask()[0] == [Answer("error", "no-plugin")]


def test_a_fault_in_the_page_arrives_with_its_words(page: Any) -> None:
    page(lambda comm: comm.close_from_page({"status": "error", "reason": "error", "detail": "no model", "more": 1}))
    assert ask()[0] == [Answer("error", "error", detail="no model")]


def test_a_silent_page_is_given_up_and_its_late_answer_dropped(page: Any) -> None:
    comms = page(lambda comm: None)
    answers, came = ask(timeout=0.01)
    assert came.wait(10)
    comms[0].close_from_page({"status": "inserted"})
    assert answers == [Answer("error", "timeout")]


def race(comms: list[Comm]) -> list[Answer]:
    """Let the page's answer and the timer's come at the same moment, on two threads; return what was passed on."""
    answers, _ = ask(timeout=60)
    [timer] = timers()
    both = threading.Barrier(2)

    def page_answers() -> None:
        both.wait()
        comms[-1].close_from_page({"status": "inserted"})

    def timer_runs_out() -> None:
        both.wait()
        timer.function(*timer.args)

    threads = [threading.Thread(target=page_answers), threading.Thread(target=timer_runs_out)]
    for thread in threads:
        thread.start()
    for thread in [*threads, timer]:
        thread.join()
    return answers


def test_one_answer_arrives_when_page_and_timer_speak_at_once(page: Any) -> None:
    comms = page(lambda comm: None)
    winners = [race(comms) for _ in range(300)]
    assert {len(answers) for answers in winners} == {1}


def test_outside_a_kernel_the_answer_is_immediate(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(insertion, "get_ipython", lambda: None)
    assert ask()[0] == [Answer("error", "no-kernel")]


def test_the_cell_is_known_while_it_runs_and_in_no_callback(monkeypatch: pytest.MonkeyPatch) -> None:
    for shell, cell_id in [(Shell(RUN), "c1"), (Shell(CLICK), None), (Shell({}), None), (object(), None), (None, None)]:
        monkeypatch.setattr(insertion, "get_ipython", lambda shell=shell: shell)
        assert current_cell_id() == cell_id


def test_a_terminal_gets_the_code_at_its_next_prompt(monkeypatch: pytest.MonkeyPatch) -> None:
    shell = InteractiveShell()
    monkeypatch.setattr(insertion, "get_ipython", lambda: shell)
    put_in_next_cell("a = 1\nb = 2\n")
    assert shell.rl_next_input == "a = 1\nb = 2"


def test_outside_ipython_there_is_no_next_cell(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(insertion, "get_ipython", lambda: None)
    with pytest.raises(InputError) as caught:
        put_in_next_cell("a = 1")
    assert str(caught.value) == (
        "There is no cell to put the code into.\n"
        "This Python runs outside IPython and Jupyter.\n"
        "Use the text itself: print(exam.code())."
    )


def test_the_plugin_uses_the_same_names() -> None:
    names = dict(re.findall(r"const ([A-Z_]+) = '([^']+)';", PLUGIN.read_text(encoding="utf-8")))
    for name in ("TARGET", "BUTTON_PREFIX", "KEYS_CLASS"):
        assert names[name] == getattr(insertion, name)
    assert new_button_token().startswith(names["BUTTON_PREFIX"])
    assert new_button_token() != new_button_token()


@pytest.mark.parametrize("reason", ["no-plugin", "timeout", "cell-not-found", "no-kernel", "error"])
def test_every_reason_has_its_own_words_and_a_way_out(reason: str) -> None:
    error = not_inserted(reason, magic="%batten code y ~ x")
    assert error.do == "Copy the code, or run %batten code y ~ x in a cell."
    others = {not_inserted(other).seen for other in ("no-plugin", "timeout", "cell-not-found", "no-kernel", "error")}
    assert len(others) == 5
    assert error.seen in others
