"""One column of the user's table: what it holds, and how it is read as numbers or as groups."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import pandas as pd
from pandas.api import types

from batten.engine.rows import Array, Ints
from batten.errors import data as errors

__all__ = [
    "Bools",
    "Column",
    "Kind",
    "as_groups",
    "as_numbers",
    "as_raw",
    "check_numbers",
    "days_since",
    "first_day",
    "look",
    "match_levels",
    "plain",
    "word",
]

Bools = npt.NDArray[np.bool_]
Kind = Literal["numbers", "yes/no", "dates", "text", "categories", "mixture", "other"]

# digits as a program writes them; leading zeros mark codes (007), a comma is left to the user
_PLAIN_NUMBER = re.compile(r"\s*[+-]?((0|[1-9]\d*)(\.\d*)?|\.\d+)([eE][+-]?\d+)?\s*")
_LIKE_A_NUMBER = re.compile(r"\s*[+-]?([1-9][\d.,' ]*|0?[.,]\d+|0)([eE][+-]?\d+)?\s*%?\s*")
_INFERRED: dict[str, Kind] = {
    "string": "text", "boolean": "yes/no", "integer": "numbers", "floating": "numbers", "decimal": "numbers",
    "mixed-integer-float": "numbers", "empty": "numbers", "date": "dates", "datetime": "dates",
    "datetime64": "dates", "mixed-integer": "mixture", "mixed": "mixture",
}  # fmt: skip
_OBJECTS = {"mixed": "lists or other objects", "timedelta": "lengths of time", "bytes": "raw bytes"}


@dataclass(frozen=True, eq=False)
class Column:
    """A column as found.

    values: a copy with a fresh index 0..n-1. missing (n,): also blank text. numbers (n,): NaN where missing; for kinds
    "numbers" and "yes/no". stored: how numbers were stored when that is worth saying ("as text", "as Decimal"), else
    "". stray: texts that keep the column from being numbers, when most of its values look like numbers. coded: for
    text, codes (n,) and the distinct values.
    """

    name: str
    kind: Kind
    values: pd.Series[Any]
    missing: Bools
    numbers: Array | None = None
    stored: str = ""
    stray: tuple[str, ...] = ()
    coded: tuple[Ints, Sequence[Any]] | None = None

    @property
    def infinite(self) -> Bools:
        """Rows whose number is infinite (n,)."""
        return np.isinf(self.numbers) if self.numbers is not None else np.zeros(len(self.values), dtype=bool)


def look(name: str, series: pd.Series[Any]) -> Column:
    """Find out what a column holds. Numbers are copied as float64 (n,)."""
    series = series.reset_index(drop=True)
    dtype = series.dtype
    if isinstance(dtype, pd.ArrowDtype) and str(dtype).startswith("dictionary"):
        series = series.astype(object).astype("category")
    if isinstance(series.dtype, pd.CategoricalDtype):
        return Column(name, "categories", series.copy(), _missing(series))
    if types.is_bool_dtype(dtype):
        return _numeric(name, series, "yes/no", _dtype_word(dtype))
    if types.is_datetime64_any_dtype(dtype) or isinstance(dtype, pd.PeriodDtype):
        return _dates(name, series)
    if types.is_numeric_dtype(dtype) and not types.is_complex_dtype(dtype):
        return _numeric(name, series, "numbers", _dtype_word(dtype))
    if types.is_object_dtype(dtype) or types.is_string_dtype(dtype):
        return _objects(name, series)
    stored = "lengths of time" if types.is_timedelta64_dtype(dtype) else str(dtype)
    return Column(name, "other", series.copy(), _missing(series), stored=stored)


def _missing(series: pd.Series[Any]) -> Bools:
    return np.asarray(series.isna(), dtype=bool)


def _dtype_word(dtype: Any) -> str:
    """Nullable and Arrow types are named; numpy's own need no word."""
    return "" if isinstance(dtype, np.dtype | pd.SparseDtype) else f"as {dtype}"


def _numeric(name: str, series: pd.Series[Any], kind: Kind, stored: str) -> Column:
    numbers = np.array(series.to_numpy(dtype=np.float64, na_value=np.nan), dtype=np.float64)
    return Column(name, kind, pd.Series(numbers), np.isnan(numbers), numbers, stored)


def _dates(name: str, series: pd.Series[Any]) -> Column:
    """Dates of any storage as timestamps without a time zone: the wall clock of the zone they carry."""
    try:
        stamps = series.dt.to_timestamp() if isinstance(series.dtype, pd.PeriodDtype) else pd.to_datetime(series)
        stamps = stamps.dt.tz_localize(None).astype("datetime64[us]")
    except (TypeError, ValueError, OverflowError):
        return Column(name, "other", series.copy(), _missing(series), stored="dates that pandas cannot read together")
    return Column(name, "dates", stamps, _missing(series))


def _objects(name: str, series: pd.Series[Any]) -> Column:
    inferred = types.infer_dtype(series, skipna=True)
    kind = _INFERRED.get(inferred, "other")
    missing = _missing(series)
    if kind == "mixture" and inferred == "mixed":
        kind = _mixed(series[~missing])
    if kind in ("numbers", "yes/no"):
        stored = "as Decimal" if inferred == "decimal" else ""
        return _numeric(name, pd.to_numeric(series.astype(object).where(~missing, np.nan)).astype(float), kind, stored)
    if kind == "dates":
        return _dates(name, series)
    if kind == "text":
        return _text(name, series, missing)
    stored = {"mixture": "numbers and text together"}.get(kind, _OBJECTS.get(inferred, inferred))
    return Column(name, kind, series.copy(), missing, stored=stored)


def _mixed(values: pd.Series[Any]) -> Kind:
    """Objects of several types: numbers of several types are numbers; anything with text is a mixture."""
    import numbers
    from decimal import Decimal

    if all(isinstance(v, numbers.Real | Decimal) and not isinstance(v, bool) for v in values):
        return "numbers"
    return "mixture" if all(isinstance(v, numbers.Real | Decimal | str) for v in values) else "other"


def _text(name: str, series: pd.Series[Any], missing: Bools) -> Column:
    """Text: numbers when every value is plainly one, else groups. Blank text counts as missing."""
    codes, found = pd.factorize(series)
    texts = [str(t) for t in found]
    blank = np.array([not t.strip() for t in texts] + [False])
    missing = missing | blank[codes]
    told = [t for t in texts if t.strip()]
    stray = tuple(t for t in told if not _PLAIN_NUMBER.fullmatch(t))
    if told and not stray:
        table = np.array([float(t) if t.strip() else np.nan for t in texts] + [np.nan])
        return Column(name, "numbers", series.copy(), missing, table[codes], "as text", coded=(codes, texts))
    alike = sum(1 for t in told if _LIKE_A_NUMBER.fullmatch(t))
    stray = stray if 2 * alike > len(told) else ()
    return Column(name, "text", series.copy(), missing, stray=stray, coded=(codes, texts))


# --- as numbers -------------------------------------------------------------------------------------------------------


def first_day(column: Column, rows: Bools) -> pd.Timestamp:
    """Midnight of the first date among the rows."""
    first: pd.Timestamp = column.values[rows].min()
    return first.normalize()


def days_since(column: Column, start: pd.Timestamp) -> Array:
    """Days and fractions of days since `start` (n,); NaN where missing."""
    days = (column.values - start) / pd.Timedelta(days=1)
    return np.array(days.to_numpy(dtype=np.float64), dtype=np.float64)


def as_numbers(column: Column, start: pd.Timestamp | None = None) -> Array:
    """The column as float64 (n,); NaN where it is missing or no number. `start`: for dates."""
    if column.numbers is not None:
        return column.numbers
    if column.kind == "dates" and start is not None:
        return days_since(column, start)
    if column.kind in ("text", "mixture"):
        loose = pd.to_numeric(column.values.astype(object), errors="coerce")
        return np.array(loose.to_numpy(dtype=np.float64, na_value=np.nan), dtype=np.float64)
    return np.full(len(column.values), np.nan)


def check_numbers(column: Column, role: str) -> None:
    """Refuse a column that has no numbers where numbers are needed."""
    if column.numbers is not None:
        return
    if column.kind == "dates":
        raise errors.is_dates(column.name, role)
    if column.kind in ("text", "mixture"):
        loose = as_numbers(column)
        stray = column.values[np.isnan(loose) & ~column.missing].astype(str).unique()
        raise errors.not_numbers(column.name, role, tuple(stray), len(column.values))
    raise errors.stores(column.name, role, column.stored or column.kind)


def as_raw(column: Column, rows: Bools, kind: Kind) -> pd.Series[Any]:
    """The column for use in an expression, as the kind it was: float64, booleans, or text and dates as they are."""
    if kind == "yes/no":
        values = pd.Series(as_numbers(column) == 1)
    else:
        values = pd.Series(as_numbers(column)) if kind == "numbers" else column.values
    return values[rows].reset_index(drop=True)


# --- as groups --------------------------------------------------------------------------------------------------------


def as_groups(column: Column, rows: Bools, levels: Sequence[Any] | None = None) -> tuple[Ints, tuple[Any, ...]]:
    """Codes (k,) of the rows and the levels: those given, else those in use, in the categories' own or natural order.

    A missing value, or one that is no level, has code -1.
    """
    codes, found = column.coded or _factorized(column)
    codes = np.where(column.missing, -1, codes)[rows]
    values = plain(found)
    if levels is None:
        used = set(np.unique(codes[codes >= 0]).tolist())
        levels = _in_order([v for i, v in enumerate(values) if i in used], column)
    return match_levels(codes, values, levels), tuple(levels)


def match_levels(codes: Ints, found: Sequence[Any], levels: Sequence[Any]) -> Ints:
    """Codes of the levels from codes of the values found; -1 where a value is missing or no level."""
    place = {level: i for i, level in enumerate(levels)}
    table = np.array([place.get(v, -1) for v in found] + [-1], dtype=np.intp)
    return table[codes]


def plain(values: Iterable[Any]) -> list[Any]:
    """numpy's scalars as Python's own, so that a level prints 2 and not np.int64(2)."""
    return [v.item() if isinstance(v, np.generic) else v for v in values]


def _factorized(column: Column) -> tuple[Ints, Sequence[Any]]:
    try:
        codes, found = pd.factorize(_group_values(column))
    except TypeError:
        raise errors.not_groups(column.name) from None
    return codes, list(found)


def _group_values(column: Column) -> pd.Series[Any]:
    """Whole numbers as integers, so that a level reads 2 and not 2.0; text as it is stored."""
    if column.kind == "yes/no":
        return pd.Series(column.numbers == 1)
    if column.numbers is None:
        return column.values
    known = column.numbers[~column.missing]
    if np.all(np.abs(known) < 2**53) and np.all(known == np.round(known)):
        return pd.Series(np.where(column.missing, 0, column.numbers).astype(np.int64))
    return pd.Series(column.numbers)


def _in_order(levels: list[Any], column: Column) -> list[Any]:
    """Categories' own order; else numbers by size, text with its digits read as numbers (bed 2 before bed 10)."""
    if column.kind == "categories":
        own = list(column.values.cat.categories)
        return sorted(levels, key=own.index)
    if all(isinstance(v, str) for v in levels):
        return sorted(levels, key=_natural)
    try:
        return sorted(levels)
    except TypeError:
        return sorted(levels, key=lambda v: (isinstance(v, str), _natural(str(v))))


def _natural(text: str) -> tuple[list[Any], str]:
    # split alternates text and digits, so like is compared with like
    return [int(part) if i % 2 else part for i, part in enumerate(re.split(r"(\d+)", text))], text


def word(level: Any) -> str:
    """A level as people write it."""
    if isinstance(level, float):
        return f"{level:.10g}"
    if isinstance(level, pd.Timestamp):
        return level.isoformat(sep=" ").removesuffix(":00").removesuffix(" 00:00")
    return str(level)
