"""A table to pin on a wall: mean, median and the interval for a new row at round values of x."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from batten.effects.contrast import reach_trouble
from batten.engine.rows import Array
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means
from batten.fit.moved import moved_row_interval

__all__ = ["LookupRow", "lookup", "round_places"]


@dataclass(frozen=True)
class LookupRow:
    """One line: mean and median averaged over covariates, low and high for one further row whose covariates are those
    of the rows; units of y. NaN where there is none, with the reason in note.
    """

    x: float
    mean: float
    median: float
    low: float
    high: float
    note: str = ""


def round_places(low: float, high: float, *, about: int = 10) -> tuple[float, ...]:
    """Multiples of 1, 2 or 5 times a power of ten inside [low, high], `about` of them or somewhat fewer."""
    if not high > low:
        return (low,)
    at_least = (high - low) / about
    power = math.floor(math.log10(at_least))
    lead = min(m for m in (1, 2, 5, 10) if m * 10.0**power >= at_least * (1 - 1e-9))
    step, digits = lead * 10.0**power, max(0, -power)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return tuple(round(k * step, digits) for k in range(first, last + 1))


def lookup(
    est: Estimate,
    xs: tuple[float, ...] | None = None,
    *,
    level: float = 0.95,
    errors: str = "robust",
    profile: tuple[Array, Array] | None = None,
    weights: Array | None = None,
) -> tuple[LookupRow, ...]:
    """Rows of the table at xs, by default round values inside the data.

    profile: covariates (base, modifier) to average over instead of the rows' own.
    """
    if xs is None:
        xs = round_places(float(est.rows.x.min()), float(est.rows.x.max()))
    base, modifier = profile or (None, None)
    troubles = {
        of: [reach_trouble(est, np.array([x]), of=of, base=base, modifier=modifier) for x in xs]
        for of in ("mean", "median")
    }  # fmt: skip
    columns = {}
    for of, trouble in troubles.items():
        good = np.array([not t for t in trouble])
        column = np.full(len(xs), np.nan)
        if good.any():
            places = np.array(xs)[good]
            found = averaged_means(est, places, of=of, base=base, modifier=modifier, weights=weights, root=False)
            column[good] = found.value
        columns[of] = column
    low, high = moved_row_interval(est, np.array(xs), level=level, errors=errors, profile=profile)
    lost = np.array([bool(t) for t in troubles["median"]])
    low[lost], high[lost] = np.nan, np.nan
    return tuple(
        LookupRow(float(x), float(m), float(d), float(a), float(b), note)
        for x, m, d, a, b, note in zip(
            xs, columns["mean"], columns["median"], low, high, troubles["mean"], strict=True
        )
    )  # fmt: skip
