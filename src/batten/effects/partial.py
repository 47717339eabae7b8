"""The response along the focal predictor with the covariates taken off, row by row and in units of y."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.diagnose.partial import conditional_residuals
from batten.diagnose.tests_of_shape import add_on
from batten.effects.check import CHANCE
from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = ["Partial", "bent_covariates", "partial"]


@dataclass(frozen=True, eq=False)
class Partial:
    """value, curve (n,): each row with its covariates at their averages, and the fit there, units of y.

    They come back from the fitting scale without correction, so they are typical values; NaN where a scale cannot be
    undone. bent: positions of covariates that bend along x, () where plain partial residuals serve.
    """

    value: Array
    curve: Array
    bent: tuple[int, ...]


def partial(est: Estimate) -> Partial:
    """Component-plus-residual values (Ezekiel 1924; Larsen and McCleary 1972); CERES where a covariate bends along x.

    On the fitting scale: the residual (for links the working residual) plus all columns of the focal term, at the level
    of the fit, then back to y. Under an interaction the row's own group counts. CERES (Cook 1993) takes the covariates'
    own curves along x off too, for fits by least squares of rows alike.
    """
    rows = est.rows
    focal = est.design_at(rows.x, rows.base, rows.modifier) @ est.coef - _others(est)
    level = float(np.mean(est.eta - focal))
    bent = bent_covariates(est)
    ceres = est.link is None and rows.weights is None and not est.shape.own_level
    if bent and ceres:
        value = conditional_residuals(rows.base, est.z, rows.x)
    else:
        bent, value = (), focal + level + _left(est)
    return Partial(_back(est, value), _back(est, focal + level), bent)


def bent_covariates(est: Estimate) -> tuple[int, ...]:
    """Positions in `base` of the columns whose mean bends along x by more than chance."""
    x, base = est.rows.x, est.rows.base
    away = (x - x.mean()) / (x.std() or 1.0)
    line, found = np.column_stack([np.ones_like(x), away]), []
    for j in np.flatnonzero(np.ptp(base, axis=0) > 0):
        test = add_on(line, away[:, None] ** 2, base[:, j])
        if test is not None and test.p < CHANCE:
            found.append(int(j))
    return tuple(found)


def _others(est: Estimate) -> Array:
    """What the columns without the focal predictor give (n,)."""
    base = est.rows.base
    if est.shape.own_level and est.rows.intercept is not None:
        base = np.delete(base, est.rows.intercept, axis=1)
    return np.asarray(base @ est.coef[: base.shape[1]])


def _left(est: Estimate) -> Array:
    """Residuals on the fitting scale, weights undone (n,)."""
    if est.link is not None:
        return np.asarray(est.residual / est.link.mean_slope(est.eta))
    return np.asarray(est.residual / est.rows.root_weight)


def _back(est: Estimate, value: Array) -> Array:
    if est.link is not None:
        return est.link.mean(value)
    low, high = est.scale.limits(est.c)
    inside = (value > low) & (value < high)
    with np.errstate(all="ignore"):
        return np.where(inside, est.scale.inverse(value, est.c), np.nan)
