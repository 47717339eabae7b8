"""Means modelled directly: iteratively reweighted least squares (McCullagh and Nelder 1989, ch. 2)."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from batten.engine.linear import factor
from batten.engine.rows import Array

__all__ = ["Mean", "Solved", "iterate"]


@dataclass(frozen=True, eq=False)
class Mean:
    """mean(eta), slope d mu / d eta, variance(mu) and deviance(y, mu) per row, all elementwise."""

    mean: Callable[[Array], Array]
    slope: Callable[[Array], Array]
    variance: Callable[[Array], Array]
    deviance: Callable[[Array, Array], Array]


@dataclass(frozen=True, eq=False)
class Solved:
    """coef (p,), eta, mu (n,), working weights (n,), score residual u = (y - mu) slope / V (n,); whether it settled."""

    coef: Array
    eta: Array
    mu: Array
    weight: Array
    score: Array
    settled: bool


def iterate(
    model: Mean,
    x: Array,
    y: Array,
    *,
    eta: Array | None = None,
    coef: Array | None = None,
    offset: Array | None = None,
    steps: int = 60,
) -> Solved:
    """Fit from a starting eta (n,) or coef (p,); each step is halved until the deviance falls."""
    off = np.zeros_like(y) if offset is None else offset
    # in an orthonormal basis the weighted cross-products of every step stay well conditioned
    whole = factor(x)
    unit = whole.q
    start = x @ coef if coef is not None else (np.zeros_like(y) if eta is None else eta - off)
    b = unit.T @ start

    def deviance(b: Array) -> float:
        with np.errstate(over="ignore", invalid="ignore"):
            return float(model.deviance(y, model.mean(off + unit @ b)).sum())

    now = deviance(b)
    settled = False
    for _ in range(steps):
        eta = off + unit @ b
        mu, slope = model.mean(eta), model.slope(eta)
        variance = model.variance(mu)
        weight = slope / variance
        cross = unit.T @ (unit * (weight * slope)[:, None])
        values = np.linalg.eigvalsh(cross)
        if not values[0] > 1e-13 * values[-1]:
            break
        step = np.linalg.solve(cross, unit.T @ (weight * (y - mu)))
        fraction = 1.0
        while fraction > 1e-6 and not deviance(b + fraction * step) <= now * (1 + 1e-12) + 1e-300:
            fraction *= 0.5
        b = b + fraction * step
        now = deviance(b)
        if np.abs(fraction * step).max() <= 1e-11 * max(1.0, float(np.abs(b).max())):
            settled = True
            break
    eta = off + unit @ b
    mu, slope = model.mean(eta), model.slope(eta)
    variance = model.variance(mu)
    return Solved(whole.root @ b, eta, mu, slope**2 / variance, (y - mu) * slope / variance, settled)
