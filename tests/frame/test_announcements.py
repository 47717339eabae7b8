"""What was assumed about the data is said; what cannot be known is asked."""

from __future__ import annotations

import datetime as dt
from decimal import Decimal

import numpy as np
import pandas as pd
import pytest

from batten.frame.hints import zero_is_arbitrary
from batten.frame.read import read

RNG = np.random.default_rng(19)
N = 120
DATA = pd.DataFrame(
    {
        "y": RNG.normal(20, 3, N),
        "x": RNG.uniform(1, 9, N).round(3),
        "z": RNG.uniform(2, 6, N).round(3),
        "g": ["p", "q"] * 60,
    }
)


def said(formula: str, data: pd.DataFrame = DATA, **options: object) -> tuple[str, ...]:
    return read(formula, data, focus="x", **options).announcements  # type: ignore[arg-type]


def test_with_nothing_to_say_nothing_is_said() -> None:
    assert said("y ~ x + z + C(g)") == ()


def test_numbers_stored_otherwise_are_read_as_numbers_and_named() -> None:
    data = DATA.assign(
        y=DATA["y"].astype("Float64"), x=DATA["x"].map(lambda v: Decimal(str(v))), z=DATA["z"].astype(str)
    )
    assert said("y ~ x + z + np.sqrt(z)", data) == (
        "Read as numbers: y (stored as Float64), x (stored as Decimal), z (stored as text).",
    )
    plain, stored = read("y ~ x + np.sqrt(z)", DATA).rows, read("y ~ x + np.sqrt(z)", data).rows
    for part in ("y", "x", "base"):
        np.testing.assert_array_equal(getattr(stored, part), getattr(plain, part))


def test_dates_become_days_and_their_zero_is_arbitrary() -> None:
    days = pd.date_range("2024-03-01 06:00", periods=N, freq="12h")
    offsets = np.arange(N) ** 2 % 97
    data = DATA.assign(x=days, z=[dt.date(2023, 1, 1) + dt.timedelta(days=int(d)) for d in offsets])
    problem = read("y ~ x + z", data, focus="x")
    assert problem.announcements == (
        "x is read as days since 2024-03-01.",
        "z is read as days since 2023-01-01.",
        "x is a date: its zero is arbitrary, so roots, logs and powers of it are off unless asked for.",
    )
    np.testing.assert_array_equal(problem.rows.x, 0.25 + np.arange(N) / 2)
    np.testing.assert_array_equal(problem.rows.base[:, 1], offsets)
    assert (problem.zero_is_arbitrary, problem.unit("x")) == (True, "days")
    new = problem.new_rows(pd.DataFrame({"x": ["2024-03-02", "2024-06-01"], "z": [dt.date(2023, 1, 3)] * 2}).astype(
        {"x": "datetime64[ns]"}
    ))  # fmt: skip
    np.testing.assert_array_equal(new.x, [1, 92])
    assert new.notes == ("", "outside the data: x 2024-06-01 is beyond 2024-03-01 06:00 to 2024-04-29 18:00")
    np.testing.assert_array_equal(problem.new_rows(pd.DataFrame({"x": [1.5], "z": [2.0]})).x, [1.5])


@pytest.mark.parametrize(
    ("name", "unit", "values", "why"),
    [
        ("year", "", [1990, 2024], "a year"),
        ("model_year", "", [1990, 2024], "a year"),
        ("years", "", [1, 30], ""),
        ("year", "", [1990.5, 2024], ""),
        ("melt_temp", "", [900, 1500], "a temperature"),
        ("meltTemp2", "", [900, 1500], "a temperature"),
        ("temperature", "K", [900, 1500], ""),
        ("heat", "°C", [900, 1500], "a temperature"),
        ("heat", "degF", [900, 1500], "a temperature"),
        ("heat", "Celsius", [900, 1500], "a temperature"),
        ("template", "", [1, 2], ""),
        ("attempts", "", [1, 2], ""),
        ("mass_kg", "kg", [1, 2], ""),
    ],
)
def test_years_and_temperatures_have_no_zero_of_their_own(name: str, unit: str, values: list[float], why: str) -> None:
    assert zero_is_arbitrary(name, unit, np.array(values, dtype=float), date=False) == why


def test_whole_numbers_that_may_be_codes_are_asked_about() -> None:
    data = DATA.assign(x=RNG.integers(1, 5, N), line=RNG.integers(1, 4, N), count=RNG.integers(0, 30, N), half=0.5)
    data["half"] = RNG.choice([0.5, 1.0, 1.5], N)
    assert said("y ~ x + line + count + half", data) == (
        "x takes only 4 whole numbers: if they are codes, it is a group; "
        "then write C(x) and choose another focal predictor.",
        "line holds 3 whole numbers: if they are codes, write C(line).",
    )
    assert said("y ~ z + C(line) + x", data.assign(x=DATA["x"])) == ()


def test_a_bare_power_is_explained() -> None:
    assert said("y ~ x + x**2 + z**2") == (
        "x**2 in a formula means just x; its powers are among the remedies.",
        "z**2 in a formula means just z; a power is written I(z**2).",
    )


def test_columns_that_say_the_same_are_named() -> None:
    assert said("y ~ x + z + w", DATA.assign(w=3 * DATA["z"] - 1)) == (
        "Left out because other columns say the same: w.",
    )


def repeated(columns: str) -> str:
    return f"Values repeat in {columns}: are rows that share one independent? If not, give that column as cluster."


def test_things_with_several_rows_each_are_asked_about() -> None:
    machine = np.repeat([f"M{i}" for i in range(12)], 10)
    data = DATA.assign(machine=machine, bed_id=np.tile(np.arange(40), 3), count=np.tile(np.arange(40), 3))
    assert said("y ~ x + z", data) == (repeated("machine (12 in 120 rows), bed_id (40 in 120 rows)"),)
    assert said("y ~ x + C(machine)", data[["y", "x", "machine"]]) == (repeated("machine (12 in 120 rows)"),)
    assert said("y ~ x + z", data, cluster="machine") == (
        "12 clusters by machine; intervals and folds keep each together.",
    )
    assert said("y ~ x + z", data.assign(hall=np.repeat([1, 2], 60)), cluster="hall") == (
        "2 clusters by hall; intervals and folds keep each together. That is few: intervals by cluster need about 10.",
    )
    assert said("y ~ x + z", data.assign(machine=machine.repeat(1))[["y", "x", "z", "count"]]) == ()


def test_names_without_a_telling_word_need_many_repeated_texts() -> None:
    def found(values: object) -> tuple[str, ...]:
        return said("y ~ x + z", DATA.assign(who=values))

    assert found(np.tile([f"w{i}" for i in range(20)], 6)) == (repeated("who (20 in 120 rows)"),)
    assert found(np.tile(["north", "south"], 60)) == ()
    assert found([f"w{i}" for i in range(N)]) == ()
    assert found([f"w{i % 70}" for i in range(N)]) == ()


def test_an_id_with_one_row_each_and_a_group_in_the_formula_are_no_matter() -> None:
    assert said("y ~ x + z", DATA.assign(casting_id=np.arange(N))) == ()
    assert said("y ~ x + C(plant)", DATA.assign(plant=["a", "b", "c"] * 40)) == ()
    assert said("y ~ x + z", DATA.assign(plant=["a", "b", "c"] * 40)) == (repeated("plant (3 in 120 rows)"),)


def test_dates_beside_the_formula_are_pointed_out() -> None:
    days = pd.date_range("2024-01-01", periods=N)
    note = "rows close in time can resemble each other; look at what is left in order of time."
    for values in (days, days.strftime("%Y-%m-%d"), days.strftime("%d.%m.%Y"), list(days.date)):
        assert said("y ~ x + z", DATA.assign(**{"poured on": values})) == (f"poured on: {note}",)
    assert said("y ~ x + z", DATA.assign(a=days, b=days.strftime("%Y-%m-%d %H:%M"))) == (f"a, b: {note}",)


def test_columns_that_cannot_be_compared_are_passed_over() -> None:
    assert said("y ~ x + z", DATA.assign(machine=[[1]] * N)) == ()
