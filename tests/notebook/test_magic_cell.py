"""%%batten in a shell: what it reads, binds, prints, refuses, and leaves alone."""

from __future__ import annotations

import copy
import re
from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import polars as pl
import pytest
from IPython.core.error import UsageError
from IPython.core.interactiveshell import InteractiveShell

from batten.notebook import extension, magic
from batten.notebook.display import NEXT
from batten.notebook.progress import Progress

Run = Callable[[str], tuple[str, str]]

#: little enough work for a test
QUICK = "--only 'log y ~ log x' --folds 2 --repeats 1"
CELL = f"%%batten castings {QUICK}\nminutes ~ mass_kg"


def touched(shell: InteractiveShell) -> Any:
    """What loading may change in a shell."""
    manager, formatters = shell.magics_manager, shell.display_formatter.formatters
    return copy.copy((
        {kind: set(names) for kind, names in manager.magics.items()},
        set(manager.registry),
        len(shell.configurables),
        list(shell.Completer.custom_matchers),
        {name: set(formatter.type_printers) for name, formatter in formatters.items()},
        set(shell.user_ns),
        dict(shell.events.callbacks),
        list(shell.input_transformers_cleanup),
    ))  # fmt: skip


def test_unloading_gives_back_the_shell_as_it_was(bare_shell: InteractiveShell) -> None:
    before = touched(bare_shell)
    extension.load(bare_shell)
    assert touched(bare_shell) != before
    extension.unload(bare_shell)
    assert touched(bare_shell) == before
    extension.unload(bare_shell)
    assert touched(bare_shell) == before


def test_loading_twice_changes_nothing_more(bare_shell: InteractiveShell) -> None:
    extension.load(bare_shell)
    once = touched(bare_shell)
    extension.load(bare_shell)
    assert touched(bare_shell) == once
    bare_shell.run_line_magic("reload_ext", "batten")
    matchers = [m for m in bare_shell.Completer.custom_matchers if getattr(m, "matcher_identifier", "") == "batten"]
    assert len(matchers) == 1
    assert sum(isinstance(c, magic.BattenMagics) for c in bare_shell.configurables) == 1


def test_nothing_but_what_is_kept_appears_among_the_variables(shell: InteractiveShell, run: Run, last: Any) -> None:
    before = set(shell.user_ns)
    _, errors = run(CELL)
    assert errors == ""
    assert {name for name in set(shell.user_ns) - before if not re.fullmatch(r"_i*\d*", name)} == set()
    run(CELL.replace("castings", "castings --keep exam", 1))
    assert shell.user_ns["exam"] is last()


def test_the_user_s_frame_is_not_changed(shell: InteractiveShell, run: Run) -> None:
    before = shell.user_ns["castings"].copy()
    run(CELL)
    pd.testing.assert_frame_equal(shell.user_ns["castings"], before)


def test_the_examination_is_the_one_that_examine_gives(shell: InteractiveShell, run: Run, last: Any) -> None:
    _, errors = run(
        "%%batten castings --focus wall --span -5 5 --level 0.9 --only ladder --folds 3 --repeats 2 --seed 4 "
        "--units minutes=min --errors constant --at alloy=steel\nminutes ~ mass_kg + wall + alloy"
    )
    assert errors == ""
    import batten

    same = batten.examine(
        "minutes ~ mass_kg + wall + alloy", shell.user_ns["castings"], focus="wall", span=(-5, 5), level=0.9,
        only="ladder", folds=3, repeats=2, seed=4, units={"minutes": "min"}, errors="constant", at={"alloy": "steel"},
    )  # fmt: skip
    pd.testing.assert_frame_equal(last().table(), same.table())


def test_a_formula_runs_over_lines_with_comments_and_uses_the_user_s_functions(
    shell: InteractiveShell, run: Run, last: Any
) -> None:
    run("def halved(z):\n    return z / 2")
    _, errors = run(
        f"%%batten castings --keep exam {QUICK}\n\n# finishing time\nminutes ~ (mass_kg  # focal\n   + halved(wall))\n"
    )
    assert errors == ""
    assert last().problem.formula == "minutes ~ (mass_kg + halved(wall))"
    assert last().problem.frame_name == "castings"


def test_rows_are_chosen_by_an_expression_that_may_name_variables(run: Run, last: Any) -> None:
    run(f"%%batten castings {QUICK} --rows \"mass_kg < @limit and alloy == 'steel'\"\nminutes ~ mass_kg")
    problem = last().problem
    assert 5 <= problem.rows.count < 15
    assert problem.rows.x.max() < 30


def test_neither_braces_nor_dollars_are_expanded_on_the_line(run: Run) -> None:
    _, errors = run("%%batten castings --focus '{limit}' --by $limit\nminutes ~ mass_kg")
    assert "30" not in errors
    _, errors = run("%%batten castings --focus '{limit} $limit'\nminutes ~ mass_kg")
    assert errors.startswith("UsageError: There is no column `{limit} $limit`")


@pytest.mark.parametrize(
    "name",
    ["daily light", 'say "x"', "it's", "<b>bold</b>", "Ω", "C", "Q", "np", "I", "a\\b", "100%", "class", "$x {y}"],
)
def test_a_column_of_any_name_can_be_the_focal_predictor(
    shell: InteractiveShell, run: Run, last: Any, name: str
) -> None:
    shell.user_ns["castings"] = shell.user_ns["castings"].rename(columns={"class": "grade"}).rename(
        columns={"mass_kg": name}
    )  # fmt: skip
    if name == "daily light":
        shell.user_ns["castings"] = shell.user_ns["castings"].loc[:, ~shell.user_ns["castings"].columns.duplicated()]
    written = name.replace("\\", "\\\\").replace('"', '\\"')
    printed, errors = run(f'%%batten castings --focus "{written}" {QUICK}\nminutes ~ Q({name!r})')
    assert errors == ""
    assert last().problem.focus == name
    assert printed.endswith(f"{NEXT}\n")


@pytest.mark.parametrize("table", [lambda d: pl.DataFrame(d), lambda d: pl.DataFrame(d).lazy(), lambda d: d])
def test_other_tables_and_dicts_of_columns_are_taken(
    shell: InteractiveShell, run: Run, last: Any, table: Callable[[Any], Any]
) -> None:
    columns = {name: shell.user_ns["castings"][name].to_numpy() for name in ("minutes", "mass_kg")}
    shell.user_ns["castings"] = table(columns)
    _, errors = run(CELL)
    assert errors == ""
    assert last().problem.rows.count == 30


def test_in_a_terminal_the_result_is_text_with_the_guess_announced_and_what_to_do_next(run: Run, last: Any) -> None:
    printed, _ = run(CELL.replace("mass_kg", "mass_kg + wall"))
    said = " ".join(printed.split())  # lines are as wide as the terminal
    assert "Focal predictor: mass_kg, the first plain numeric predictor; others it could be: wall." in said
    assert printed.endswith(f"\n\n{NEXT}\n")
    assert max(map(len, printed.splitlines())) <= 110
    assert run("%%batten castings --plain " + CELL.removeprefix("%%batten castings "))[0].endswith(f"\n\n{NEXT}\n")


def test_an_examination_or_a_fit_that_ends_a_cell_is_shown_in_words(run: Run) -> None:
    run(CELL.replace("castings", "castings --keep exam", 1))
    exam, _ = run("exam")
    assert re.match(r"Out\[\d*\]: \n(The straight line|These rows|The line) ", exam)
    fit, _ = run("exam['log y ~ log x']")
    assert fit.split("\n")[1] == "log of minutes on log of mass_kg (log y ~ log x), 30 rows"
    assert "\n- Rows with mass_kg of " in fit
    both, _ = run("[exam, exam['y ~ x']]")
    assert "<Examination of 'minutes ~ mass_kg': 2 remedies on 30 rows" in both
    assert "<Fit 'y ~ x' on 30 rows>" in both


USAGE = (
    "Usage: %%batten FRAME, then options; below it a formula, such as minutes ~ mass_kg + C(alloy). "
    "%%batten? lists them."
)
MISTAKES = {
    "%%batten\nminutes ~ mass_kg": f"The name of a data frame is missing. Data frames here: castings. {USAGE}",
    # a body of no lines at all is refused by IPython itself, before any magic is called
    "%%batten castings\n\n": f"There is no formula below the %%batten line. {USAGE}",
    "%%batten castings\n  # later\n\n": f"There is no formula below the %%batten line. {USAGE}",
    "%%batten casting\ny ~ x": "There is no variable casting. Data frames here: castings. Did you mean 'castings'?",
    "%%batten pumps\ny ~ x": "There is no variable pumps. Data frames here: castings. Name one of them.",
    "%%batten code\ny ~ x": (
        "There is no variable code. Data frames here: castings. With one percent sign, %batten code works on the last "
        "examination."
    ),
    "%%batten limit\ny ~ x": "limit is not a data frame. It is a number. Data frames here: castings. Name one of them.",
    "%%batten names\ny ~ x": (
        "names is not a data frame. It is of the type list. Data frames here: castings. Name one of them."
    ),
    "%%batten alloys\ny ~ x": (
        "alloys is not a data frame. It is one column (a Series). Data frames here: castings. Name one of them."
    ),
    "%%batten castings.head(20)\ny ~ x": (
        "The data frame is given by the name of a variable. Seen: castings.head(20). Give it a name in a cell "
        "before this one; --rows chooses among its rows."
    ),
    "%%batten castings --focs wall\nminutes ~ mass_kg": (
        "There is no option --focs. Did you mean '--focus' or '--folds'? %%batten? lists the options."
    ),
    "%%batten castings --focus mas_kg\nminutes ~ mass_kg": (
        "There is no column `mas_kg` to be the focal predictor. Did you mean 'mass_kg'?"
    ),
    "%%batten castings\nminutes ~ log(mass_kg": (
        "The formula cannot be read: this bracket is never closed. minutes ~ log(mass_kg Close it, or remove it."
    ),
    "%%batten castings --level 95\nminutes ~ mass_kg": (
        "level must be from 0.5 to below 1, such as 0.95. Seen: 95.0. Give level from 0.5 to below 1, such as 0.95."
    ),
    "%%batten castings --only lader\nminutes ~ mass_kg": (
        "'lader' is neither a family of remedies nor a remedy's key. Families: ladder, powers, polynomials, "
        "fractional, groups, hinges, splines, smooth, links, shares, curves, weighted. Did you mean 'ladder'? "
        "In a key, y stands for the response and x for the focal predictor: 'log y ~ x', 'y ~ poly2 x'."
    ),
}  # fmt: skip


@pytest.mark.parametrize("cell", MISTAKES)
def test_a_mistake_is_one_line_and_binds_nothing(shell: InteractiveShell, run: Run, last: Any, cell: str) -> None:
    first, _, rest = cell.partition("\n")
    printed, errors = run(f"{first} --keep exam\n{rest}" if "castings " in f"{first} " else cell)
    assert (printed, errors) == ("", f"UsageError: {MISTAKES[cell]}\n")
    assert "exam" not in shell.user_ns
    assert last() is None


def test_before_any_table_is_defined_a_first_try_is_offered(shell: InteractiveShell, run: Run) -> None:
    del shell.user_ns["castings"]
    assert run("%%batten castings\ny ~ x")[1] == (
        "UsageError: There is no variable castings. No data frame is defined yet. "
        "For a first try: castings = batten.sample('castings')\n"
    )


def test_a_fault_of_ours_keeps_its_traceback(
    shell: InteractiveShell, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def broken(*_: Any, **__: Any) -> None:
        raise ZeroDivisionError("planted")

    monkeypatch.setattr(magic, "examine", broken)
    result = shell.run_cell(CELL)
    assert isinstance(result.error_in_exec, ZeroDivisionError)
    assert "test_magic_cell.py" in capsys.readouterr().out
    monkeypatch.undo()
    assert isinstance(shell.run_cell("%%batten nothing\ny ~ x").error_in_exec, UsageError)


def test_an_interruption_leaves_the_last_examination_and_the_variables_as_they_were(
    shell: InteractiveShell, run: Run, last: Any, monkeypatch: pytest.MonkeyPatch
) -> None:
    run(CELL.replace("castings", "castings --keep exam", 1))
    before = last()
    calls = []

    def interrupt(self: Progress, done: int, total: int, label: str) -> None:
        calls.append(label)
        if done:
            raise KeyboardInterrupt

    with monkeypatch.context() as patched:
        patched.setattr(Progress, "__call__", interrupt)
        printed, errors = run("%%batten castings --keep exam --only ladder\nminutes ~ wall")
    assert len(calls) == 2
    assert "KeyboardInterrupt" in printed + errors
    assert last() is shell.user_ns["exam"] is before
    run(CELL.replace("castings", "castings --keep exam", 1))
    assert last() is shell.user_ns["exam"] is not before


def test_two_shells_have_each_their_own_last_examination(bare_shell: InteractiveShell, shell: InteractiveShell) -> None:
    from conftest import end_shell, new_shell

    other = new_shell()
    extension.load(other)
    shell.run_cell(CELL)
    assert other.magics_manager.registry["BattenMagics"].last is None
    end_shell(other)


def test_help_is_what_a_question_mark_shows(shell: InteractiveShell) -> None:
    found = shell.object_inspect("%%batten", detail_level=0)
    assert found["docstring"].startswith("Examine a regression that bends")
    assert "--tolerance T" in found["docstring"]


def test_a_terminal_that_is_no_terminal_gets_no_progress_line(
    shell: InteractiveShell, run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("batten.notebook.progress.DELAY", 0.0)
    printed, _ = run(CELL)
    assert "Trying remedies" not in printed


def test_the_progress_line_comes_after_its_delay_fits_the_terminal_and_is_wiped(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    now = [0.0]
    monkeypatch.setattr("batten.notebook.progress.time.monotonic", lambda: now[0])
    monkeypatch.setattr("sys.stdout.isatty", lambda: True)
    monkeypatch.setenv("COLUMNS", "40")
    with Progress(kernel=False) as progress:
        for second in np.arange(0, 4, 0.5):
            now[0] = float(second)
            progress(int(2 * second), 8, "log y ~ spline4 x")
            assert ("Trying" in capsys.readouterr().out) is bool(second >= 2)
        progress(8, 8, "x" * 100)
        progress(8, 8, "x" * 100)
        assert capsys.readouterr().out == ""  # too soon after the line before
        now[0] = 10.0
        progress(8, 8, "x" * 100)
        assert re.fullmatch(r"\rTrying remedies, 8 of 8 steps done: xxx\x1b\[K", capsys.readouterr().out)
    assert capsys.readouterr().out == "\r\x1b[K"
