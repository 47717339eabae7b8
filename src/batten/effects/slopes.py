"""Slopes in units of y per unit of x: at named places, at both sides of a break, and averaged over the rows.

Every remedy answers by the same two questions, so no reading depends on how the model was written. An average slope
near zero on a curve that turns is a warning, not a finding: show it with the slopes along x.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from batten.effects.contrast import no_interval, reach_trouble
from batten.effects.value import Effect, effect_of, undefined
from batten.engine.rows import Array
from batten.fit.averaged import interval
from batten.fit.estimate import Estimate
from batten.fit.slopes import average_slope, averaged_slopes

__all__ = ["NO_SLOPE", "SlopeAt", "average", "breaks", "slopes_along"]

NO_SLOPE = "groups have steps between them, no slope"

#: a slope that changes by this share of its largest within this share of the data's range jumps
JUMP, NEAR = 1e-3, 1e-9


@dataclass(frozen=True)
class SlopeAt:
    """Slope at x; side tells which one where x is a break."""

    x: float
    side: Literal["", "left", "right"]
    slope: Effect


def average(est: Estimate, *, of: str = "mean", level: float = 0.95, errors: str = "robust") -> Effect:
    """Average over the rows of the slope at each row's own x and covariates."""
    if est.shape.steps:
        return undefined(NO_SLOPE)
    found = average_slope(est, of=of, errors=errors)
    if not np.isfinite(found.value).all():
        return undefined(f"a slope of the {of} does not exist at every row")
    effect = effect_of(found.value, interval(found, level))
    why = no_interval(est, effect, of=of)
    return effect.without_interval(why) if why else effect


def slopes_along(
    est: Estimate,
    xs: Sequence[float],
    *,
    of: str = "mean",
    level: float = 0.95,
    errors: str = "robust",
    base: Array | None = None,
    modifier: Array | None = None,
) -> tuple[SlopeAt, ...]:
    """Slopes at each x, averaged over the rows' own covariates or over rows handed in; two where x is a break."""
    if est.shape.steps:
        return tuple(SlopeAt(float(x), "", undefined(NO_SLOPE)) for x in xs)
    asked = [(float(x), side) for x in xs for side in _sides(est, float(x))]
    # one step beyond a break, the slope on its right holds
    places = np.array([np.nextafter(x, np.inf) if side == "right" else x for x, side in asked])
    troubles = [reach_trouble(est, places[[k]], of=of, base=base, modifier=modifier) for k in range(len(places))]
    good = [k for k, trouble in enumerate(troubles) if not trouble]
    effects = [undefined(trouble) for trouble in troubles]
    if good:
        found = averaged_slopes(est, places[good], of=of, base=base, modifier=modifier, errors=errors)
        ends = interval(found, level)
        for at, k in enumerate(good):
            effect = effect_of(found.value, ends, at)
            why = no_interval(est, effect, of=of)
            effects[k] = effect.without_interval(why) if why else effect
    return tuple(SlopeAt(x, side, effect) for (x, side), effect in zip(asked, effects, strict=True))


def breaks(est: Estimate) -> tuple[float, ...]:
    """Places where the slope jumps: breaks that were given or found."""
    if est.shape.steps:
        return ()
    places = est.shape.cuts(est.state, est.theta) or ()
    return tuple(place for place in places if len(_sides(est, place)) == 2)


def _sides(est: Estimate, x: float) -> tuple[Literal["", "left", "right"], ...]:
    """("",), or ("left", "right") where some column's slope jumps at x."""
    low, high = float(est.rows.x.min()), float(est.rows.x.max())
    near = np.array([x, x + NEAR * (high - low)])
    with np.errstate(all="ignore"):
        before, after = est.shape.slopes(near, est.state, est.theta)
        size = np.abs(est.shape.slopes(np.linspace(low, high, 21), est.state, est.theta)).max(axis=0)
    return ("left", "right") if (np.abs(after - before) > JUMP * size).any() else ("",)
