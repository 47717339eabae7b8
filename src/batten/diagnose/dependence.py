"""Do neighbouring rows, in the order they are stored, err alike?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

from batten.diagnose.span import basis, outside, whitened
from batten.engine.rows import Array

__all__ = ["Neighbours", "neighbouring_residuals"]


@dataclass(frozen=True)
class Neighbours:
    """statistic: Durbin-Watson d, near 2 for independent rows. correlation: of neighbouring residuals. p: two-sided."""

    statistic: float
    correlation: float
    p: float


def neighbouring_residuals(X: Array, z: Array, *, weights: Array | None = None) -> Neighbours | None:
    """Durbin-Watson d along stored order, with p from its exact mean and variance given X (n, p).

    d / 4 is given the beta distribution with those two moments (Durbin and Watson 1951, 1971), so no tables and no
    inconclusive region. Says nothing where the stored order means nothing. None below p + 3 rows or for a perfect fit.
    """
    X, z = whitened(weights, X, z)
    Q = basis(X)
    left = outside(Q, z)
    n, p = Q.shape
    df = n - p
    if df < 3 or float(left @ left) <= 1e-24 * float(z @ z):
        return None
    rss = float(left @ left)
    d = float(np.sum(np.diff(left) ** 2)) / rss
    mean, variance = _moments(Q)
    # beta on (0, 4) with this mean and variance
    m, v = mean / 4, variance / 16
    size = m * (1 - m) / v - 1
    law = stats.beta(m * size, (1 - m) * size)
    tail = min(float(law.cdf(d / 4)), float(law.sf(d / 4)))
    return Neighbours(d, float(left[1:] @ left[:-1]) / rss, min(1.0, 2 * tail))


def _moments(Q: Array) -> tuple[float, float]:
    """Mean and variance of d under independent normal errors: traces of MA and MAMA, A = D'D of first differences."""
    n, p = Q.shape
    steps = np.diff(Q, axis=0)
    AQ = np.zeros_like(Q)
    AQ[1:] += steps
    AQ[:-1] -= steps
    inner = steps.T @ steps
    first = 2 * (n - 1) - float(np.trace(inner))
    second = 6 * n - 8 - 2 * float(np.sum(AQ**2)) + float(np.sum(inner**2))
    df = n - p
    mean = first / df
    return mean, 2 * (second - first * mean) / (df * (df + 2))
