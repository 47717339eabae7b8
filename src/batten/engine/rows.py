"""The numbers of one analysis: what the engine gets from the frame."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.intp]

__all__ = ["Array", "Ints", "Rows"]


@dataclass(frozen=True, eq=False)
class Rows:
    """One analysis sample, complete in every column.

    The design of a remedy with shape columns S (n, k) is [base | S * modifier[:, 0] | S * modifier[:, 1] | ...]:
    the focal predictor stands in the formula alone (modifier column of ones) or in interactions (one modifier column
    for each column it is multiplied with).

    y: response (n,), units of y. x: focal predictor (n,), its own units.
    base: columns of all terms without the focal predictor (n, q), the intercept among them when there is one.
    modifier: columns that multiply the focal predictor (n, m).
    intercept: position of the constant column in `base`, or None.
    constant: whether a constant lies in the span of `base` (true for `C(g) - 1` too).
    weights: (n,) with mean 1, or None: the error variance of a row is s2 / w, s2 that of a row of average weight.
    cluster: codes 0..G-1 (n,), every code in use, or None.
    """

    y: Array
    x: Array
    base: Array
    modifier: Array
    intercept: int | None = 0
    constant: bool = True
    weights: Array | None = None
    cluster: Ints | None = None

    @property
    def count(self) -> int:
        """How many rows (frequencies have been written out as repeated rows)."""
        return len(self.y)

    @cached_property
    def root_weight(self) -> Array:
        """sqrt(w) (n,), ones without weights: rows times it have errors of one variance."""
        return np.ones(self.count) if self.weights is None else np.sqrt(self.weights)

    def weigh(self, values: Array) -> Array:
        """values (n, ...) with every row times sqrt(w)."""
        if self.weights is None:
            return values
        return np.asarray(values * self.root_weight.reshape(-1, *[1] * (values.ndim - 1)))

    @cached_property
    def patterns(self) -> tuple[Ints, Array, Ints]:
        """Distinct covariate rows: where each first stands (u,), how many rows have it (u,), each row's own (n,)."""
        both = np.hstack([self.base, self.modifier])
        if both.shape[1] == 2 and (both == both[0]).all():
            return np.zeros(1, dtype=np.intp), np.array([float(self.count)]), np.zeros(self.count, dtype=np.intp)
        # equal rows give equal sums in a fixed order of additions, so one sort of numbers replaces a sort of rows
        mark = np.zeros(self.count)
        for column, weight in zip(both.T, np.random.default_rng(1).normal(size=(both.shape[1],)), strict=True):
            mark = mark + column * weight
        _, first, pattern, count = np.unique(mark, return_index=True, return_inverse=True, return_counts=True)
        return first.astype(np.intp), count.astype(float), pattern.astype(np.intp)

    def take(self, which: Ints | npt.NDArray[np.bool_]) -> Rows:
        """The same analysis on a subset (or repeated selection) of its rows."""

        return Rows(
            y=self.y[which], x=self.x[which], base=self.base[which], modifier=self.modifier[which],
            intercept=self.intercept, constant=self.constant,
            weights=None if self.weights is None else self.weights[which],
            cluster=None if self.cluster is None else self.cluster[which],
        )  # fmt: skip
