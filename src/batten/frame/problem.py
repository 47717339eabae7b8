"""What the frame hands to everything else: numbers, names, and the rows that were left out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import pandas as pd

from batten.engine.rows import Array, Ints, Rows
from batten.frame.extras import Beside
from batten.frame.tables import open_table

if TYPE_CHECKING:
    from batten.frame.design import Design

__all__ = ["NewRows", "Problem"]


@dataclass(frozen=True, eq=False)
class NewRows:
    """Rows to predict, coded as the fitted ones were.

    x (k,), base (k, q), modifier (k, m): NaN in every row that cannot be predicted. index: the frame's own.
    weight, exposure (k,): of each row, as `Beside.of_further` gives them.
    notes: one text per row, "" when there is nothing to say (missing value, unseen level 'zinc' of alloy, outside the
    data: mass_kg 80 is beyond 4.2 to 61.0).
    """

    x: Array
    base: Array
    modifier: Array
    index: pd.Index
    notes: tuple[str, ...]
    weight: Array | None = None
    exposure: Array | None = None


@dataclass(frozen=True, eq=False)
class Problem:
    """One analysis: a response, a focal predictor, covariates, and the rows that are complete in all of them.

    formula: as given, on one line, comments removed. response, focus: column names. covariates: the other columns used.
    index: labels of the rows used, in the frame's order. left_out: one row per row left out (frame's index), column
    "why". announcements: choices made that the user should know ("focal predictor: mass_kg; others it could be: ...").
    units: unit of a column, "" where unknown. base_names, modifier_names: plain labels of the columns of `rows`; the
    modifier that is a constant has label "". zero_is_arbitrary: the focal predictor is a date, a year or a temperature.
    profile: (base, modifier) of the rows with the covariates named in `at` set to the asked values, to average over
    instead of the rows' own; None without `at`.
    response_column: the response's column; `response` names what is analysed, which is a rate where there is an
    exposure. beside: columns of weights, clusters and exposure. average_weight: of the rows, in the column's own terms.
    times (stored rows,): how many equal rows each stored row stands for, or None; `rows` and `index` hold all of them.
    design: codes further frames the same way and knows the formula's terms (for emitted scripts).
    """

    formula: str
    response: str
    focus: str
    covariates: tuple[str, ...]
    rows: Rows
    index: pd.Index
    left_out: pd.DataFrame
    announcements: tuple[str, ...]
    units: Mapping[str, str]
    base_names: tuple[str, ...]
    modifier_names: tuple[str, ...]
    zero_is_arbitrary: bool
    design: Design
    frame_name: str = "data"
    profile: tuple[Array, Array] | None = None
    response_column: str = ""
    beside: Beside = field(default_factory=Beside)
    average_weight: float = 1.0
    times: Ints | None = None

    @property
    def stored(self) -> int:
        """Rows of the user's frame that are used; frequencies make more of them."""
        return self.rows.count if self.times is None else len(self.times)

    def unit(self, column: str) -> str:
        """Unit of a column, "" when none is known."""
        return self.units.get(column, "")

    def new_rows(self, frame: pd.DataFrame) -> NewRows:
        """Code another frame with this problem's levels and learned centres."""
        new = self.design.new_rows(frame)
        weight, exposure = self.beside.of_further(open_table(frame), self.average_weight)
        return replace(new, weight=weight, exposure=exposure)
