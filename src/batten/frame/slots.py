"""A slot: one column read in one way (as numbers, as groups, as it is), and what it remembers for further rows."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
import pandas as pd

from batten.engine.rows import Array, Ints
from batten.errors import data as errors
from batten.frame.columns import Bools, Column, Kind, as_groups, as_numbers, as_raw, first_day, word
from batten.frame.formula import Grouping
from batten.frame.rownotes import Complaint

__all__ = ["Slot"]


@dataclass(frozen=True)
class Slot:
    """How a column enters the design under one safe name.

    use: "numbers" (n,), "groups" (codes of `levels`) or "as it is" (inside an expression). kind: what the column held
    when the slot was learned. levels: in use, the reference first. start: the day from which dates are counted. low,
    high: range of the numbers on the analysis rows.
    """

    column: str
    use: Literal["numbers", "groups", "as it is"]
    kind: Kind | None = None
    levels: tuple[Any, ...] = ()
    start: pd.Timestamp | None = None
    low: float = -np.inf
    high: float = np.inf

    @property
    def numeric(self) -> bool:
        """Whether the column is used as numbers, also inside an expression."""
        return self.use == "numbers" or (self.use == "as it is" and self.kind == "numbers")

    def learned(self, column: Column, rows: Bools, asked: Grouping) -> Slot:
        """The slot with what it learns from the analysis rows."""
        slot = replace(self, kind=column.kind)
        if slot.use == "groups":
            return replace(slot, levels=_levels(column, rows, asked))
        if not slot.numeric:
            return slot
        start = first_day(column, rows) if column.kind == "dates" else None
        values = as_numbers(column, start)[rows]
        return replace(slot, start=start, low=float(values.min()), high=float(values.max()))

    def numbers(self, column: Column) -> Array:
        """All rows as numbers (n,), NaN where there is none."""
        return as_numbers(column, self.start)

    def codes(self, column: Column, rows: Bools) -> Ints:
        """Level codes of some rows (k,), -1 where the value is no level."""
        return as_groups(column, rows, self.levels)[0]

    def values(self, column: Column, rows: Bools) -> Any:
        """What expressions and contrasts get: an array, a categorical or a series, for some rows."""
        if self.use == "numbers":
            return self.numbers(column)[rows]
        if self.use == "groups":
            levels = pd.Index(list(self.levels), tupleize_cols=False)
            return pd.Categorical.from_codes(self.codes(column, rows), categories=levels)
        return as_raw(column, rows, self.kind or column.kind)

    def complaints(self, column: Column) -> Iterator[Complaint]:
        """Rows that cannot be used, each kind with its words."""
        name, missing = self.column, column.missing
        yield missing, f"missing {name}"
        if column.kind == "dates" and self.start is None:
            return  # nothing learned yet: dates are only there or not
        if self.numeric:
            numbers = self.numbers(column)
            yield np.isinf(numbers), f"infinite {name}"
            yield np.isnan(numbers) & ~missing, lambda i: f"{name} {column.values.iloc[i]!r} is not a number"
        elif self.use == "groups" and self.levels:
            every = np.ones(len(missing), dtype=bool)
            unseen = (self.codes(column, every) < 0) & ~missing
            yield unseen, lambda i: f"unseen level {word(column.values.iloc[i])!r} of {name}"
        else:
            yield column.infinite, f"infinite {name}"

    def beyond(self, column: Column) -> Iterator[Complaint]:
        """Rows outside the range of the analysis rows; they can be predicted, with a note."""
        if self.numeric:
            numbers = self.numbers(column)
            with np.errstate(invalid="ignore"):
                outside = np.isfinite(numbers) & ((numbers < self.low) | (numbers > self.high))
            yield outside, lambda i: self._outside(numbers[i])

    def _outside(self, value: float) -> str:
        shown = [f"{v:.6g}" for v in (value, self.low, self.high)]
        if self.start is not None:
            shown = [word(self.start + pd.Timedelta(days=v)) for v in (value, self.low, self.high)]
        return f"outside the data: {self.column} {shown[0]} is beyond {shown[1]} to {shown[2]}"


def _levels(column: Column, rows: Bools, asked: Grouping) -> tuple[Any, ...]:
    """Levels in use, in the order asked for, the reference first."""
    used = as_groups(column, rows)[1]
    if asked.levels is not None:
        used = tuple(level for level in asked.levels if level in used)
    if asked.reference is None:
        return used
    if asked.reference in used:
        first = asked.reference
    elif isinstance(asked.reference, int) and -len(used) <= asked.reference < len(used):
        first = used[asked.reference]  # as patsy: a level before a position
    else:
        raise errors.no_level(column.name, asked.reference, used)
    return (first, *(level for level in used if level != first))
