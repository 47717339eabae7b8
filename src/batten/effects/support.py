"""How much of a span effect rests on rows that exist: the share of (a or b, C_i) with no rows near it.

A span effect moves every row to a and to b with its own covariates. A pair (x, C) has rows near it when some row of
the same groups lies within a tenth of the central 90% of x from there, and each numeric covariate of C lies within the
range of those rows' values, a quarter of its standard deviation beyond their ends allowed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints, Rows

__all__ = ["Support", "support"]

#: how near in x, as a share of the distance between its 5th and 95th percentile
NEAR = 0.10
#: how far beyond the neighbours' range a numeric covariate may lie, in standard deviations
BEYOND = 0.25
#: columns with at most this many values, each repeated several times, are read as groups
LEVELS = 12


@dataclass(frozen=True)
class Support:
    """missing_a, missing_b: share of the rows with no rows near them at each end. distance: in units of x."""

    missing_a: float
    missing_b: float
    distance: float

    @property
    def missing(self) -> float:
        """Share of both ends together."""
        return (self.missing_a + self.missing_b) / 2


def support(
    rows: Rows, span: tuple[float, float], *, base: Array | None = None, modifier: Array | None = None
) -> Support:
    """Support of a span under the rows' own covariates, or under base (u, q) and modifier (u, m)."""
    own = np.hstack([rows.base, rows.modifier])
    asked = own if base is None or modifier is None else np.hstack([base, modifier])
    grouping = np.array([_is_grouping(column) for column in own.T], dtype=bool)
    low, high = np.quantile(rows.x, [0.05, 0.95])
    distance = NEAR * float(high - low)
    own_group, asked_group = _codes(own[:, grouping], asked[:, grouping])
    slack = BEYOND * own[:, ~grouping].std(axis=0)
    shares = [
        _missing(
            np.abs(rows.x - end) <= distance, own_group, asked_group, own[:, ~grouping], asked[:, ~grouping], slack
        )
        for end in span
    ]
    return Support(shares[0], shares[1], distance)


def _is_grouping(column: Array) -> bool:
    values = len(np.unique(column[:50_000]))
    return values <= 2 or values <= min(LEVELS, len(column) / 5)


def _codes(own: Array, asked: Array) -> tuple[Ints, Ints]:
    """Codes (n,), (u,) of equal combinations of group columns."""
    both = np.vstack([own, asked])
    # equal rows give equal sums in a fixed order of additions, so one sort of numbers replaces a sort of rows
    draw: Array = np.random.default_rng(1).normal(size=(both.shape[1],))
    mark = np.zeros(len(both))
    for column, weight in zip(both.T, draw, strict=True):
        mark = mark + column * weight
    codes = np.unique(mark, return_inverse=True)[1].astype(np.intp)
    return codes[: len(own)], codes[len(own) :]


def _missing(
    near: np.ndarray[tuple[int], np.dtype[np.bool_]],
    own_group: Ints,
    asked_group: Ints,
    own: Array,
    asked: Array,
    slack: Array,
) -> float:
    """Share of the asked covariate rows without rows near them at one end."""
    lost = 0
    for group in np.unique(asked_group):
        wanted = asked[asked_group == group]
        there = own[near & (own_group == group)]
        if not len(there):
            lost += len(wanted)
            continue
        inside = (wanted >= there.min(axis=0) - slack) & (wanted <= there.max(axis=0) + slack)
        lost += int((~inside.all(axis=1)).sum())
    return lost / len(asked)
