"""The bulging rule computed, not eyeballed: which power of x or of y would straighten the curve.

Three medians of the data's thirds and the ratio of the two half-slopes between them (Tukey 1977; Mosteller and Tukey
1977; half-slope ratio: Velleman and Hoaglin 1981). With covariates give component-plus-residual values for y.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Literal

import numpy as np

from batten.diagnose.repeats import even_groups
from batten.engine.rows import Array

__all__ = ["Bulge", "Move", "Range", "bulge"]

Move = Literal["down", "up", "none"]
Direction = Literal["rising", "falling", "turning"]
Reading = Literal["bends", "straight", "turns", "cannot tell"]

#: powers looked for; beyond them the ladder has no rung anybody would climb
POWERS = (-5.0, 5.0)
#: a half-slope ratio between 1 / STRAIGHT and STRAIGHT is straight for this purpose (our choice)
STRAIGHT = 1.25


@dataclass(frozen=True)
class Range:
    """Central share of the resampled values."""

    low: float
    high: float


@dataclass(frozen=True)
class Bulge:
    """What the thirds say.

    x, y: medians of the left, middle and right third. slopes: the two half-slopes. ratio: right / left; 1 is straight,
    negative turns. move_y, move_x: along the ladder of powers, as the three medians have it ("none": no power helps).
    power_y, power_x: the power of the medians that gives ratio 1, keeping the sign of the power in the transform; None
    where there is none between -5 and 5 or the values are not above zero. reading: "bends", "straight", "turns" (use a
    quadratic, hinge or spline) or "cannot tell" (the ladder cannot, with these rows).
    By bootstrap, if asked for: turning_share, the share of resamples whose half-slopes differ in sign; ratio_range, in
    which 0 and infinity stand for a curve that turns (None where the three medians turn already); the range of a power
    is None where too many resamples have no such power.
    """

    x: tuple[float, float, float]
    y: tuple[float, float, float]
    slopes: tuple[float, float]
    ratio: float
    direction: Direction
    move_y: Move
    move_x: Move
    power_y: float | None
    power_x: float | None
    reading: Reading
    turning_share: float | None = None
    ratio_range: Range | None = None
    power_y_range: Range | None = None
    power_x_range: Range | None = None


def bulge(
    x: Array, y: Array, *, rng: np.random.Generator | None = None, resamples: int = 400, level: float = 0.95
) -> Bulge | None:
    """Bulging rule for y (n,) along x (n,); rows are resampled in pairs when `rng` is given.

    None when x has fewer than three different values. One resample costs a sort of n rows: give a sample of the rows
    beyond some 20,000.
    """
    # rows sorted by both columns: the resamples drawn must not hang on the stored order
    order = np.lexsort((y, x))
    x, y = x[order], y[order]
    mids = _medians(x, y)
    if mids is None:
        return None
    (left, right), direction = _half_slopes(mids), _direction(mids)
    ratio = right / left if left != 0 else np.inf if right != 0 else np.nan
    turning = ratios = powers_y = powers_x = None
    if rng is not None:
        draws = _resampled(x, y, rng, resamples)
        turning = float(np.mean([_direction(d) == "turning" for d in draws])) if len(draws) else None
        ratios = None if direction == "turning" else _ratio_range(draws, level, trend=float(np.sign(left)))
        powers_y = _power_range(_straightening(draws[:, 1], draws[:, 0]), level)
        powers_x = _power_range(_straightening(draws[:, 0], draws[:, 1]), level)
    move_y, move_x = _moves(direction, ratio)
    return Bulge(
        _three(mids[0]), _three(mids[1]), (left, right), ratio, direction, move_y, move_x,
        power_y=_or_none(_straightening(mids[None, 1], mids[None, 0])[0]),
        power_x=_or_none(_straightening(mids[None, 0], mids[None, 1])[0]),
        reading=_reading(direction, ratios or Range(ratio, ratio), turns=turning is None or turning >= level),
        turning_share=turning, ratio_range=ratios, power_y_range=powers_y, power_x_range=powers_x,
    )  # fmt: skip


def _medians(x: Array, y: Array) -> Array | None:
    """Medians (2, 3) of x and y in the three thirds along sorted x."""
    third = even_groups(x, 3)
    if third is None:
        return None
    ends = np.searchsorted(third, [0, 1, 2, 3])
    return np.array([[np.median(v[a:b]) for a, b in pairwise(ends)] for v in (x, y)])


def _half_slopes(mids: Array) -> tuple[float, float]:
    left, right = np.diff(mids[1]) / np.diff(mids[0])
    return float(left), float(right)


def _direction(mids: Array) -> Direction:
    left, right = np.sign(np.diff(mids[1]))
    return "turning" if left != right or left == 0 else "rising" if left > 0 else "falling"


def _moves(direction: Direction, ratio: float) -> tuple[Move, Move]:
    """Ways to straighten: (along y's ladder, along x's)."""
    if direction == "turning" or ratio == 1:
        return "none", "none"
    if direction == "rising":
        return ("down", "up") if ratio > 1 else ("up", "down")
    return ("up", "up") if ratio > 1 else ("down", "down")


def _reading(direction: Direction, spread: Range, *, turns: bool) -> Reading:
    if direction == "turning":
        return "turns" if turns else "cannot tell"
    if spread.low >= 1 / STRAIGHT and spread.high <= STRAIGHT:
        return "straight"
    bends = spread.low > 0 and np.isfinite(spread.high) and not spread.low <= 1 <= spread.high
    return "bends" if bends else "cannot tell"


def _resampled(x: Array, y: Array, rng: np.random.Generator, resamples: int) -> Array:
    """Medians (B, 2, 3) of resamples; those with fewer than three different x are passed over."""
    found = []
    for _ in range(resamples):
        rows = np.sort(rng.integers(0, len(x), size=len(x)))
        mids = _medians(x[rows], y[rows])
        if mids is not None:
            found.append(mids)
    return np.array(found).reshape(-1, 2, 3)


def _ratio_range(draws: Array, level: float, *, trend: float) -> Range | None:
    """Range of the half-slope ratio, ordered as an angle: hill < levelling off < straight < steepening < valley.

    The ratio itself jumps from plus to minus infinity where the left half-slope passes zero; the angle does not.
    """
    if not len(draws):
        return None
    slopes = trend * np.diff(draws[:, 1], axis=1) / np.diff(draws[:, 0], axis=1)
    angles = np.arctan2(slopes[:, 1], slopes[:, 0])
    ends = np.quantile(angles, [(1 - level) / 2, (1 + level) / 2])
    low, high = (0.0 if a <= 0 else np.inf if a >= np.pi / 2 else float(np.tan(a)) for a in ends)
    return Range(low, high)


def _power_range(powers: Array, level: float) -> Range | None:
    found = powers[np.isfinite(powers)]
    if len(found) < max(1.0, level * len(powers)):
        return None
    return Range(*(float(p) for p in np.quantile(found, [(1 - level) / 2, (1 + level) / 2])))


def _straightening(v: Array, other: Array) -> Array:
    """Power p (B,) with (v_R^p - v_M^p) / (v_M^p - v_L^p) equal to the same ratio of `other`; v, other (B, 3).

    The ratio moves one way along p, so bisection finds the only root; NaN where there is none in POWERS.
    """
    gaps_v, gaps = np.diff(v, axis=1), np.diff(other, axis=1)
    usable = (v.min(axis=1, initial=np.inf) > 0) & (gaps_v.prod(axis=1) > 0) & (gaps.prod(axis=1) > 0)
    answer = np.full(len(v), np.nan)
    logs = np.log(v[usable] / v[usable, 1:2])
    target = np.log(gaps[usable, 1] / gaps[usable, 0])
    rising = np.sign(logs[:, 2])

    def above(p: Array) -> Array:
        """Positive where p is too high."""
        powered = np.where(p == 0, logs.T, np.expm1(p * logs.T) / np.where(p == 0, 1.0, p))
        early, late = np.diff(powered, axis=0)
        return np.asarray(rising * (np.log(late / early) - target))

    low, high = (np.full(len(logs), end) for end in POWERS)
    bracketed = (above(low) <= 0) & (above(high) >= 0)
    for _ in range(60):
        middle = (low + high) / 2
        too_high = above(middle) > 0
        low, high = np.where(too_high, low, middle), np.where(too_high, middle, high)
    answer[usable] = np.where(bracketed, (low + high) / 2, np.nan)
    return answer


def _or_none(p: float) -> float | None:
    return float(p) if np.isfinite(p) else None


def _three(v: Array) -> tuple[float, float, float]:
    return float(v[0]), float(v[1]), float(v[2])
