"""Turning points: where the slope is zero, with every x that the data do not rule out.

A turning point is never given without its set. The set may be an interval, several pieces, everything, or all outside
an interval; in the last two cases the data do not locate a turning point.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import Literal

import numpy as np
from scipy import stats
from scipy.optimize import brentq

from batten.engine.rows import Array

__all__ = ["Fieller", "FlatSet", "UShape", "delta_std_error", "fieller", "flat_set", "u_shape"]

Piece = tuple[float, float]


@dataclass(frozen=True)
class Fieller:
    """Turning point of a quadratic and the set of places where a zero slope is not rejected.

    pieces: open-ended ones end at -inf or inf. located: the set is one interval. g: t^2 v22 / b2^2, at least 1 when the
    data do not locate a turning point.
    """

    estimate: float
    pieces: tuple[Piece, ...]
    kind: Literal["interval", "everything", "outside an interval"]
    g: float

    @property
    def located(self) -> bool:
        return self.kind == "interval"


@dataclass(frozen=True)
class FlatSet:
    """Turning points of any curve within a range of x.

    estimates: where the slope changes sign; pieces: the x with zero inside the slope's band, cut off at the ends of the
    range (`open_low`, `open_high`: a piece runs to that end, so the set goes on beyond). located: exactly one estimate,
    one piece around it, and not open at either end.
    """

    estimates: tuple[float, ...]
    pieces: tuple[Piece, ...]
    open_low: bool
    open_high: bool

    @property
    def located(self) -> bool:
        return len(self.estimates) == 1 and len(self.pieces) == 1 and not (self.open_low or self.open_high)


@dataclass(frozen=True)
class UShape:
    """Slopes at both ends of x against zero.

    form: "valley" (falls, then rises) or "hill". t_low, t_high: slope over its standard error at the lowest and highest
    x. p: the larger of the two one-sided p; above one half when both slopes have one sign.
    """

    form: Literal["valley", "hill"]
    t_low: float
    t_high: float
    p: float


def fieller(
    b1: float, b2: float, *, v11: float, v12: float, v22: float, critical: float, centre: float = 0.0
) -> Fieller:
    """Every x where b1 + 2 b2 (x - centre) does not differ from zero: exact for a quadratic (Fieller 1954).

    All theta with (b1 + 2 b2 theta)^2 <= t^2 (v11 + 4 theta v12 + 4 theta^2 v22). b1, b2: coefficients of (x - centre)
    and its square, with their covariance; critical: the t quantile. Intervals of finite length for every sample cannot
    keep their level (Gleser and Hwang 1987), so this one is sometimes without ends.
    """
    b1, b2, t2 = float(b1), float(b2), float(critical) ** 2
    estimate = centre - b1 / (2 * b2) if b2 != 0 else float("nan")
    g = float(t2 * v22 / b2**2) if b2 != 0 else float("inf")
    a, half, c = 4 * (b2**2 - t2 * v22), 2 * (b1 * b2 - t2 * v12), b1**2 - t2 * v11
    root = half**2 - a * c
    # at a = 0 the set is a half line; everything covers it, and the reading is the same
    if a == 0 or (g >= 1 and root <= 0):
        return Fieller(estimate, ((-np.inf, np.inf),), "everything", g)
    # the root without cancellation first, the other from their product
    q = -(half + float(np.copysign(np.sqrt(max(root, 0.0)), half)))
    low, high = sorted((float(centre + q / a), float(centre + (c / q if q != 0 else 0.0))))
    if g < 1:
        return Fieller(estimate, ((low, high),), "interval", g)
    return Fieller(estimate, ((-np.inf, low), (high, np.inf)), "outside an interval", g)


def delta_std_error(b1: float, b2: float, *, v11: float, v12: float, v22: float) -> float:
    """Delta-method standard error of -b1 / (2 b2); the centre does not enter.

    For comparison only: symmetric intervals from it fail when b2 is less than some three standard errors from zero.
    """
    d1, d2 = -1 / (2 * b2), b1 / (2 * b2**2)
    return float(np.sqrt(d1**2 * v11 + 2 * d1 * d2 * v12 + d2**2 * v22))


def u_shape(slope_low: float, slope_high: float, *, se_low: float, se_high: float, df: float) -> UShape:
    """Does the curve fall at one end of x and rise at the other? (Sasabuchi 1980; Lind and Mehlum 2010)

    Any curve: slopes and their standard errors at the lowest and highest x. A square that differs from zero proves no
    U shape (Simonsohn 2018), nor does this test alone: the turning point's set must lie inside the data too. The
    form tested is the one the two slopes lean to.
    """
    t_low, t_high = _over(float(slope_low), float(se_low)), _over(float(slope_high), float(se_high))
    valley = slope_high >= slope_low
    against = min(-t_low, t_high) if valley else min(t_low, -t_high)
    p = float(stats.norm.sf(against) if np.isinf(df) else stats.t.sf(against, df))
    return UShape("valley" if valley else "hill", t_low, t_high, p)


def flat_set(
    slopes: Callable[[Array], tuple[Array, Array]], span: tuple[float, float], *, critical: float, points: int = 401
) -> FlatSet:
    """Turning points of any curve over `span` and every x there whose slope's band holds zero.

    slopes(x) gives slope and standard error at x (m,). critical: t quantile for one place named beforehand, the
    simultaneous value (engine.simultaneous) where the reader scans the curve. A curve whose slope jumps (a hinge) turns
    at its break without ever being flat: use the break's own interval there.
    """
    x = np.linspace(*span, points)
    estimates = _crossings(lambda at: slopes(at)[0], x)
    # a steep turn may pass between two grid points
    x = np.union1d(x, estimates)

    def margin(at: Array) -> Array:
        slope, se = slopes(at)
        return np.abs(slope) - critical * se

    flat = margin(x) <= _ROUNDING * float(np.max(np.abs(slopes(x)[0])))
    edges = np.flatnonzero(np.diff(flat.astype(int)))
    ends = [_root(margin, x[i], x[i + 1]) for i in edges]
    ends = [float(x[0])] * bool(flat[0]) + ends + [float(x[-1])] * bool(flat[-1])
    pieces = tuple(zip(ends[::2], ends[1::2], strict=True))
    return FlatSet(tuple(estimates), pieces, open_low=bool(flat[0]), open_high=bool(flat[-1]))


#: a slope this small a share of the largest is zero
_ROUNDING = 1e-10


def _crossings(f: Callable[[Array], Array], x: Array) -> list[float]:
    """Where f changes sign along x (m,); a run of exact zeros between two signs counts once, at its middle."""
    signs = np.sign(f(x))
    kept = np.flatnonzero(signs)
    turns = [(i, j) for i, j in pairwise(kept) if signs[i] != signs[j]]
    return [_root(f, x[i], x[j]) if j == i + 1 else float((x[i + 1] + x[j - 1]) / 2) for i, j in turns]


def _root(f: Callable[[Array], Array], low: float, high: float) -> float:
    """The place between low and high where f changes sign or jumps across zero."""
    xtol = 1e-12 * max(abs(low), abs(high), 1e-300)
    return float(brentq(lambda at: float(f(np.array([at]))[0]), low, high, xtol=xtol))


def _over(slope: float, se: float) -> float:
    return slope / se if se > 0 else float(np.sign(slope) * np.inf) if slope != 0 else 0.0
