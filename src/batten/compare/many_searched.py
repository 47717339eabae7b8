"""The searched constants of a shape in every training set at many rows, from profiles at a few places."""

from __future__ import annotations

import itertools

import numpy as np
from numpy.polynomial import chebyshev
from scipy.optimize import minimize

from batten.engine.rows import Array, Ints
from batten.fit.estimate import Estimate
from batten.fit.searched import weighted_design

__all__ = ["constants_near"]

#: Chebyshev places along one constant, along each of two, and the half width of their stretch in standard deviations of
#: a training set's own constants
PLACES: dict[int, int] = {1: 9, 2: 6}
STRETCH = 4.0


def constants_near(est: Estimate, held: list[Ints], folds: int) -> Array | None:
    """Best constants of every training set (S, q); None where a set's profile is lowest far away.

    Each place costs one pass over the rows, whatever the number of sets: cross-products of a training set are those of
    all rows less those of the held-out ones. The profiles are interpolated. That of a break has a small corner at every
    row; smoothed so, it moves by a fraction of its standard error.
    """
    p, q = len(est.coef), len(est.theta)
    if q not in PLACES:
        return None
    values, vectors = np.linalg.eigh(est.covariance("robust")[p : p + q, p : p + q])
    if not (np.isfinite(values).all() and values[0] > 0):
        return None
    axes = vectors * np.sqrt(values / (folds - 1))
    for stretch in (STRETCH, 3 * STRETCH):
        found = _lowest(est, held, stretch * axes)
        if found is not None:
            return found
    return None


def _lowest(est: Estimate, held: list[Ints], axes: Array) -> Array | None:
    """The same within a box with these half axes (q, q) around the all-rows constants."""
    q = len(est.theta)
    nodes = np.cos(np.pi * (np.arange(PLACES[q]) + 0.5) / PLACES[q])
    grid = np.array(list(itertools.product(nodes, repeat=q)))
    profiles = [_profile(est, held, tuple(est.theta + axes @ u)) for u in grid]
    known = [one for one in profiles if one is not None]
    if len(known) < len(grid):
        return None
    loss = np.array(known)
    coef = np.linalg.solve(_terms(grid), loss - loss.min(axis=0))
    out = np.empty((len(held), q))
    for s in range(len(held)):
        begin = grid[int(np.argmin(loss[:, s]))]
        done = minimize(
            _interpolated, begin, args=(coef[:, s],), method="L-BFGS-B", bounds=[(-1.0, 1.0)] * q,
            options={"ftol": 1e-15, "gtol": 1e-8},
        )  # fmt: skip
        if np.abs(done.x).max() > 0.99:
            return None
        out[s] = est.theta + axes @ done.x
    return out


def _interpolated(u: Array, coef: Array) -> float:
    return float((_terms(u[None]) @ coef)[0])


def _terms(u: Array) -> Array:
    """Products of Chebyshev polynomials at u (k, q) in the unit box."""
    degree = PLACES[u.shape[1]] - 1
    parts = [chebyshev.chebvander(column, degree) for column in u.T]
    out = parts[0]
    for part in parts[1:]:
        out = (out[:, :, None] * part[:, None, :]).reshape(len(u), -1)
    return np.asarray(out)


def _profile(est: Estimate, held: list[Ints], theta: tuple[float, ...]) -> Array | None:
    """Half n times the log of every training set's residual sum of squares at these constants (S,)."""
    x = weighted_design(est.rows, est.shape, est.state, theta)
    if not np.isfinite(x).all():
        return None
    p = x.shape[1]
    both = np.column_stack([x @ est.factored.root[:p, :p], est.z])
    whole, out = both.T @ both, np.empty(len(held))
    for s, rows in enumerate(held):
        part = both[rows]
        cross = whole - part.T @ part
        rss = float(cross[p, p] - cross[p, :p] @ np.linalg.solve(cross[:p, :p], cross[:p, p]))
        if not rss > 0:
            return None
        out[s] = 0.5 * (len(x) - len(rows)) * np.log(rss)
    return out
