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
    """coef (p,), eta, mu (n,), working weights (n,); whether it settled."""

    coef: Array
    eta: Array
    mu: Array
    weight: Array
    settled: bool


def iterate(
    model: Mean,
    x: Array,
    y: Array,
    *,
    eta: Array | None = None,
    coef: Array | None = None,
    prior: Array | None = None,
    steps: int = 60,
) -> Solved:
    """Fit from a starting eta (n,) or coef (p,); each step is halved until the deviance falls.

    prior (n,): weights of the rows, the variance being V(mu) / weight; ones when None.
    """
    prior = np.ones_like(y) if prior is None else prior
    # in an orthonormal basis the weighted cross-products of every step stay well conditioned
    whole = factor(x)
    unit = whole.q
    start = x @ coef if coef is not None else (np.zeros_like(y) if eta is None else eta)
    b = unit.T @ start

    def deviance(b: Array) -> float:
        with np.errstate(over="ignore", invalid="ignore"):
            return float(prior @ model.deviance(y, model.mean(unit @ b)))

    now = deviance(b)
    settled = False
    for _ in range(steps):
        eta = unit @ b
        mu, slope = model.mean(eta), model.slope(eta)
        weight = prior * slope / model.variance(mu)
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
    eta = unit @ b
    mu, slope = model.mean(eta), model.slope(eta)
    return Solved(whole.root @ b, eta, mu, prior * slope**2 / model.variance(mu), settled)
