"""Announcements: what was assumed about the data, and what the user should be asked about it."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping

import numpy as np
import pandas as pd

from batten.engine.rows import Array
from batten.frame.columns import Bools, Column, word
from batten.frame.formula import Formula
from batten.frame.slots import Slot
from batten.frame.tables import Table

__all__ = ["codes_or_amounts", "dependence", "powers", "read_differently", "zero_is_arbitrary"]

_TEMPERATURE_UNITS = {"c", "f", "°c", "°f", "degc", "degf", "deg c", "deg f", "celsius", "fahrenheit", "℃", "℉"}
_KELVIN = {"k", "kelvin", "kelvins"}
_TEMPERATURE_NAMES = {"temp", "temps", "temperature", "temperatures", "celsius", "fahrenheit", "degc", "degf"}
#: words that name a thing of which there can be several rows
_THINGS = frozenset({
    "id", "ids", "uid", "uuid", "guid", "key", "code", "nr", "serial", "machine", "batch", "lot", "heat", "subject",
    "patient", "participant", "person", "customer", "client", "user", "operator", "worker", "animal", "tree", "plot",
    "bed", "block", "field", "farm", "site", "store", "shop", "branch", "house", "household", "school", "firm",
    "company", "plant", "pump", "furnace", "mould", "mold", "vehicle", "device", "sensor", "specimen", "run", "shift",
    "team",
})  # fmt: skip
_DATE_TEXT = re.compile(r"\s*(\d{4}-\d{1,2}-\d{1,2}|\d{1,2}[./]\d{1,2}[./]\d{2,4})([ T]\d{1,2}:\d{2}.*)?\s*")


def _words(name: str) -> list[str]:
    """The words of a column name: meltTemp_2 gives melt, temp."""
    return [part.lower() for part in re.findall(r"[A-Z]?[^\W\d_A-Z]+|[A-Z]+(?![^\W\d_A-Z])", name)]


def read_differently(columns: Mapping[str, Column], slots: Iterable[Slot], response: str) -> Iterator[str]:
    """Columns that were turned into numbers: text, Decimal and nullable types; yes/no; dates."""
    numeric = dict.fromkeys([response, *(slot.column for slot in slots if slot.use != "groups")])
    stored = {name: columns[name].stored for name in numeric if columns[name].numbers is not None}
    turned = [f"{name} (stored {how})" for name, how in stored.items() if how]
    if turned:
        yield "Read as numbers: " + ", ".join(turned) + "."
    if columns[response].kind == "yes/no":
        yield f"{response} is yes/no: read as 1 and 0, so its mean is the share of yes."
    for slot in slots:
        if slot.use == "numbers" and columns[slot.column].kind == "yes/no":
            yield f"{slot.column} is yes/no: read as 1 and 0."
        if slot.start is not None:
            yield f"{slot.column} is read as days since {word(slot.start)}."


def powers(formula: Formula, focus: str) -> Iterator[str]:
    """A bare power of one column is the column."""
    for text in formula.powers:
        column = text.partition("**")[0].strip()
        instead = "its powers are among the remedies" if column == focus else f"a power is written I({text})"
        yield f"{text} in a formula means just {column}; {instead}."


def codes_or_amounts(x: Array, focus: str, covariates: Iterable[tuple[str, Array]]) -> Iterator[str]:
    """Few whole numbers may be codes of groups. Arrays (n,): values on the analysis rows."""
    distinct = np.unique(x)
    if len(distinct) == 2:
        yield f"{focus} takes only two values: it has a difference, but no shape."
    elif len(distinct) <= min(5, len(x) / 4) and _whole(distinct):
        yield (
            f"{focus} takes only {len(distinct)} whole numbers: if they are codes, it is a group; "
            f"then write C({focus}) and choose another focal predictor."
        )
    for name, values in covariates:
        distinct = np.unique(values)
        if 2 < len(distinct) <= min(8, len(x) / 4) and _whole(distinct):
            yield f"{name} holds {len(distinct)} whole numbers: if they are codes, write C({name})."


def _whole(values: Array) -> bool:
    return bool(np.all(values == np.round(values)))


def zero_is_arbitrary(focus: str, unit: str, x: Array, *, date: bool) -> str:
    """Why roots, logs and powers of the focal predictor are off: "a date", "a year", "a temperature", or ""."""
    if date:
        return "a date"
    if "year" in focus.lower() and _whole(x) and x.min() >= 1800 and x.max() <= 2200:
        return "a year"
    unit = unit.strip().lower()
    warm = unit in _TEMPERATURE_UNITS or bool(_TEMPERATURE_NAMES & set(_words(focus)))
    return "a temperature" if warm and unit not in _KELVIN else ""


# --- dependence -------------------------------------------------------------------------------------------------------


def dependence(table: Table, rows: Bools, *, grouped: Iterable[str], numeric: Iterable[str]) -> Iterator[str]:
    """Columns that suggest that rows are not independent.

    grouped: columns that stand in the formula as groups, which then have levels of their own. numeric: columns used as
    numbers, which are no names of things.
    """
    grouped, kinds = set(grouped), table.kinds()
    looked_at = [name for name in kinds if isinstance(name, str) and kinds[name] and name not in set(numeric)]
    repeated, dated = [], []
    for name in looked_at:
        if kinds[name] == "dates" or (kinds[name] == "text" and _holds_dates(table, name)):
            dated.append(name)
        elif count := _repeats(table, name, kinds[name], rows, grouped=name in grouped):
            repeated.append(f"{name} ({count} in {int(rows.sum())} rows)")
    if repeated:
        yield (
            "Values repeat in " + ", ".join(repeated) + ": are rows that share one independent? "
            "If not, give that column as cluster."
        )
    if dated:
        yield f"{', '.join(dated)}: rows close in time can resemble each other; look at what is left in order of time."


def _repeats(table: Table, name: str, kind: str, rows: Bools, *, grouped: bool) -> int:
    """Distinct values of a column that names things with several rows each, else 0."""
    named = bool(_THINGS & set(_words(name)))
    if not named and kind != "text":
        return 0
    try:
        # a look at the start settles most columns of a long table: hardly any repeats, or only a handful of values
        if not named and not 10 <= table.start(name, 2000).nunique() <= 1000:
            return 0
        count = int(table.frame([name])[name][rows].nunique())
    except TypeError:
        return 0
    fewest = 2 if named and not grouped else 10
    return count if fewest <= count <= rows.sum() / 2 else 0


def _holds_dates(table: Table, name: str) -> bool:
    """Text or objects that read as dates, judged by the first twenty."""
    first = table.start(name, 200).dropna().iloc[:20]
    if pd.api.types.infer_dtype(first) in ("date", "datetime", "datetime64"):
        return True
    return len(first) > 0 and all(isinstance(v, str) and _DATE_TEXT.fullmatch(v) for v in first)
