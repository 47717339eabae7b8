"""Replicates on their own scale: where the power of y moves, linear predictors and residuals move with it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array
from batten.families.base import Constants
from batten.fit.estimate import Estimate
from batten.fit.powers import own_units

__all__ = ["OwnScale", "on_own_scale"]


@dataclass(frozen=True, eq=False)
class OwnScale:
    """The scale's constants in each replicate, and the way from the estimate's own units (R, k) to the replicate's."""

    c: list[Constants]
    place: Array
    length: Array
    pivot: float

    def eta(self, eta: Array) -> Array:
        """Linear predictors (R, k) on each replicate's scale."""
        return np.asarray(self.place[:, None] + self.length[:, None] * (eta - self.pivot))

    def residual(self, residual: Array) -> Array:
        """Residuals (R, n) on each replicate's scale."""
        return residual * self.length[:, None]


def on_own_scale(est: Estimate, move: Array) -> OwnScale:
    """For moves (R, P) of (coef, theta, lambda); nothing moves where no constant of the scale was searched."""
    if not est.scale.searched:
        one = np.ones(len(move))
        return OwnScale([est.c] * len(move), 0 * one, one, 0.0)
    lam = est.c[0] + move[:, -1]
    units = np.array([own_units(est, float(v)) for v in lam])
    return OwnScale([(float(v),) for v in lam], units[:, 0], units[:, 1], est.pivot[0])
