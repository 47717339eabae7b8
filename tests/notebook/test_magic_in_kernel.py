"""The magics in a real kernel: outputs, the payload for the next cell, progress, names that try to be markup."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from typing import Any

import pytest
from jupyter_client.manager import start_new_kernel

VIEW = "application/vnd.jupyter.widget-view+json"
QUICK = "--only 'log y ~ log x' --folds 2 --repeats 1"
CELL = f"%%batten castings {QUICK}\nminutes ~ mass_kg"
SETUP = """
%load_ext batten
import batten
import batten.notebook.progress as progress
castings = batten.sample("castings").head(60)
"""

Run = Callable[[str], tuple[list[dict[str, Any]], str, list[dict[str, Any]]]]


@pytest.fixture(scope="module")
def run() -> Iterator[Run]:
    """Runs a cell; returns its outputs as a page would hold them, its errors, and the payload."""
    manager, client = start_new_kernel(kernel_name="python3", env={**os.environ, "OMP_NUM_THREADS": "1"})

    def run_cell(code: str) -> tuple[list[dict[str, Any]], str, list[dict[str, Any]]]:
        shown: dict[str, dict[str, Any]] = {}
        errors: list[str] = []

        def hear(message: dict[str, Any]) -> None:
            kind, content = message["msg_type"], message["content"]
            if kind in ("display_data", "update_display_data", "execute_result"):
                place = content.get("transient", {}).get("display_id", str(len(shown)))
                assert (place in shown) is (kind == "update_display_data")
                shown[place] = content["data"]
            elif kind == "stream" and content["name"] == "stderr":
                errors.append(content["text"])
            elif kind == "stream":
                shown[f"printed {len(shown)}"] = {"text/plain": content["text"]}
            elif kind == "error":
                errors.append("\n".join(content["traceback"]))

        reply = client.execute_interactive(code, output_hook=hear, timeout=120)
        return list(shown.values()), "".join(errors), reply["content"].get("payload", [])

    assert run_cell(SETUP)[1] == ""
    yield run_cell
    client.stop_channels()
    manager.shutdown_kernel(now=True)


def test_without_ipywidgets_only_the_static_report_is_shown(run: Run) -> None:
    run("import sys\nhidden = [n for n in sys.modules if n.startswith(('ipywidgets', 'batten.notebook.widget'))]\n"
        "hidden = {name: sys.modules.pop(name) for name in hidden}\nsys.modules['ipywidgets'] = None")  # fmt: skip
    outputs, errors, _ = run(CELL)
    run("del sys.modules['ipywidgets']; sys.modules.update(hidden)")
    assert errors == ""
    assert [sorted(data) for data in outputs] == [["text/html", "text/plain"]]
    assert "batten-report" in outputs[0]["text/html"]


def test_two_outputs_the_widget_with_one_line_and_the_static_copy_it_hides(run: Run) -> None:
    outputs, errors, payload = run(CELL)
    assert (errors, payload) == ("", [])
    widget, static = outputs
    assert widget[VIEW]["model_id"]
    assert widget["text/html"] == ""
    assert widget["text/plain"].count("\n") == 0
    token = static["text/html"].split('"')[1]
    assert token.startswith("batten-static-")
    [states], _, _ = run("import ipywidgets\nprint(ipywidgets.Widget.get_manager_state(drop_defaults=True))")
    assert f".{token}" in states["text/plain"]


def test_the_result_takes_the_place_of_the_progress_line(run: Run) -> None:
    run("progress.DELAY, progress.STEP = 0.0, 0.0")
    outputs, errors, _ = run(CELL)
    assert errors == ""
    assert [VIEW in data for data in outputs] == [True, False]
    assert not any("Trying remedies" in str(data) for data in outputs)
    plain, _, _ = run(CELL.replace("castings", "castings --plain", 1))
    assert [data.get("text/html", "") for data in plain] == ["", ""]
    assert plain[0]["text/plain"] == ""
    run("progress.DELAY, progress.STEP = 2.0, 0.3")


def test_plain_is_text_only(run: Run) -> None:
    [output], errors, _ = run(CELL.replace("castings", "castings --plain", 1))
    assert errors == ""
    assert list(output) == ["text/plain"]
    assert output["text/plain"].endswith("--keep exam binds it to a variable.\n")


def test_an_interrupted_examination_leaves_no_line_behind_and_the_kernel_goes_on(run: Run) -> None:
    run(CELL.replace("castings", "castings --keep before", 1))
    run("progress.DELAY = 0.0\nclass Stop(progress.Progress):\n    def __call__(self, *told):\n"
        "        super().__call__(*told)\n        if told[0] == 1: raise KeyboardInterrupt\n"
        "import batten.notebook.magic as magic\nmagic.Progress = Stop")  # fmt: skip
    outputs, errors, _ = run(CELL.replace("castings", "castings --keep after", 1))
    assert "KeyboardInterrupt" in errors
    assert outputs == [{"text/plain": "", "text/html": ""}]
    run("magic.Progress = progress.Progress\nprogress.DELAY = 2.0")
    [said], _, _ = run(
        "last = get_ipython().magics_manager.registry['BattenMagics'].last\nprint(last is before, 'after' in globals())"
    )
    assert said == {"text/plain": "True False\n"}


def test_code_goes_into_the_next_cell_as_a_payload(run: Run) -> None:
    run(CELL.replace("castings", "castings --keep exam", 1))
    [said], errors, payload = run("%batten code log y ~ log x")
    assert errors == ""
    assert said["text/plain"].startswith("In the next cell: log of minutes")
    [code], _, _ = run("print(exam.code('log y ~ log x'))")
    assert payload == [{"source": "set_next_input", "text": code["text/plain"].rstrip("\n"), "replace": False}]


def test_what_the_widget_opens_and_asks_is_known_to_the_line_magic_and_changes_no_variable(run: Run) -> None:
    run(CELL.replace("castings", "castings --keep exam", 1))
    run("from ipywidgets.widgets.widget import _instances\n"
        "parts = [w for w in _instances.values() if hasattr(w, 'parts')][-1].parts\n"
        "parts.picker.field.value, parts.span.low.text.value = 'y ~ poly4 x', '12.5'")  # fmt: skip
    [said], errors, payload = run("%batten code y ~ poly4 x")
    assert errors == ""
    assert said["text/plain"] == "In the next cell: quartic in mass_kg (y ~ poly4 x).\n"
    assert "SPAN = (12.5, " in payload[0]["text"]
    [kept], _, _ = run("print(len(exam), exam.question.span[0] == 12.5)")
    assert kept["text/plain"] == "2 False\n"
    run(CELL)  # another examination is the last one now
    run("parts.picker.field.value = 'y ~ poly5 x'")
    [said], _, _ = run("%batten code y ~ poly5 x")
    assert said["text/plain"].endswith("it was not among those tried.\n")


def test_the_table_an_examination_and_a_fit_are_shown_as_pages_with_text_beside(run: Run) -> None:
    run(CELL.replace("castings", "castings --keep exam", 1))
    for code in ("%batten table", "exam", "exam.chosen"):
        [data], errors, _ = run(code)
        assert errors == ""
        assert data["text/html"].startswith('<div class="batten-report">')
        assert data["text/plain"].strip()


def test_a_mistake_is_one_red_line(run: Run) -> None:
    assert run("%%batten casting\nminutes ~ mass_kg") == (
        [], "UsageError: There is no variable casting. Data frames here: castings. Did you mean 'castings'?\n", [],
    )  # fmt: skip


def test_names_that_are_markup_stay_names_in_every_output(run: Run) -> None:
    evil = "<img src=x onerror=alert(1)>"
    run(f"evil = castings.rename(columns={{'mass_kg': {evil!r}, 'alloy': '<script>alert(2)</script>'}})")
    cell = f"%%batten evil --keep exam --focus {evil!r} {QUICK}\nminutes ~ Q({evil!r}) + Q('<script>alert(2)</script>')"
    for code in (cell, "exam.chosen", "%batten table"):
        outputs, errors, _ = run(code)
        assert errors == ""
        page = "".join(data.get("text/html", "") for data in outputs)
        assert "&lt;img src=x onerror=alert(1)&gt;" in page
        assert "<img src=x" not in page
        assert "<script" not in page
