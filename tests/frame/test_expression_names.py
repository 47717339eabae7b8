"""Which names in a factor are columns, and the same text with the columns renamed."""

from __future__ import annotations

import numpy as np
import pytest

from batten.errors import InputError, UnknownNameError
from batten.frame.expression import read_expression
from batten.frame.formula import namespace

NAMES = namespace({"trim": np.clip, "limit": 3.0})


def test_columns_and_functions_are_told_apart_by_where_they_stand() -> None:
    columns = ["C", "Q", "np", "I", "bs", "center", "z"]
    found = read_expression("np.log(np) + I(C) + C(z) + Q('Q') + center(center)", columns, NAMES)
    assert found.columns == ("np", "C", "z", "Q", "center")
    assert found.calls == ("np", "I", "C", "center")
    renamed = found.written({c: f"c{i}" for i, c in enumerate(columns)})
    assert renamed == "np.log(c2) + I(c0) + C(c6) + c1 + center(c5)"


def test_a_bare_column_may_be_a_keyword_quoted_or_dotted() -> None:
    assert read_expression("class", ["class"], NAMES).bare == "class"
    assert read_expression("mass.kg", ["mass.kg"], NAMES).bare == "mass.kg"
    quoted = read_expression("Q('wall mm')", ["wall mm"], NAMES)
    assert (quoted.bare, quoted.label) == ("wall mm", "wall mm")


def test_the_micro_sign_finds_the_column_whichever_way_python_normalises_it() -> None:
    micro = "\u00b5"  # what a keyboard types; Python's parser turns it into the Greek letter
    assert read_expression(micro, [micro], NAMES).bare == micro
    assert read_expression(f"np.log({micro})", [micro], NAMES).columns == (micro,)


def test_a_method_of_a_column_is_not_taken_for_a_module() -> None:
    found = read_expression("z.clip(0, limit)", ["z"], {**NAMES, "z": np.zeros(3)})
    assert (found.columns, found.calls) == (("z",), ("limit",))


def test_labels_are_for_reading() -> None:
    columns = ["z", "wall mm", "alloy"]
    assert read_expression("I(z > 3)", columns, NAMES).label == "z > 3"
    assert read_expression("C(alloy)", columns, NAMES).label == "alloy"
    assert read_expression("C(alloy, Sum)", columns, NAMES).label == "alloy"
    assert read_expression("np.log(Q('wall mm'))", columns, NAMES).label == "np.log(wall mm)"


def test_names_that_are_nothing_are_refused_with_the_nearest_column() -> None:
    columns = ["mass_kg", "minutes", "melt.temp"]
    messages = {
        "mas_kg": "There is no column `mas_kg`.\nThe data have 3 columns.\nDid you mean 'mass_kg'?",
        "np.log(mas_kg)": "There is no column `mas_kg`.\nThe data have 3 columns.\nDid you mean 'mass_kg'?",
        "Q('minuts')": "There is no column `minuts`.\nThe data have 3 columns.\nDid you mean 'minutes'?",
        "melt.tmp": ("There is no column `melt`.\nThe data have 3 columns.\nDid you mean 'melt.temp'?"),
        "lg(mass_kg)": (
            "`lg` is not known here.\nIt is called in: lg(mass_kg)\n"
            "numpy is there as np (np.log, np.sqrt); define other functions where the formula is used."
        ),
        "sp.log(mass_kg)": (
            "`sp` is not known here.\nIt is called in: sp.log(mass_kg)\n"
            "numpy is there as np (np.log, np.sqrt); define other functions where the formula is used."
        ),
        "limit": (
            "`limit` names no column of the data.\n"
            "Only columns can stand in a formula; other variables only inside functions of columns.\n"
            "Choose one of 'mass_kg', 'melt.temp', 'minutes'."
        ),
        "'mass_kg'": (
            "`'mass_kg'` names no column of the data.\n"
            "Only columns can stand in a formula; other variables only inside functions of columns.\n"
            "Did you mean 'mass_kg'?"
        ),
    }
    for text, message in messages.items():
        with pytest.raises(UnknownNameError) as caught:
            read_expression(text, columns, NAMES)
        assert str(caught.value) == message


def test_a_dotted_column_beside_its_first_half_must_be_quoted() -> None:
    for columns, names in ((["melt.temp", "melt"], NAMES), (["melt.temp"], {**NAMES, "melt": np})):
        with pytest.raises(InputError) as caught:
            read_expression("melt.temp", columns, names)
        assert str(caught.value) == (
            "`melt.temp` could be a column, or an attribute of `melt`.\nBoth names are there.\n"
            "For the column write Q('melt.temp')."
        )


def test_q_needs_a_quoted_name() -> None:
    with pytest.raises(InputError) as caught:
        read_expression("Q(z)", ["z"], NAMES)
    assert str(caught.value) == (
        "Q() needs the name of a column in quotation marks.\nSeen: Q(z)\nWrite it like this: Q('melt temperature')"
    )
