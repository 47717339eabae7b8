"""Completion through IPython's own completer: what is offered, and that what is offered can be used."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import polars as pl
import pytest
from IPython.core.completer import provisionalcompleter
from IPython.core.interactiveshell import InteractiveShell

from batten.families import FAMILIES, parse
from batten.notebook.options import OPTIONS, read_line

Complete = Callable[[str], list[str]]


@pytest.fixture
def completed(shell: InteractiveShell) -> Complete:
    """The cell's text up to and with each completion at "|"."""

    def complete(text: str) -> list[str]:
        before, _, after = text.partition("|")
        with provisionalcompleter():
            found = list(shell.Completer.completions(before + after, len(before)))
        return [before[: c.start] + c.text for c in found]

    return complete


def last_words(texts: list[str], before: str) -> list[str]:
    assert all(text.startswith(before) for text in texts)
    return [text.removeprefix(before) for text in texts]


def test_data_frames_come_first_then_options(shell: InteractiveShell, completed: Complete) -> None:
    shell.user_ns.update(pumps=pl.DataFrame({"flow": [1.0]}), _hidden=shell.user_ns["castings"])
    assert completed("%%batten |") == ["%%batten castings", "%%batten pumps"]
    assert completed("%%batten ca|\nminutes ~ x") == ["%%batten castings"]
    assert last_words(completed("%%batten castings |"), "%%batten castings ") == list(OPTIONS)
    assert completed("%%batten castings --fo|") == ["%%batten castings --focus", "%%batten castings --folds"]


def test_an_option_that_is_given_is_not_offered_again_unless_it_may_be_repeated(completed: Complete) -> None:
    offered = last_words(
        completed("%%batten castings --seed 1 --at alloy=steel --plain |"),
        "%%batten castings --seed 1 --at alloy=steel --plain ",
    )
    assert {"--seed", "--plain"}.isdisjoint(offered)
    assert {"--at", "--only", "--focus"} <= set(offered)


def test_columns_follow_the_options_that_name_one(completed: Complete) -> None:
    start = "%%batten castings --focus "
    everything = ["minutes", "mass_kg", "alloy", '"daily light"', "wall", "class"]
    assert last_words(completed(start + "|"), start) == everything
    for option in ("--weights", "--cluster", "--exposure", "--by"):
        assert last_words(completed(f"%%batten castings {option} |"), f"%%batten castings {option} ") == everything
    assert completed(start + "m|") == [start + "minutes", start + "mass_kg"]
    assert completed(start + "d|") == [start + '"daily light"']
    assert completed(start + '"daily l|') == [start + '"daily light"']
    assert completed(start + "'da|") == [start + "'daily light'"]
    assert completed(start + '"da|"') == [start + '"daily light']  # the editor closed the quote already


def test_the_values_of_other_options(completed: Complete) -> None:
    start = "%%batten castings "
    assert last_words(completed(start + "--aim |"), start + "--aim ") == ["effect", "prediction"]
    assert completed(start + "--aim p|") == [start + "--aim prediction"]
    assert completed(start + "--expect f|") == [start + "--expect falling"]
    assert completed(start + "--errors r|") == [start + "--errors robust"]
    assert completed(start + "--weights-kind f|") == [start + "--weights-kind frequency"]
    assert completed(start + "--only la|") == [start + "--only ladder"]
    assert completed(start + '--planned "log y ~ log|') == [start + '--planned "log y ~ log x"']
    assert completed(start + "--at al|") == [start + "--at alloy="]
    assert completed(start + "--units da|") == [start + '--units "daily light=']


def test_columns_inside_the_choice_of_rows(completed: Complete) -> None:
    start = "%%batten castings --rows "
    assert completed(start + "mass|") == [start + '"mass_kg']
    assert completed(start + '"wall > 2 and mass|') == [start + '"wall > 2 and mass_kg']
    assert completed(start + '"`da|') == [start + '"`daily light`']
    assert completed(start + '"da|') == [start + '"`daily light`']


def test_every_offered_key_and_family_can_be_used(completed: Complete) -> None:
    for option in ("--only", "--planned"):
        start = f"%%batten castings {option} "
        values = [
            read_line(text.removeprefix("%%batten ")).given[option.removeprefix("--")]
            for text in completed(start + "|")
        ]
        names = [value[0] if isinstance(value, tuple) else value for value in values]
        keys = [name for name in names if name not in FAMILIES]
        assert [parse(key).key for key in keys] == keys
        assert len(keys) > 50
        assert [name for name in names if name in FAMILIES] == (list(FAMILIES) if option == "--only" else [])


@pytest.mark.parametrize("name", ["daily light", 'say "x"', "it's", "<b>", "Ω x", "a\\b c", "$x {y}"])
def test_whatever_a_column_is_called_its_completion_is_read_back_as_that_name(
    shell: InteractiveShell, completed: Complete, name: str
) -> None:
    shell.user_ns["castings"] = shell.user_ns["castings"][["minutes", "mass_kg"]].rename(columns={"mass_kg": name})
    [option] = [text for text in completed("%%batten castings --focus |") if "minutes" not in text]
    assert read_line(option.removeprefix("%%batten ")).given == {"focus": name}
    [_, column, function] = completed("%%batten castings\nminutes ~ |")
    assert eval(column.rpartition("~ ")[2], {"Q": lambda text: text}) == name
    assert function == "%%batten castings\nminutes ~ C("


def test_columns_stand_in_the_formula_in_the_form_it_takes(completed: Complete) -> None:
    start = "%%batten castings\nminutes ~ "
    assert last_words(completed(start + "|"), start) == [
        "minutes", "mass_kg", "alloy", 'Q("daily light")', "wall", 'Q("class")', "C(",
    ]  # fmt: skip
    assert completed(start + "ma|") == [start + "mass_kg"]
    assert completed(start + "mass_kg +\n  C(al|") == [start + "mass_kg +\n  C(alloy"]
    assert completed(start + "C|") == [start + "C("]
    assert completed(start + 'Q("da|') == [start + 'Q("daily light")']
    assert completed(start + "Q('da|") == [start + 'Q("daily light")']
    assert completed(start + 'Q("da|")') == [start + 'Q("daily light']


def test_where_no_column_fits_the_shell_s_own_completion_stays(shell: InteractiveShell, completed: Complete) -> None:
    shell.run_cell("import numpy as np\ndef halved(z):\n    return z / 2")
    start = "%%batten castings\nminutes ~ "
    assert start + "halved" in [text.rstrip("()") for text in completed(start + "halv|")]
    assert any("log1p" in text for text in completed(start + "np.log1|"))
    assert not any("mass_kg" in text for text in completed("%%batten nothing\nminutes ~ m|"))
    assert not any("mass_kg" in text for text in completed(start + "wall  # m|"))


def test_behind_code_stand_the_keys_of_the_last_examination(run: Any, completed: Complete) -> None:
    assert completed("%batten |") == ["%batten code", "%batten table", "%batten report"]
    assert completed("x = 1\n%batten ta|") == ["x = 1\n%batten table"]
    assert not any("~" in text for text in completed("%batten code |"))
    run("%%batten castings --only 'log y ~ log x' --only 'log y ~ x' --folds 2 --repeats 1\nminutes ~ mass_kg")
    assert sorted(completed("%batten code |")) == [
        "%batten code log y ~ log x",
        "%batten code log y ~ x",
        "%batten code y ~ x",
    ]
    assert completed("%batten code log y ~ l|") == ["%batten code log y ~ log x"]


def test_other_cells_are_left_to_the_shell(completed: Complete) -> None:
    assert completed("cast|") == ["castings"]
    assert not any("--focus" in text for text in completed("%%battenx castings --fo|"))
    assert not any("--focus" in text for text in completed("%%timeit castings --fo|"))
    assert "%%batten" in completed("%%batt|")
