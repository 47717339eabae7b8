"""The design learned on the analysis rows: which columns the formula makes, and the same columns for further rows.

Every term either holds the focal predictor or does not. The columns of the terms without it are `base`; in the others
the focal predictor is left out of the product (as if its column were ones), which leaves the columns that multiply it:
`modifier`. So any shape of the focal predictor can be put in its place.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, Literal

import numpy as np
import pandas as pd

from batten.engine.rows import Array, Ints
from batten.errors import data as errors
from batten.frame.columns import Column, look
from batten.frame.evaluate import Values, unknown, worked_out_in_parts
from batten.frame.expression import Expression
from batten.frame.formula import Block, Recipe
from batten.frame.problem import NewRows
from batten.frame.rownotes import RowNotes
from batten.frame.slots import Slot
from batten.frame.tables import open_table

__all__ = ["FOCUS", "Design", "Factor", "Term", "matrices"]

#: the safe name of the focal predictor
FOCUS = "batten_x"


@dataclass(frozen=True)
class Factor:
    """One factor of a term, for whoever writes the formula anew.

    text: as patsy reads it, in the user's names. label: the same for reading. levels: of a group, those in use, in
    order; under treatment coding the first is the reference. contrast: "treatment", or the name of another coding
    ("Sum"). dropped: aliased, so that nothing of it is left in any term.
    """

    text: str
    label: str
    kind: Literal["numeric column", "categorical column", "expression"]
    expression: Expression
    levels: tuple[Any, ...] = ()
    contrast: str = "treatment"
    dropped: bool = False

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns used."""
        return self.expression.columns

    @property
    def calls(self) -> tuple[str, ...]:
        """Other names the text needs: np, a function of the user's."""
        return self.expression.calls

    def written(self, names: Mapping[str, str]) -> str:
        """The text with every column written as names[column]: plain names, or Python expressions."""
        return self.expression.written(names)


@dataclass(frozen=True)
class Term:
    """columns: positions in `modifier` when has_focus, else in `base`. dropped: labels of its aliased columns."""

    factors: tuple[Factor, ...]
    has_focus: bool
    columns: tuple[int, ...]
    dropped: tuple[str, ...] = ()


@dataclass(frozen=True, eq=False)
class Design:
    """What the formula makes of rows.

    terms: in the order of their columns; the intercept is no term. focus: name of the focal predictor. slots: how each
    column is read, by safe name. recipes: how each factor is worked out, by its code in safe names; labels: the same
    for reading. blocks: products of factors; base and modifier columns come in their order. keep_base, keep_modifier:
    the columns that are not aliased. read: the analysis rows' columns as they were read.
    """

    terms: tuple[Term, ...]
    has_intercept: bool
    focus: str
    slots: Mapping[str, Slot]
    recipes: Mapping[str, Recipe]
    labels: Mapping[str, str]
    blocks: tuple[Block, ...]
    keep_base: tuple[int, ...]
    keep_modifier: tuple[int, ...]
    base_names: tuple[str, ...]
    modifier_names: tuple[str, ...]
    read: Mapping[str, pd.Series[Any]] = field(repr=False)

    @property
    def needed(self) -> tuple[str, ...]:
        """Columns a further frame must have."""
        return tuple(dict.fromkeys(slot.column for slot in self.slots.values()))

    def used(self, index: pd.Index[Any]) -> pd.DataFrame:
        """The predictors of the analysis rows as they were read (a fresh frame), to be changed and coded again.

        Numbers are float64, dates are dates; `new_rows` also takes dates as days since the first.
        """
        return pd.DataFrame({name: values.set_axis(index) for name, values in self.read.items()}, index=index)

    def taken(self, rows: Ints) -> Design:
        """The same for some of the analysis rows, or for repeated ones."""
        read = {name: values.iloc[rows].reset_index(drop=True) for name, values in self.read.items()}
        return replace(self, read=read)

    def new_rows(self, frame: Any) -> NewRows:
        """Code further rows with the levels, centres and knots learned here."""
        table = open_table(frame)
        missing = [name for name in self.needed if name not in table.counts]
        if missing:
            raise errors.columns_missing(missing, table.names)
        columns = {str(name): look(str(name), values) for name, values in table.frame(self.needed).items()}
        notes = RowNotes(len(table))
        for slot in self.slots.values():
            for complaint in slot.complaints(columns[slot.column]):
                notes.add(complaint)
        values = self._values(columns, notes)
        for slot in self.slots.values():
            for complaint in slot.beyond(columns[slot.column]):
                notes.add(complaint, fatal=False)
        good = np.flatnonzero(~notes.bad)
        x = self.slots[FOCUS].numbers(columns[self.focus])[good]
        base, modifier = matrices(self.blocks, values, len(good))
        return NewRows(
            x=_spread(x, good, len(table)),
            base=_spread(base[:, list(self.keep_base)], good, len(table)),
            modifier=_spread(modifier[:, list(self.keep_modifier)], good, len(table)),
            index=table.index,
            notes=tuple(notes.texts),
        )

    def _values(self, columns: Mapping[str, Column], notes: RowNotes) -> dict[str, Values]:
        """Factors on the rows that can be predicted; rows where one cannot be worked out are added to the bad ones."""
        rows = np.flatnonzero(~notes.bad)
        data = {name: slot.values(columns[slot.column], ~notes.bad) for name, slot in self.slots.items()}
        found = {}
        for code, recipe in self.recipes.items():
            label = self.labels[code]
            found[code] = worked_out_in_parts(recipe, data, len(rows), label=label)
            lost = np.zeros(len(notes.bad), dtype=bool)
            lost[rows] = unknown(found[code])
            notes.add((lost, f"{label} cannot be worked out"))
        good = ~notes.bad[rows]
        return {code: values[good] for code, values in found.items()}


def matrices(blocks: Sequence[Block], values: Mapping[str, Values], count: int) -> tuple[Array, Array]:
    """All columns of base (count, q) and modifier (count, m), aliased ones included, from the factors' values."""
    parts: dict[bool, list[Array]] = {False: [], True: []}
    for block in blocks:
        parts[block.has(FOCUS)].append(_product(block, values, count))
    return _stacked(parts[False], count), _stacked(parts[True], count)


def _product(block: Block, values: Mapping[str, Values], count: int) -> Array:
    """Columns of one block (count, k), the focal predictor left out; the first factor's columns vary fastest."""
    parts = [_columns(values[code], contrast) for code, contrast in block.without(FOCUS)]
    made = parts[0] if parts else np.ones((count, 1))
    for part in parts[1:]:
        made = (part[:, :, None] * made[:, None, :]).reshape(count, -1)
    return made


def _columns(values: Values, contrast: Array | None) -> Array:
    return np.asarray(values if contrast is None else contrast[values], dtype=np.float64)


def _stacked(parts: Sequence[Array], count: int) -> Array:
    return np.column_stack(parts) if parts else np.empty((count, 0))


def _spread(part: Array, rows: Any, count: int) -> Array:
    """Values of some rows put in their places, NaN elsewhere."""
    whole = np.full((count, *part.shape[1:]), np.nan)
    whole[rows] = part
    return whole
