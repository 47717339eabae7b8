"""The code panel's states, with answers that the test gives."""

from __future__ import annotations

import threading
from collections.abc import Callable
from html.parser import HTMLParser
from typing import Any

import nbformat
import pytest
from nbclient import NotebookClient

from batten.errors import BattenError
from batten.notebook import code_panel
from batten.notebook.code_panel import ALREADY, INSERTED, NOT_YET, SENDING, CodePanel
from batten.notebook.insertion import Answer

MAGIC = "%batten code log y ~ x"


class Page:
    """Keeps what a panel asks for; the test answers."""

    def __init__(self) -> None:
        self.asked: list[dict[str, Any]] = []

    def insert_below(self, source: str, **options: Any) -> None:
        self.asked.append({"source": source, **options})

    def answer(self, *answer: str, **parts: str) -> None:
        self.asked[-1]["on_reply"](Answer(*answer, **parts))


@pytest.fixture
def page(monkeypatch: pytest.MonkeyPatch) -> Page:
    played = Page()
    monkeypatch.setattr(code_panel, "insert_below", played.insert_below)
    return played


def words(html: str) -> str:
    """Return the text a reader sees, line by line."""
    parts: list[str] = []
    parser = HTMLParser()
    parser.handle_data = parts.append  # type: ignore[method-assign]
    parser.handle_starttag = lambda tag, _: parts.append("\n") if tag == "br" else None  # type: ignore[method-assign]
    parser.feed(html)
    parser.close()
    return "".join(parts)


def state(panel: CodePanel) -> tuple[str, bool]:
    return words(panel.status.value), panel.button.disabled


def test_a_press_is_sent_once_and_reported(page: Page) -> None:
    panel = CodePanel("x = 1", magic=MAGIC, cell_id="c1")
    panel.button.click()
    assert state(panel) == (SENDING, True)
    panel.button.click()  # the second click of a double click
    assert len(page.asked) == 1
    assert page.asked[0]["source"] == "x = 1"
    assert page.asked[0]["cell_id"] == "c1"
    assert page.asked[0]["button_token"] in panel.button._dom_classes
    page.answer("inserted", cell_id="new")
    assert state(panel) == (INSERTED, False)


def test_a_second_press_asks_about_the_first_cell_and_a_third_does_not(page: Page) -> None:
    panel = CodePanel("x = 1", magic=MAGIC)
    for answer, said in [("inserted", INSERTED), ("already", ALREADY), ("inserted", INSERTED)]:
        panel.press()
        page.answer(answer, cell_id="new")
        assert state(panel) == (said, False)
    assert [asked["unless"] for asked in page.asked] == [None, "new", None]


def test_a_failure_is_told_in_three_parts_and_can_be_tried_again(page: Page) -> None:
    panel = CodePanel("x = 1", magic="%batten code <b>")
    for _ in range(2):
        panel.press()
        page.answer("error", "cell-not-found")
        assert state(panel) == (
            "The code was not put into a new cell.\n"
            "The cell that holds this panel is no longer in the notebook.\n"
            "Copy the code, or run %batten code <b> in a cell.",
            False,
        )
    assert "<b>" not in panel.status.value


def test_outside_a_kernel_the_panel_says_so() -> None:
    panel = CodePanel("x = 1", magic=MAGIC)
    panel.press()
    said, disabled = state(panel)
    assert said.splitlines()[1] == "This session has no notebook page to put a cell into."
    assert not disabled


def test_code_is_written_late_once_and_shown_as_text(page: Page) -> None:
    calls = []

    def write() -> str:
        calls.append(1)
        return "\n</pre><script>a & b</script>"

    panel = CodePanel(write, magic=MAGIC)
    assert (words(panel.shown.value), panel.copy.value, calls) == (NOT_YET, "", [])
    assert panel.draw() == "\n</pre><script>a & b</script>"
    panel.press()
    assert calls == [1]
    assert "<script>" not in panel.shown.value
    assert words(panel.shown.value) == "\n\n</pre><script>a & b</script>"  # a browser drops the first newline of <pre>
    assert ">Copy</button>" in panel.copy.value


def test_code_that_cannot_be_written_says_why_and_leaves_the_button(page: Page) -> None:
    def write() -> str:
        raise BattenError("wrong", "seen", "do <this>")

    panel = CodePanel(write, magic=MAGIC)
    panel.press()
    assert state(panel) == ("wrong\nseen\ndo <this>", False)
    assert page.asked == []


def test_a_fault_in_writing_is_not_hidden_and_leaves_the_button(page: Page) -> None:
    def write() -> str:
        raise ZeroDivisionError

    panel = CodePanel(write, magic=MAGIC)
    for _ in range(2):
        with pytest.raises(ZeroDivisionError):
            panel.press()
        assert state(panel) == ("", False)


def test_presses_and_answers_on_many_threads_send_one_request_at_a_time(page: Page) -> None:
    panel = CodePanel("x = 1", magic=MAGIC)
    for _ in range(50):
        before = len(page.asked)
        _together([panel.press] * 4)
        assert len(page.asked) == before + 1
        _together([lambda: page.answer("error", "timeout")])
        assert not panel.button.disabled


def _together(calls: list[Callable[[], None]]) -> None:
    threads = [threading.Thread(target=call) for call in calls]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()


@pytest.fixture(scope="module")
def executed() -> list[str]:
    """Run a panel in a real kernel without a page: nobody will answer. Return what the cells print."""
    cells = [
        "import threading, time\nfrom batten.notebook.code_panel import CodePanel\n"
        "panel = CodePanel('x = 1', magic='%batten code y ~ x')\nready = threading.Event()\n"
        "panel.button.observe(lambda change: change.new or ready.set(), 'disabled')",
        "start = time.monotonic()\npanel.button.click()\nprint(time.monotonic() - start < 1, panel.button.disabled)",
        "print(ready.wait(20), panel.button.disabled)\nprint(panel.status.value)",
    ]
    notebook = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(cell) for cell in cells])
    NotebookClient(notebook, timeout=60, kernel_name="python3").execute()
    return ["".join(output.get("text", "") for output in cell.outputs) for cell in notebook.cells]


def test_in_a_real_kernel_a_press_does_not_block(executed: list[str]) -> None:
    assert executed[1] == "True True\n"


def test_in_a_real_kernel_silence_ends_in_the_fallback(executed: list[str]) -> None:
    waited, said = executed[2].split("\n", 1)
    assert waited == "True False"
    assert words(said).splitlines()[1].startswith("The page has not answered so far")
