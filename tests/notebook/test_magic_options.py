"""The %%batten line: what it reads, and what it says about a slip of the hand."""

from __future__ import annotations

import inspect

import pytest

from batten import examine
from batten.errors import BattenError
from batten.notebook.options import OPTIONS, Line, read_line, usage


def test_every_option_is_a_parameter_of_examine_and_the_other_way_round() -> None:
    own = {"keep", "plain"}
    not_typed = {"formula", "data", "progress", "env", "frame_name"}
    assert {o.parameter for o in OPTIONS.values()} - own == set(inspect.signature(examine).parameters) - not_typed


def test_a_line_with_everything_is_read_whole() -> None:
    line = (
        'castings --focus "daily light" --aim prediction --span -5 5e1 --level 0.9 --tolerance 2 --expect rising '
        "--planned 'log y ~ log x' --weights w --weights-kind variance --cluster heat --exposure t "
        """--rows "mass_kg < 50 and alloy == 'steel'" --by alloy --at alloy=steel --at "bed age = 3" """
        "--only ladder --only 'y ~ poly4 x' --units mass_kg=kg --units minutes=min --errors constant "
        "--folds 5 --repeats 2 --seed 7 --keep exam --plain"
    )
    assert read_line(line) == Line(
        "castings",
        {
            "focus": "daily light", "aim": "prediction", "span": (-5.0, 50.0), "level": 0.9, "tolerance": 2.0,
            "expect": "rising", "planned": "log y ~ log x", "weights": "w", "weights_kind": "variance",
            "cluster": "heat", "exposure": "t", "rows": "mass_kg < 50 and alloy == 'steel'", "by": "alloy",
            "at": {"alloy": "steel", "bed age": "3"}, "only": ("ladder", "y ~ poly4 x"),
            "units": {"mass_kg": "kg", "minutes": "min"}, "errors": "constant", "folds": 5, "repeats": 2, "seed": 7,
            "keep": "exam", "plain": True,
        },
    )  # fmt: skip
    assert len(read_line(line).given) == len(OPTIONS)


@pytest.mark.parametrize("low", ["-5", "-.5", "-5.", "-1e-3", "-1E+2", "-1_000"])
def test_a_value_may_begin_with_a_dash(low: str) -> None:
    assert read_line(f"t --span {low} 7").given == {"span": (float(low), 7.0)}
    assert read_line("t --focus -x --rows '-x < 3'").given == {"focus": "-x", "rows": "-x < 3"}


def test_an_equal_sign_behind_the_option_is_read_too() -> None:
    assert read_line("t --level=0.8 --at=alloy=steel --focus=--aim").given == {
        "level": 0.8, "at": {"alloy": "steel"}, "focus": "--aim",
    }  # fmt: skip


@pytest.mark.parametrize("name", ["daily light", "it's", 'say "x"', "<b>", "Ω", "a\\b", "$x {y}", "a#b"])
def test_any_name_can_be_given_in_quotes(name: str) -> None:
    written = name.replace("\\", "\\\\").replace('"', '\\"')
    assert read_line(f't --focus "{written}" --plain').given == {"focus": name, "plain": True}


SLIPS = {
    "t --focs x": "There is no option --focs. Did you mean '--focus' or '--folds'? %%batten? lists the options.",
    "t --foc x": "There is no option --foc. Did you mean '--focus' or '--folds'? %%batten? lists the options.",
    "t -span 1 2": "There is no option -span. Did you mean '--span' or '--plain'? %%batten? lists the options.",
    "t --zzz": "There is no option --zzz. %%batten? lists the options.",
    "t --span 1": "A value is missing: --span A B. Seen: --span 1. Add it behind the option.",
    "t --focus --aim effect": "A value is missing: --focus NAME. Seen: --focus. Add it behind the option.",
    "t --keep": "A value is missing: --keep NAME. Seen: --keep. Add it behind the option.",
    "t --span 1 x": "--span A B takes a plain number. Seen: x. Write it like 2.5.",
    "t --tolerance 2,5": "--tolerance T takes a plain number. Seen: 2,5. Write it like 2.5.",
    "t --tolerance inf": "--tolerance T takes a plain number. Seen: inf. Write it like 2.5.",
    "t --folds 2.5": "--folds K takes a whole number. Seen: 2.5. Write it like 10.",
    "t --at steel": (
        "--at NAME=VALUE takes a column's name, the sign = and a value. Seen: steel. "
        'Write them without spaces, or in quotes: "bed age=3".'
    ),
    "t --units =kg": (
        "--units NAME=UNIT takes a column's name, the sign = and a value. Seen: =kg. "
        'Write them without spaces, or in quotes: "bed age=3".'
    ),
    "t --plain=yes": "--plain takes no value. Seen: --plain=yes. Write just --plain.",
    "t --aim effect --aim effect": "--aim is given twice. Keep one of them.",
    "t --at a=1 --at a=2": "--at a is given twice. Keep one of them.",
    "t --keep 2x": (
        "--keep cannot bind the name 2x. It is not the name of a variable. Choose another name, such as exam."
    ),
    "t --keep for": (
        "--keep cannot bind the name for. It is not the name of a variable. Choose another name, such as exam."
    ),
    "t --keep t": "--keep cannot bind the name t. It is the data frame's own. Choose another name, such as exam.",
    "t minutes ~ mass": (
        "Only the name of the data frame stands on the %%batten line beside the options. Seen too: minutes ~ mass. "
        "Write the formula on the lines below."
    ),
    "t --focus daily light": (
        "Only the name of the data frame stands on the %%batten line beside the options. Seen too: light. "
        'Names and expressions with spaces go between quotes, such as --focus "daily light".'
    ),
    "t --focus it's": (
        "A quotation mark on the %%batten line is never closed. Seen: t --focus it's. "
        'Names and expressions with spaces go between quotes, such as --focus "daily light".'
    ),
}  # fmt: skip


@pytest.mark.parametrize("line", SLIPS)
def test_a_slip_is_told_with_what_was_seen_and_what_to_do(line: str) -> None:
    with pytest.raises(BattenError) as caught:
        read_line(line)
    assert caught.value.one_line() == SLIPS[line]


def test_the_help_shows_every_option_on_a_line_of_its_own() -> None:
    lines = usage().splitlines()
    for option in OPTIONS.values():
        assert [option.words in line for line in lines if line.split()[:1] == [option.name]] == [True]
    assert max(map(len, lines)) <= 100
