"""%batten: help, the table, the report, and code for the next cell."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from IPython.core.interactiveshell import InteractiveShell

Run = Callable[[str], tuple[str, str]]
USAGE = "%%batten FRAME, then options; below it a formula, such as minutes ~ mass_kg + C(alloy). %%batten? lists them."


@pytest.fixture
def examined(run: Run, last: Callable[[], Any]) -> Any:
    """The last examination."""
    run("%%batten castings --only 'log y ~ log x' --only 'sqrt y ~ x' --folds 2 --repeats 1\nminutes ~ mass_kg")
    return last()


def test_alone_it_says_what_it_can_do(run: Run) -> None:
    assert run("%batten") == (
        "%batten works on the last examination:\n\n"
        "  %batten code KEY     put a remedy's code into the next cell (the choice's without KEY)\n"
        "  %batten table        all remedies that were tried\n"
        "  %batten report FILE  write the report to one web page; FILE ends in .html\n\n"
        "An examination is a cell that begins with %%batten FRAME and holds a formula; %%batten? lists its options.\n",
        "",
    )


@pytest.mark.parametrize("line", ["log y ~ log x", "  log y~log x ", '"log y ~ log x"', "'log y ~ log x'"])
def test_the_code_of_a_key_that_holds_spaces_goes_into_the_next_cell(
    shell: InteractiveShell, run: Run, examined: Any, line: str
) -> None:
    printed, errors = run(f"%batten code {line}")
    assert (printed, errors) == ("In the next cell: log of minutes on log of mass_kg (log y ~ log x).\n", "")
    assert shell.rl_next_input == examined.code("log y ~ log x").rstrip("\n")


def test_without_a_key_it_is_the_choice_s_code(shell: InteractiveShell, run: Run, examined: Any) -> None:
    printed, _ = run("%batten code")
    assert printed == f"In the next cell: {examined.chosen.label}.\n"
    assert shell.rl_next_input == examined.code().rstrip("\n")


def test_the_code_of_a_remedy_that_was_not_tried_is_written_too(
    shell: InteractiveShell, run: Run, examined: Any
) -> None:
    printed, _ = run("%batten code y ~ poly4 x")
    assert printed == "In the next cell: quartic in mass_kg (y ~ poly4 x); it was not among those tried.\n"
    assert shell.rl_next_input == examined.with_remedy("y ~ poly4 x").code("y ~ poly4 x").rstrip("\n")
    assert run("%batten code y ~ poly4 x")[0] == printed


def test_a_refused_remedy_has_no_code_but_its_reason(run: Run) -> None:
    run("%%batten castings --focus wall --only 'y ~ log x' --folds 2 --repeats 1\nminutes ~ wall")
    _, errors = run("%batten code y ~ log x")
    assert errors.startswith("UsageError: y ~ log x cannot be used on these rows. ")


def test_the_code_in_the_next_cell_runs(shell: InteractiveShell, run: Run, examined: Any) -> None:
    run("%batten code sqrt y ~ x")
    result = shell.run_cell(shell.rl_next_input)
    assert result.error_before_exec is None
    assert result.error_in_exec is None


def test_the_table_has_every_remedy_with_its_unit_and_target(run: Run, examined: Any) -> None:
    printed, errors = run("%batten table")
    assert errors == ""
    for key in examined:
        assert f" {key} " in printed
    assert "(mean)" in printed


def test_the_report_is_written_where_asked(run: Run, examined: Any, tmp_path: Path) -> None:
    file = tmp_path / "order 14.html"
    assert run(f"%batten report {file}") == (f"Written: {file}\n", "")
    page = file.read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>")
    file.unlink()
    assert run(f'%batten report "{file}"') == (f"Written: {file}\n", "")
    assert file.read_text(encoding="utf-8") == page


def test_a_report_overwrites_no_data(run: Run, examined: Any, tmp_path: Path) -> None:
    data = tmp_path / "castings.csv"
    data.write_text("mass_kg\n1\n")
    _, errors = run(f"%batten report {data}")
    assert errors == (
        "UsageError: The report is a web page: its file's name ends in .html. "
        f"Seen: {data}. Nothing has been written.\n"
    )
    assert data.read_text() == "mass_kg\n1\n"


MISTAKES = {
    "%batten codes log y ~ x": "There is no %batten codes. Did you mean 'code'?",
    "%batten save": "There is no %batten save. Choose one of 'code', 'report', 'table'.",
    "%batten castings": (
        "%batten castings does nothing with a data frame. One percent sign works on the last examination. "
        "To examine it, begin a cell with two: %%batten castings"
    ),
    "%batten table all": "%batten table takes nothing more. Seen: all. Write just %batten table.",
    "%batten report": "%batten report needs the name of a file. Such as %batten report castings.html",
    "%batten report /no/such/place/a.html": (
        "The report cannot be written to /no/such/place/a.html. No such file or directory. Choose another place."
    ),
    "%batten code sqrt x ~ y": (
        "'sqrt x' is not a known form of the response in a remedy's key. Seen: 'sqrt x ~ y'. "
        "Did you mean 'sqrt y'? In a key, y stands for the response and x for the focal predictor: "
        "'log y ~ x', 'y ~ poly2 x'."
    ),
    "%batten code log(y) ~ x": (
        "'log(y)' is not a known form of the response in a remedy's key. Seen: 'log(y) ~ x'. "
        "Did you mean 'log y' or 'log1p y'? In a key, y stands for the response and x for the focal predictor: "
        "'log y ~ x', 'y ~ poly2 x'."
    ),
}  # fmt: skip


@pytest.mark.parametrize("line", MISTAKES)
def test_a_mistake_is_one_line(run: Run, examined: Any, line: str) -> None:
    assert run(line) == ("", f"UsageError: {MISTAKES[line]}\n")


@pytest.mark.parametrize("line", ["%batten code", "%batten table", "%batten report a.html"])
def test_without_an_examination_it_says_how_to_run_one(run: Run, line: str) -> None:
    assert run(line) == ("", f"UsageError: There is no examination yet. Run one first: {USAGE}\n")
