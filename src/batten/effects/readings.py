"""Coefficients of the ladder in words' terms: per unit, per doubling, per percent; differences or exact percents.

The ends of an interval are transformed, so intervals of percents are asymmetric (Halvorsen and Palmquist 1980). Only
remedies whose coefficient keeps its meaning all along x have a reading here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.stats import t as student

from batten.effects.coefficients import coefficients
from batten.effects.value import Effect
from batten.families.shapes.log import Log
from batten.families.shapes.straight import Straight
from batten.fit.estimate import Estimate

__all__ = ["Reading", "hinge_readings", "multiplies", "readings", "step_of"]

Per = Literal["step", "doubling", "percent"]


@dataclass(frozen=True)
class Reading:
    """What goes with one step of x (`step` units), a doubling, or one percent more of it.

    relative: the effect is in percent of y; otherwise in units of y.
    """

    per: Per
    step: float
    effect: Effect
    relative: bool


def step_of(a: float, b: float) -> float:
    """A step of x to speak of: one unit, or a power of ten where one unit is too large or too small for the span."""
    width = abs(b - a)
    return 1.0 if 1 <= width < 100 else 10.0 ** math.floor(math.log10(width))


def multiplies(est: Estimate) -> bool:
    """Whether a difference of the linear predictor is a ratio of y."""
    return est.remedy.left.reading == "ratio" and (est.link is None or est.link.multiplies)


def readings(
    est: Estimate, span: tuple[float, float], *, level: float = 0.95, errors: str = "robust"
) -> tuple[Reading, ...]:
    """Readings of the focal coefficient, () where no single one holds all along x or for all covariates."""
    left = est.remedy.left
    plain = est.link is None and est.scale.closed == "identity"
    if not (plain or multiplies(est)) or left.searched or not _stands_alone(est):
        return ()
    found = coefficients(est, level=level, errors=errors)
    b = Effect(float(found.estimate[-1]), float(found.low[-1]), float(found.high[-1]))
    if isinstance(est.shape, Straight):
        step = step_of(*span)
        return (_reading("step", step, b.times(step), relative=not plain),)
    if isinstance(est.shape, Log):
        return (
            _reading("doubling", 2.0, b.times(math.log(2)), relative=not plain),
            _reading("percent", 1.0, b.times(math.log(1.01)), relative=not plain),
        )
    return ()


def hinge_readings(
    est: Estimate, span: tuple[float, float], *, level: float = 0.95, errors: str = "robust"
) -> tuple[Reading, ...]:
    """One reading per piece of a broken line, from left to right; () under other scales or with interactions."""
    plain = est.link is None and est.scale.closed == "identity"
    if not (plain or multiplies(est)) or est.remedy.left.searched or not _stands_alone(est):
        return ()
    pieces = len(est.state) + len(est.theta) + 1
    first = len(est.coef) - pieces
    V = est.covariance(errors)
    t, step = float(student.ppf(0.5 + level / 2, est.df_error)), step_of(*span)
    out = []
    for k in range(pieces):
        line = np.zeros(len(V))
        line[first : first + k + 1] = 1.0
        b, half = float(est.coef[first : first + k + 1].sum()), t * float(np.sqrt(line @ V @ line))
        out.append(_reading("step", step, Effect(b, b - half, b + half).times(step), relative=not plain))
    return tuple(out)


def _stands_alone(est: Estimate) -> bool:
    """Whether the focal predictor stands in no interaction."""
    return est.rows.modifier.shape[1] == 1 and bool((est.rows.modifier == 1).all())


def _reading(per: Per, step: float, effect: Effect, *, relative: bool) -> Reading:
    """Exact percents from differences of logs."""
    if relative:
        effect = effect.through(lambda v: 100 * math.expm1(v))
    return Reading(per, step, effect, relative)
