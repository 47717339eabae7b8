"""Variable projection: constants inside the design columns (Golub and Pereyra 1973).

For a trial constant the model is linear, so only the profile of the residual sum of squares is searched: a grid first,
because the profile may have several minima, then Gauss-Newton steps that never raise it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from batten.engine.rows import Array, Ints

__all__ = ["Found", "Searched", "apart", "profile_interval", "refine", "scan", "search"]

#: rows used to choose the starting cell; the refinement always uses all rows
SCAN_ROWS = 3_000
#: final steps that may be no smaller than the smallest so far
STALE = 4
#: a search has settled when a further step would move the constants less than this many standard errors
SETTLED = 0.01
#: beyond this many rows a training set's constant starts so near its place that one final step settles it
FEW_ROWS = 5_000


@dataclass(frozen=True, eq=False)
class Searched:
    """A model with constants inside: columns(theta) -> (n, k) with slopes (q, n, k), beside fixed columns (n, p).

    rebuild: the same on some of the rows. candidates (K, q): the grid; finite: there is nothing between its points.
    lower, upper (q,): limits of theta. corners: sorted places where the profile of a single theta has a corner, where
    Gauss-Newton can stop short.
    """

    fixed: Array
    columns: Callable[[Array], Array]
    slopes: Callable[[Array], Array]
    candidates: Array
    lower: Array
    upper: Array
    rebuild: Callable[[Ints], Searched]
    finite: bool = False
    corners: Array | None = None

    @cached_property
    def basis(self) -> Array:
        """Orthonormal basis of the fixed columns."""
        return _orthonormal(self.fixed)

    @cached_property
    def grid(self) -> Array:
        """The candidates' columns (K, n, k)."""
        return np.stack([self.columns(theta) for theta in self.candidates])

    def part(self, which: Ints) -> Searched:
        """The same model on some of its rows; a small grid is shared rather than computed again."""
        smaller = self.rebuild(which)
        if len(self.fixed) <= SCAN_ROWS:
            smaller.__dict__["grid"] = self.grid[:, which]
        return smaller


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
    q = model.basis
    e = z - q @ (q.T @ z)
    block = model.grid - q @ (q.T @ model.grid)
    scale = np.sqrt(np.einsum("knj,knj->kj", block, block))
    usable = np.isfinite(scale).all(axis=1) & (scale > 1e-10 * np.abs(model.grid).max(axis=1)).all(axis=1)
    block = np.where(usable[:, None, None], block / np.where(scale > 0, scale, 1)[:, None, :], 0.0)
    right = block.transpose(0, 2, 1) @ e
    cross = block.transpose(0, 2, 1) @ block
    if cross.shape[1] == 1:
        gained = right[:, 0] ** 2
    else:
        gained = np.einsum("kjr,kjl,klr->kr", right, np.linalg.pinv(cross, rcond=1e-10, hermitian=True), right)
    out = (e * e).sum(axis=0) - gained
    return np.where(usable[:, None], np.maximum(out, 0.0), np.inf)


@dataclass(frozen=True, eq=False)
class _Place:
    """The linear problem solved at one theta: rss, residuals (n,), coefficients (k,) and unit columns (n, k)."""

    rss: float
    residual: Array
    coef: Array
    block: Array
    solver: Array


def _solve_at(model: Searched, theta: Array, e: Array) -> _Place | None:
    """Solve for the searched columns with the fixed ones projected out of both sides; e (n,) is already projected."""
    q = model.basis
    block = model.columns(theta)
    block = block - q @ (q.T @ block)
    length = np.sqrt((block * block).sum(axis=0))
    if not (np.isfinite(length).all() and length.min() > 0):
        return None
    unit = block / length
    cross = unit.T @ unit
    if len(cross) > 1 and np.linalg.eigvalsh(cross)[0] < 1e-12:
        return None
    solver = np.linalg.inv(cross)
    c = solver @ (unit.T @ e)
    residual = e - unit @ c
    return _Place(float(residual @ residual), residual, c / length, unit, solver)


def refine(model: Searched, theta: Array, z: Array, *, steps: int = 60, precision: float = 1e-13) -> Found:
    """Gauss-Newton on the projected model from theta (q,), each step halved until the RSS falls."""
    q = model.basis
    e = z - q @ (q.T @ z)
    place = _solve_at(model, theta, e)
    if place is None:
        return Found(theta, np.inf, settled=False)
    floor = 1e-26 * float(z @ z)
    for _ in range(steps):
        if place.rss <= floor:
            break
        step, promised = _gauss_newton(model, theta, place)
        if promised <= 1e-9 * place.rss:
            theta, place = _settle(
                model, theta, place, e, precision, steps=40 if precision < 1e-10 or len(e) <= FEW_ROWS else 1
            )
            break
        fraction, better = 1.0, None
        while fraction > 1e-4:
            trial = np.clip(theta + fraction * step, model.lower, model.upper)
            new = _solve_at(model, trial, e)
            if new is not None and new.rss < place.rss:
                better = new
                break
            fraction *= 0.2
        if better is None:
            break
        theta, place = trial, better
    if model.corners is not None and len(theta) == 1:
        theta, place = _walk(model, theta, place, e)
    edge = ((theta <= model.lower) | (theta >= model.upper)).any()
    return Found(theta, place.rss, settled=bool(not edge and (place.rss <= floor or _still(model, theta, place))))


def _still(model: Searched, theta: Array, place: _Place) -> bool:
    """Whether a further step would be short beside the constants' standard errors; at a corner steps say nothing."""
    if model.corners is not None:
        return True
    step, promised = _gauss_newton(model, theta, place)
    return bool(np.isfinite(step).all() and promised <= SETTLED**2 * place.rss / len(place.residual))


def _walk(model: Searched, theta: Array, place: _Place, e: Array) -> tuple[Array, _Place]:
    """Along the corners next to theta, as long as one of them has a lower RSS."""
    assert model.corners is not None
    for _ in range(60):
        left = int(np.searchsorted(model.corners, theta[0], side="left"))
        right = int(np.searchsorted(model.corners, theta[0], side="right"))
        better = False
        for k in (left - 1, right):
            if not 0 <= k < len(model.corners) or not model.lower[0] < model.corners[k] < model.upper[0]:
                continue
            trial = model.corners[k : k + 1]
            new = _solve_at(model, trial, e)
            if new is not None and new.rss < place.rss:
                theta, place, better = trial, new, True
        if not better:
            break
    return theta, place


def _settle(
    model: Searched, theta: Array, place: _Place, e: Array, precision: float, *, steps: int
) -> tuple[Array, _Place]:
    """Final steps, where the RSS no longer shows a step's gain.

    Where the model is strongly curved Gauss-Newton steps shrink slowly or swing to and fro, so each is bent by how the
    last one changed (Anderson 1965): with one constant this is the secant method for the place where the step is zero.
    Returns the place with the smallest step seen.
    """
    best, smallest, stale = (theta, place), np.inf, 0
    before: tuple[Array, Array] | None = None
    for _ in range(steps):
        step, _ = _gauss_newton(model, theta, place)
        unit = np.where(theta == 0, 1.0, np.abs(theta))
        size = float(np.abs(step / unit).max())
        if size < smallest:
            best, smallest, stale = (theta, place), size, 0
        else:
            stale += 1
        if size <= precision or stale > STALE or not np.isfinite(step).all():
            break
        tried = [theta + step]
        if before is not None:
            turn = (step - before[1]) / unit
            length = float(turn @ turn)
            if length > 0:
                share = float((step / unit) @ turn) / length
                tried.insert(0, theta + step - share * (theta - before[0] + step - before[1]))
        before = theta, step
        for trial in tried:
            inside = ((trial > model.lower) & (trial < model.upper)).all()
            new = _solve_at(model, trial, e) if inside else None
            if new is not None and new.rss <= place.rss * (1 + 1e-9):
                theta, place = trial, new
                break
        else:
            break
    if steps == 1 and theta is not best[0]:
        return theta, place
    return best


def _gauss_newton(model: Searched, theta: Array, place: _Place) -> tuple[Array, float]:
    """Step of theta (q,) with the linear coefficients free (Kaufman 1975), and the fall of the RSS it promises."""
    q = model.basis
    pull = np.einsum("qnk,k->nq", model.slopes(theta), place.coef)
    pull = pull - q @ (q.T @ pull)
    pull = pull - place.block @ (place.solver @ (place.block.T @ pull))
    if pull.shape[1] == 1:
        size = float(pull[:, 0] @ pull[:, 0])
        step = pull.T @ place.residual / size if size > 0 else np.zeros(1)
    else:
        step = np.linalg.lstsq(pull, place.residual, rcond=1e-14)[0]
    fall = pull @ step
    return step, float(fall @ fall)


def search(model: Searched, z: Array, *, start: Array | None = None, tries: int = 3, precision: float = 1e-13) -> Found:
    """Lowest profile over the candidates (and `start`), refined; a finite set is only looked through."""
    every = max(1, len(z) // SCAN_ROWS)
    small, thin_z = (model, z) if every == 1 else (model.part(np.arange(0, len(z), every)), z[::every])
    profile = scan(model if model.finite else small, (z if model.finite else thin_z)[:, None])[:, 0]
    order = np.argsort(profile, kind="stable")
    if model.finite:
        return Found(model.candidates[order[0]], float(profile[order[0]]), settled=bool(np.isfinite(profile[order[0]])))
    if start is None:
        starts = [model.candidates[k] for k in apart(model, order, profile, tries)]
        if every > 1:  # the part of the rows tells which start is best, and where it leads to within its own error
            starts = [min((refine(small, k, thin_z, precision=1e-6) for k in starts), key=lambda f: f.rss).theta]
        return min((refine(model, k, z, precision=precision) for k in starts), key=lambda f: f.rss)
    found = refine(model, start, z, precision=precision)
    # a warm start saves the other starts unless the grid knows a clearly lower cell
    if found.settled and found.rss * len(thin_z) / len(z) <= profile[order[0]] * (1 if every == 1 else 1.02):
        return found
    return min(found, refine(model, model.candidates[order[0]], z, precision=precision), key=lambda f: f.rss)


def apart(model: Searched, order: Ints, profile: Array, tries: int) -> list[int]:
    """The best candidate and the next best local minima of a one-dimensional grid (the best few in more)."""
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
