"""Fields of "try a value": each kind of column gets an input that fits it, and what is typed is what is predicted."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest

import batten
from batten.errors import InputError
from batten.exam import Examination
from batten.notebook.panels.fields import Choices, Dates, Numbers, number_in
from batten.notebook.panels.try_value import fields_for


@pytest.fixture(scope="module")
def exam() -> Examination:
    """One column of every kind."""
    frame = batten.sample("glasshouse").dropna()
    rng = np.random.default_rng(3)
    frame["shaded"] = rng.integers(0, 2, len(frame)) == 1
    frame["house"] = rng.integers(1, 4, len(frame))
    frame["span"] = [f"{v}" for v in rng.integers(1, 9, len(frame))]
    formula = (
        "yield_kg ~ Q('daily light') + C(cultivar) + np.log(bed_age) + harvested + shaded + C(house) + C(bed) + span"
    )
    return batten.examine(formula, frame, focus="daily light", only=["y ~ x"], folds=4, repeats=1, env={"np": np})


def test_each_kind_of_column_has_its_field(exam: Examination) -> None:
    fields = {field.name: field for field in fields_for(exam.problem)}
    assert next(iter(fields)) == "daily light"
    kinds = {name: type(field) for name, field in fields.items()}
    assert kinds == {
        "daily light": Numbers, "cultivar": Choices, "bed_age": Numbers, "harvested": Dates, "shaded": Choices,
        "house": Choices, "bed": Choices, "span": Numbers,
    }  # fmt: skip
    assert fields["shaded"].read() in (False, True)
    assert list(fields["house"].choice.options) == ["1", "2", "3"]  # type: ignore[attr-defined]
    assert type(fields["bed"].choice).__name__ == "Dropdown"  # type: ignore[attr-defined]


def test_the_first_row_is_one_the_data_are_used_to(exam: Examination) -> None:
    row = pd.DataFrame({field.name: [field.read()] for field in fields_for(exam.problem)})
    told = exam["y ~ x"].predict(row, interval="new row").iloc[0]
    assert told["note"] == ""
    assert np.isfinite([told["estimate"], told["low"], told["high"]]).all()


def test_a_number_left_alone_is_kept_to_its_last_digit() -> None:
    field = Numbers("x", 1 / 3)
    assert (field.text.value, field.read()) == ("0.333333", 1 / 3)
    field.text.value = "0.3333"
    assert field.read() == 0.3333


@pytest.mark.parametrize(
    ("typed", "number"),
    [("12.5", 12.5), (" -3 ", -3.0), ("−3", -3.0), ("1,234,567.5", 1234567.5), ("1e3", 1000.0), ("12,345", 12345.0)],
)
def test_numbers_are_read_as_this_package_writes_them(typed: str, number: float) -> None:
    assert number_in(typed, "x") == number


@pytest.mark.parametrize("typed", ["12,5", "1,23", "1,2345", ",5", "nan", "inf", "ten", "1 000", ""])
def test_what_could_be_two_numbers_or_none_is_refused(typed: str) -> None:
    with pytest.raises(InputError, match=r"^x needs a number\."):
        number_in(typed, "x")


@pytest.mark.parametrize(("typed", "date"), [("2024-03-31", "2024-03-31"), ("2024-03-31 14:30", "2024-03-31T14:30")])
def test_dates_are_read(typed: str, date: str) -> None:
    field = Dates("day", pd.Timestamp("2024-01-01"))
    assert field.text.value == "2024-01-01"
    field.text.value = typed
    assert field.read() == pd.Timestamp(date)


@pytest.mark.parametrize("typed", ["soon", "", "2024-13-01"])
def test_what_is_no_date_is_refused_and_stays(typed: str) -> None:
    field = Dates("day", pd.Timestamp("2024-01-01"))
    field.text.value = typed
    with pytest.raises(InputError, match=r"^day needs a date\.\nTyped: "):
        field.read()
    assert field.text.value == typed


def test_levels_that_read_alike_are_told_apart() -> None:
    levels: list[Any] = ["a b", "a  b", "c"]
    field = Choices("level", "a  b", levels)
    assert list(field.choice.options) == ["a b (1)", "a b (2)", "c"]
    assert field.read() == "a  b"
