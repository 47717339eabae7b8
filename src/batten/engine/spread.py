"""An error variance that changes with the fitted value, learned by maximum likelihood (Harvey 1976).

The standard deviation of row i is common * exp(power * u_i), where u_i is a known function of the fitted value of plain
least squares. Weighted least squares for the coefficients and one Newton step for the power alternate until neither
moves. Every array has a leading axis S of training sets.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array

__all__ = ["LearnedSpread", "learn_spread"]

#: powers beyond this are not looked for
STEEPEST = 4.0


@dataclass(frozen=True, eq=False)
class LearnedSpread:
    """power (S,). first (S, p): coefficients of plain least squares. eta (S, n): predictor of the weighted fit.
    root (S, n): exp(-power u), u less its mean over the training rows. inverse (S, p, p): (Q'WQ)^-1. settled (S,).
    centre (S,): the mean of u. error (S,): standard error of the power, whatever the shape of the errors.
    """

    power: Array
    first: Array
    eta: Array
    root: Array
    inverse: Array
    centre: Array
    error: Array
    settled: Array


def learn_spread(
    q: Array, z: Array, drive: Callable[[Array], Array], mask: Array, *, start: float = 0.0, steps: int = 200
) -> LearnedSpread:
    """q (n, p) or (S, n, p): the design's columns; z (n,); mask (S, n): 1 where a set trains on a row.

    drive: u (S, n) of the plain fit's predictor (S, n). start: a power to begin with.
    """
    count = mask.sum(axis=1)
    first, _ = _solve(q, z, mask)
    u = drive(_predict(q, first))
    centre = (mask * u).sum(axis=1) / count
    u = u - centre[:, None]
    power, settled = np.full(len(mask), start), np.zeros(len(mask), dtype=bool)
    for _ in range(steps):
        root = np.exp(-power[:, None] * u)
        b, inverse = _solve(q, z, mask * root**2)
        eta = _predict(q, b)
        ratio = mask * (root * (z - eta)) ** 2
        ratio = ratio * (count / ratio.sum(axis=1))[:, None]
        # slope and bend of the likelihood along the power, coefficients held
        slope = (ratio * u).sum(axis=1)
        bend = 2 * ((ratio * u**2).sum(axis=1) - slope**2 / count)
        step = np.clip(slope / np.maximum(bend, 1e-300), -0.5, 0.5)
        settled = (np.abs(step) < 1e-9) & (np.abs(power) < STEEPEST)
        if settled.all() or not np.isfinite(step).all():
            break
        power = np.clip(power + step, -STEEPEST, STEEPEST)
    error = np.sqrt((((ratio - mask) * u) ** 2).sum(axis=1)) / np.maximum(bend, 1e-300)
    return LearnedSpread(power, first, eta, root, inverse, centre, error, settled)


def _solve(q: Array, z: Array, weight: Array) -> tuple[Array, Array]:
    """Weighted coefficients (S, p) and inverse cross-products (S, p, p)."""
    left = np.swapaxes(q, -1, -2)
    inverse = np.linalg.pinv(np.matmul(left, weight[:, :, None] * q), hermitian=True, rcond=1e-14)
    return np.einsum("spr,sr->sp", inverse, np.matmul(left, (weight * z)[:, :, None])[:, :, 0]), inverse


def _predict(q: Array, b: Array) -> Array:
    return np.asarray(np.matmul(q, b[:, :, None])[:, :, 0])
