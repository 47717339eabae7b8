"""What a column holds, by its type and by its values."""

from __future__ import annotations

import datetime as dt
from decimal import Decimal
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pytest

from batten.errors import InputError
from batten.frame.columns import as_groups, as_numbers, check_numbers, days_since, first_day, look

D = Decimal
NUMBERS: dict[str, tuple[pd.Series[Any], list[float], str]] = {
    "integers": (pd.Series([3, 1, 2]), [3, 1, 2], ""),
    "floats": (pd.Series([1.5, np.nan, np.inf]), [1.5, np.nan, np.inf], ""),
    "half precision": (pd.Series([1.5, 2], dtype="float16"), [1.5, 2], ""),
    "unsigned": (pd.Series([2**63], dtype="uint64"), [2.0**63], ""),
    "nullable integers": (pd.Series([1, None, 3], dtype="Int64"), [1, np.nan, 3], "as Int64"),
    "nullable floats": (pd.Series([1.5, None], dtype="Float64"), [1.5, np.nan], "as Float64"),
    "sparse": (pd.Series([1.0, np.nan], dtype="Sparse[float]"), [1, np.nan], ""),
    "Decimal": (pd.Series([D("1.5"), None, D("2")]), [1.5, np.nan, 2], "as Decimal"),
    "Decimal and float": (pd.Series([D("1.5"), 2.0, None], dtype=object), [1.5, 2, np.nan], ""),
    "Python numbers": (pd.Series([1, 2.5, None], dtype=object), [1, 2.5, np.nan], ""),
    "nothing": (pd.Series([None, None], dtype=object), [np.nan, np.nan], ""),
    "text": (pd.Series(["1.5", " -2 ", None, "", "3e2", "+.5"]), [1.5, -2, np.nan, np.nan, 300, 0.5], "as text"),
    "Arrow integers": (pd.Series([1, None], dtype="int32[pyarrow]"), [1, np.nan], "as int32[pyarrow]"),
    "Arrow decimals": (
        pd.Series([D("1.50"), None], dtype=pd.ArrowDtype(pa.decimal128(5, 2))), [1.5, np.nan],
        "as decimal128(5, 2)[pyarrow]",
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", NUMBERS)
def test_numbers_are_found_however_they_are_stored(name: str) -> None:
    series, values, stored = NUMBERS[name]
    column = look("z", series)
    assert (column.kind, column.stored) == ("numbers", stored)
    np.testing.assert_array_equal(column.numbers, values)
    np.testing.assert_array_equal(column.missing, np.isnan(values))
    np.testing.assert_array_equal(column.infinite, np.isinf(values))


@pytest.mark.parametrize("dtype", [bool, "boolean", "bool[pyarrow]", object])
def test_yes_and_no_are_one_and_zero(dtype: Any) -> None:
    values = [True, False] if dtype is bool else [True, False, None]
    column = look("z", pd.Series(values, dtype=dtype))
    assert column.kind == "yes/no"
    np.testing.assert_array_equal(column.numbers, [1, 0, np.nan][: len(values)])
    assert as_groups(column, np.ones(len(values), bool))[1] == (False, True)


STAMPS = pd.to_datetime(pd.Series(["2024-03-02 12:00", "2024-03-01 06:00", None]))
DATES = {
    "timestamps": STAMPS,
    "seconds": STAMPS.astype("datetime64[s]"),
    "with a zone": STAMPS.dt.tz_localize("Asia/Tokyo"),
    "Python": pd.Series([dt.datetime(2024, 3, 2, 12), dt.datetime(2024, 3, 1, 6), None], dtype=object),
    "Arrow": STAMPS.astype(pd.ArrowDtype(pa.timestamp("us"))),
    "periods": pd.Series(pd.PeriodIndex(["2024-03-02 12:00", "2024-03-01 06:00", None], freq="h")),
}


@pytest.mark.parametrize("name", DATES)
def test_dates_are_days_since_midnight_of_the_first(name: str) -> None:
    column = look("when", DATES[name])
    assert column.kind == "dates"
    start = first_day(column, ~column.missing)
    assert start == pd.Timestamp("2024-03-01")
    np.testing.assert_array_equal(days_since(column, start), [1.5, 0.25, np.nan])


def test_calendar_dates_beyond_the_nanosecond_range_are_read() -> None:
    column = look("when", pd.Series([dt.date(3024, 3, 1), dt.date(3024, 3, 4)]))
    np.testing.assert_array_equal(as_numbers(column, first_day(column, ~column.missing)), [0, 3])


def test_other_kinds_are_told_apart() -> None:
    found = {
        "text": pd.Series(["ash", None, "007", "12A"]),
        "categories": pd.Series(pd.Categorical([1, 2])),
        "mixture": pd.Series([1, "n/a"], dtype=object),
        "other": pd.Series([[1], [2]]),
    }
    assert {kind: look("z", series).kind for kind, series in found.items()} == {kind: kind for kind in found}
    for series in (pd.Series(pd.to_timedelta([1, 2], unit="h")), pd.Series([1j]), pd.Series([b"a"])):
        assert look("z", series).kind == "other"


def test_numbers_that_text_does_not_plainly_spell_are_not_guessed() -> None:
    assert look("z", pd.Series(["12,5", "13,0", "4"])).stray == ("12,5", "13,0")
    assert look("z", pd.Series(["1", "2", "3", "n/a"])).stray == ("n/a",)
    for codes in (["007", "008"], ["0123", "1"], ["12A", "13B", "14"], ["inf", "nan"], ["2024-01-02"]):
        column = look("z", pd.Series(codes))
        assert (column.kind, column.stray) == ("text", ()), codes


def test_groups_have_natural_order_and_only_levels_in_use() -> None:
    everything = np.ones(5, dtype=bool)
    beds = look("bed", pd.Series(["bed 10", "bed 2", "Bed 1", "bed 2", None]))
    codes, levels = as_groups(beds, everything)
    assert levels == ("Bed 1", "bed 2", "bed 10")
    assert list(codes) == [2, 1, 0, 1, -1]
    own = look("size", pd.Series(pd.Categorical(["s", "l", "s", None, "m"], categories=["xl", "l", "m", "s"])))
    assert as_groups(own, everything)[1] == ("l", "m", "s")
    assert as_groups(own, np.array([True, False, True, True, True]))[1] == ("m", "s")
    whole = look("line", pd.Series([3.0, 1.0, np.nan, 10.0, 1.0]))
    assert as_groups(whole, everything)[1] == (1, 3, 10)
    assert as_groups(look("p", pd.Series([0.5, 0.25, 0.5, 1, 1])), everything)[1] == (0.25, 0.5, 1.0)
    assert list(as_groups(beds, everything, ["bed 2"])[0]) == [-1, 0, -1, 0, -1]


def test_lists_are_no_groups() -> None:
    column = look("z", pd.Series([[1], [2]]))
    with pytest.raises(InputError) as caught:
        as_groups(column, np.ones(2, dtype=bool))
    assert str(caught.value) == (
        "`z` cannot be read as groups.\nIt holds lists or other objects that cannot be compared.\n"
        "Make it text or a category first."
    )


def test_a_column_that_has_no_numbers_is_refused_where_they_are_needed() -> None:
    messages = {
        "The response `z` is text that is not plainly numbers.\nAmong 3 rows: '12,5', '3,0'.\n"
        "Say what the comma means: data['z'].str.replace(',', '.').astype(float), or read with decimal=','.": pd.Series(
            ["12,5", "3,0", "4"]
        ),
        "The response `z` is text that is not plainly numbers.\nAmong 4 rows: 'a', 'b', 'c' and 1 more.\n"
        "Correct them or leave them missing: pd.to_numeric(data['z'], errors='coerce').": pd.Series(list("abcd")),
        "The response `z` is text that is not plainly numbers.\nAmong 2 rows: 'n/a'.\n"
        "Correct them or leave them missing: pd.to_numeric(data['z'], errors='coerce').": pd.Series(
            [1, "n/a"], dtype=object
        ),
        "The response `z` holds dates.\n"
        "A date can be the focal predictor or a covariate (as days since the first), not this.\n"
        "Make it a number first, such as days since a start: (data['z'] - start).dt.days": STAMPS,
        "The response `z` cannot be used as it is stored.\nIt holds: categories.\n"
        "Make it a number (for lengths of time: .dt.total_seconds()), text or a category first.": pd.Series(
            pd.Categorical([1, 2])
        ),
    }
    for message, series in messages.items():
        with pytest.raises(InputError) as caught:
            check_numbers(look("z", series), "response")
        assert str(caught.value) == message
