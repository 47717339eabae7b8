"""Critical values for bands that hold everywhere along a curve at once.

A curve is a path of linear combinations l(x)'b of coefficients with covariance V (p, p); a band is l'b -+ c SE. Three
ways to c: Scheffe's is exact for the worst of all combinations, the tube bound pays only for the path (Naiman 1986; Sun
and Loader 1994), draws approximate the exact value. Rows L (m, p) must run in order of x on a grid fine enough to draw.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats
from scipy.optimize import brentq

from batten.engine.rows import Array

__all__ = ["Critical", "critical", "drawn_critical", "path", "path_length", "scheffe_critical", "tube_critical"]


@dataclass(frozen=True)
class Critical:
    """value: the smaller of the two. dimension: of the combinations; length: of the path (kappa0)."""

    value: float
    scheffe: float
    tube: float
    dimension: int
    length: float


def critical(L: Array, V: Array, *, df: float, level: float = 0.95) -> Critical:
    """Scheffe or tube, whichever is smaller: both cover at least `level`. df may be infinite.

    The tube bound exceeds Scheffe's value when the path nearly closes on itself.
    """
    u = path(L, V)
    dimension, length = int(np.linalg.matrix_rank(u, tol=1e-7 * np.sqrt(max(len(u), 1)))), path_length(u)
    scheffe, tube = scheffe_critical(dimension, df=df, level=level), tube_critical(length, df=df, level=level)
    return Critical(min(scheffe, tube), scheffe, tube, dimension, length)


def path(L: Array, V: Array) -> Array:
    """Unit vectors u(x) = V^(1/2) l(x) / |V^(1/2) l(x)|, (m, p); rows of no variance are left out.

    Give V of centred columns: in raw powers of a year the variances of a curve are lost in cancellation.
    """
    # scaled first, so that a covariance of coefficients in very different units keeps its small directions
    size = np.sqrt(np.diag(V))
    size = np.where(size > 0, size, 1.0)
    values, vectors = np.linalg.eigh(V / np.outer(size, size))
    # eigenvalues that are rounding would leave directions where the combination is fixed
    root = vectors * np.sqrt(np.where(values > 1e-14 * values.max(), values, 0.0))
    u = (L * size) @ root
    length = np.linalg.norm(u, axis=1)
    keep = length > 1e-9 * np.linalg.norm(L * size, axis=1)
    return np.asarray(u[keep] / length[keep, None])


def path_length(u: Array) -> float:
    """Length kappa0 of the path of unit vectors u (m, p) on the sphere, u and -u being the same combination.

    Arcs, not chords, so the grid may be coarse; across a jump the shorter arc is taken, which errs on the wide side.
    """
    if len(u) < 2:
        return 0.0
    half = np.linalg.norm(np.diff(u, axis=0), axis=1) / 2
    arcs = 2 * np.arcsin(np.minimum(half, 1.0))
    return float(np.sum(np.minimum(arcs, np.pi - arcs)))


def scheffe_critical(dimension: int, *, df: float, level: float = 0.95) -> float:
    """sqrt(q F_q,df(level)) for q dimensions that vary (Scheffe 1959); a slope's q leaves the constant out."""
    if dimension == 0:
        return 0.0
    if np.isinf(df):
        return float(np.sqrt(stats.chi2.ppf(level, dimension)))
    return float(np.sqrt(dimension * stats.f.ppf(level, dimension, df)))


def tube_critical(length: float, *, df: float, level: float = 0.95) -> float:
    """Solves kappa0 / pi (1 + c^2 / df)^(-df / 2) + P(|t_df| > c) = 1 - level (Sun and Loader 1994, one dimension)."""
    law = stats.norm if np.isinf(df) else stats.t(df)

    def excess(c: float) -> float:
        tail = -(c**2) / 2 if np.isinf(df) else -df / 2 * np.log1p(c**2 / df)
        return float(length / np.pi * np.exp(tail) + 2 * law.sf(c) - (1 - level))

    high = 1.0
    while excess(high) > 0:
        high *= 2
    return float(brentq(excess, 0.0, high, xtol=1e-12))


def drawn_critical(
    L: Array, V: Array, *, df: float, rng: np.random.Generator, level: float = 0.95, draws: int = 20_000
) -> float:
    """Quantile of max over x of |l'Z| / SE / sqrt(chi2_df / df), Z normal with covariance V."""
    u = path(L, V)
    if not len(u):
        return 0.0
    largest = np.empty(draws)
    step = max(1, 2_000_000 // len(u))
    for at in range(0, draws, step):
        part = slice(at, min(at + step, draws))
        normal = rng.standard_normal((largest[part].size, u.shape[1]))
        largest[part] = np.max(np.abs(normal @ u.T), axis=1)
    if np.isfinite(df):
        largest /= np.sqrt(rng.chisquare(df, size=draws) / df)
    return float(np.quantile(largest, level))
