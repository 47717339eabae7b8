"""The standing question's default: two x values that a person would say."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np

from batten.engine.rows import Array

__all__ = ["round_span"]

#: a rounded end may miss its quartile by half of this share of the distance between the quartiles
STEP_SHARE = 0.1
#: with up to this many different values the ends are among them
FEW = 6


def round_span(x: Array) -> tuple[float, float]:
    """Quartiles of x (n,), rounded to a step of 1, 2 or 5 times a power of ten that is small beside their distance.

    Where the quartiles are equal, the 10th and 90th percentile; where these are equal too, the lowest and the highest
    value. Rounded ends stay inside the data.
    """
    # between a few values that x takes there is nothing to speak of
    method: Literal["nearest", "linear"] = "nearest" if len(np.unique(x)) <= FEW else "linear"
    for tail in (0.25, 0.10, 0.0):
        low, high = (float(v) for v in np.quantile(x, [tail, 1 - tail], method=method))
        if high > low:
            break
    else:
        return float(x[0]), float(x[0])
    step, digits = _step(STEP_SHARE * (high - low))
    inside = float(np.min(x)), float(np.max(x))
    a, b = (round(round(end / step) * step, digits) for end in (low, high))
    # an end rounded out of the data moves one step back
    a = round(a + step, digits) if a < inside[0] else a
    b = round(b - step, digits) if b > inside[1] else b
    return (a, b) if inside[0] <= a < b <= inside[1] else (low, high)


def _step(at_most: float) -> tuple[float, int]:
    """Largest of 1, 2 or 5 times a power of ten up to `at_most`, and the decimals it needs."""
    power = math.floor(math.log10(at_most))
    lead = max(m for m in (1, 2, 5) if m * 10.0**power <= at_most * (1 + 1e-9))
    return lead * 10.0**power, max(0, -power)
