"""Variable projection: constants inside the design columns (Golub and Pereyra 1973).

For a trial constant the model is linear, so only the profile of the residual sum of squares is searched: a grid first,
because the profile may have several minima, then Gauss-Newton steps that never raise it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array

__all__ = ["Found", "Searched", "profile_interval", "refine", "scan", "search"]

#: rows used to choose the starting cell; the refinement always uses all rows
SCAN_ROWS = 20_000


@dataclass(frozen=True, eq=False)
class Searched:
    """A model with constants inside: columns(theta) -> (n, k) and their slopes (q, n, k), beside fixed columns (n, p)."""

    fixed: Array
    columns: Callable[[Array], Array]
    slopes: Callable[[Array], Array]
    candidates: Array
    lower: Array
    upper: Array
    finite: bool = False


@dataclass(frozen=True, eq=False)
class Found:
    """Where the profile is lowest: theta (q,), rss, and whether the steps settled inside the bounds."""

    theta: Array
    rss: float
    settled: bool


def _orthonormal(x: Array) -> Array:
    """Orthonormal basis of the columns, aliased ones dropped."""
    if not x.shape[1]:
        return np.empty((len(x), 0))
    length = np.sqrt((x * x).sum(axis=0))
    q, r = np.linalg.qr(x / np.where(length == 0, 1, length))
    return np.asarray(q[:, np.abs(np.diagonal(r)) > 1e-11])


def scan(model: Searched, z: Array) -> Array:
    """Profile RSS of every candidate for every response: z (n, R) -> (K, R)."""
    q = _orthonormal(model.fixed)
    e = z - q @ (q.T @ z)
    total = (e * e).sum(axis=0)
    out = np.empty((len(model.candidates), z.shape[1]))
    for i, theta in enumerate(model.candidates):
        block = model.columns(theta)
        block = block - q @ (q.T @ block)
        scale = np.sqrt((block * block).sum(axis=0))
        good = np.isfinite(scale) & (scale > 0)
        basis = _orthonormal(block[:, good]) if good.any() else np.empty((len(e), 0))
        out[i] = total - ((basis.T @ e) ** 2).sum(axis=0)
    return np.where(np.isfinite(out), out, np.inf)


def _solve_at(model: Searched, theta: Array, z: Array) -> tuple[float, Array, Array, Array]:
    """RSS, residuals (n,), coefficients of the searched columns (k,), orthonormal basis."""
    block = model.columns(theta)
    x = np.hstack([model.fixed, block])
    length = np.sqrt((x * x).sum(axis=0))
    if not (np.isfinite(length).all() and (length > 0).all()):
        return np.inf, z, np.zeros(block.shape[1]), np.empty((len(z), 0))
    q, r = np.linalg.qr(x / length)
    if np.abs(np.diagonal(r)).min() < 1e-12:
        return np.inf, z, np.zeros(block.shape[1]), q
    c = q.T @ z
    e = z - q @ c
    b = np.linalg.solve(r, c) / length
    return float(e @ e), e, b[model.fixed.shape[1] :], q


def refine(model: Searched, theta: Array, z: Array, *, steps: int = 60) -> Found:
    """Gauss-Newton on the projected model from theta (q,), each step halved until the RSS falls."""
    rss, e, b, q = _solve_at(model, theta, z)
    scale = np.maximum(np.abs(model.upper - model.lower), 1e-300)
    floor = 1e-26 * float(z @ z)
    for _ in range(steps):
        if not np.isfinite(rss) or rss <= floor:
            break
        pull = np.einsum("qnk,k->nq", model.slopes(theta), b)
        pull = pull - q @ (q.T @ pull)
        step = np.linalg.lstsq(pull, e, rcond=1e-14)[0]
        fraction, better = 1.0, False
        while fraction > 1e-6:
            trial = np.clip(theta + fraction * step, model.lower, model.upper)
            new = _solve_at(model, trial, z)
            if new[0] < rss:
                better = True
                break
            fraction *= 0.5
        if not better:
            break
        moved = np.abs(trial - theta)
        theta, (rss, e, b, q) = trial, new
        if (moved <= 1e-13 * np.maximum(np.abs(theta), 1e-8 * scale)).all():
            break
    edge = ((theta <= model.lower) | (theta >= model.upper)).any()
    return Found(theta, rss, settled=bool(np.isfinite(rss) and not edge))


def search(model: Searched, z: Array, *, start: Array | None = None, tries: int = 3) -> Found:
    """Lowest profile over the candidates (and `start`), refined; a finite set is only looked through."""
    thinned = _thin(model, z)
    profile = scan(thinned[0], thinned[1][:, None])[:, 0]
    order = np.argsort(profile, kind="stable")
    if model.finite:
        best = model.candidates[order[0]]
        return Found(best, _solve_at(model, best, z)[0], settled=True)
    if start is not None:
        # a warm start saves the other starts unless the grid knows a clearly lower cell
        found = refine(model, start, z)
        if found.settled and found.rss <= profile[order[0]] * (1 if len(thinned[1]) == len(z) else np.inf):
            return found
        return min(found, refine(model, model.candidates[order[0]], z), key=lambda f: f.rss)
    starts = _apart(model, order, profile, tries)
    return min((refine(model, model.candidates[k], z) for k in starts), key=lambda f: f.rss)


def _thin(model: Searched, z: Array) -> tuple[Searched, Array]:
    """The model on an evenly spaced part of the rows, for choosing the starting cell at large n."""
    every = len(z) // SCAN_ROWS
    if every < 2:
        return model, z
    part = slice(None, None, every)
    columns = model.columns
    return Searched(
        model.fixed[part], lambda t: columns(t)[part], model.slopes, model.candidates, model.lower, model.upper
    ), z[part]


def _apart(model: Searched, order: Array, profile: Array, tries: int) -> list[int]:
    """The best candidate and the next best local minima of a one-dimensional grid (all of the best in more)."""
    if model.candidates.shape[1] > 1:
        return [int(k) for k in order[:tries]]
    along = np.argsort(model.candidates[:, 0], kind="stable")
    p = profile[along]
    low = [
        int(along[i])
        for i in range(len(p))
        if (i == 0 or p[i] <= p[i - 1]) and (i == len(p) - 1 or p[i] <= p[i + 1]) and np.isfinite(p[i])
    ]
    return sorted(low, key=lambda k: profile[k])[:tries] or [int(order[0])]


def profile_interval(
    profile: Callable[[float], float], best: float, limit: float, *, lower: float, upper: float, grid: int = 60
) -> tuple[tuple[float, float], ...]:
    """The set where profile(theta) <= limit, as pieces; it may be a union, and may run to the grid's ends.

    profile must be lowest near `best`. Found on a grid that includes `best`, edges by bisection.
    """
    places = np.unique(np.append(np.linspace(lower, upper, grid), best))
    inside = np.array([profile(float(t)) <= limit for t in places])
    inside[np.searchsorted(places, best)] = True
    pieces: list[tuple[float, float]] = []
    edges = np.flatnonzero(np.diff(np.concatenate([[False], inside, [False]]).astype(int)))
    for first, after in zip(edges[::2], edges[1::2], strict=True):
        left = places[first] if first == 0 else _cross(profile, limit, float(places[first - 1]), float(places[first]))
        last = after - 1
        right = (
            places[last] if after == len(places) else _cross(profile, limit, float(places[after]), float(places[last]))
        )
        pieces.append((float(left), float(right)))
    return tuple(pieces)


def _cross(profile: Callable[[float], float], limit: float, outside: float, inside: float) -> float:
    """Edge of the set between a place outside and a place inside it, by bisection."""
    for _ in range(60):
        middle = (outside + inside) / 2
        if profile(middle) <= limit:
            inside = middle
        else:
            outside = middle
        if abs(inside - outside) <= 1e-10 * max(1e-300, abs(inside)):
            break
    return inside
