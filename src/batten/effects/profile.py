"""Profiles of one searched constant: how much log-likelihood is lost as it is moved and everything else refitted.

The set of values the data do not rule out is where the loss stays within what the level allows. It need not be an
interval: it may come in pieces, and it may run to the end of what was searched; then it has no end there.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from scipy.optimize import brentq
from scipy.stats import chi2
from scipy.stats import f as fisher

from batten.effects.profile_of_link import allowed_loss, deviance_loss, listed_losses
from batten.engine.linear import factor
from batten.engine.power import best_power, profile_likelihood
from batten.engine.rows import Array
from batten.engine.search import Searched, refine, scan, search
from batten.families.base import Constants
from batten.families.shapes.hinge import Hinge
from batten.fit.estimate import Estimate
from batten.fit.searched import scale_power, searched_model, weighted_design

__all__ = ["Profile", "best_given", "profile_of_power", "profile_of_shape"]

#: rows on which far-away places are looked at; ends are always found on all rows
SCAN_ROWS = 20_000
#: most distinct x at which a break's profile is looked at one by one
PLACES = 300

Loss = Callable[[float, Estimate], float]


@dataclass(frozen=True, eq=False)
class Profile:
    """One constant's profile.

    pieces: where the loss is at most `allowed`; a piece that reaches `lower` or `upper`, the ends of the search, is
    open there. places (K,), loss (K,): log-likelihood lost along the search, for a figure. finite: only the places
    themselves are possible.
    """

    best: float
    pieces: tuple[tuple[float, float], ...]
    lower: float
    upper: float
    open_low: bool
    open_high: bool
    allowed: float
    places: Array
    loss: Array
    finite: bool = False

    @property
    def holds(self) -> Callable[[float], bool]:
        """Whether a value lies in the set."""
        return lambda value: any(low <= value <= high for low, high in self.pieces)


def profile_of_power(est: Estimate, *, level: float = 0.95) -> Profile:
    """The power of y, by profile likelihood given the design (Box and Cox 1964) and chi-square on one degree."""

    bases: dict[int, Array] = {}

    def loss(lam: float, part: Estimate) -> float:
        if part.moving:
            return best_given(part, part.c)[0] - best_given(part, (lam,))[0]
        if part.n not in bases:
            bases[part.n] = _basis(part, part.theta)
        q = bases[part.n]
        here, best = (
            profile_likelihood(scale_power(part.scale, part.rows), part.rows.y, q, v) for v in (lam, part.c[0])
        )
        return best - here

    lower, upper = est.scale.search()
    grid = np.linspace(lower, upper, 25)
    return _profile(est, loss, est.c[0], _local(est, len(est.coef) + len(est.theta)), grid, chi2.ppf(level, 1) / 2)


def profile_of_shape(est: Estimate, which: int = 0, *, level: float = 0.95) -> Profile:
    """A searched constant of the shape (break, power, rate) by profile RSS (Bates and Watts 1988, chapter 6).

    The set where RSS <= RSS_min (1 + F / df), F on 1 and the residual degrees of freedom.
    """
    best = est.theta[which]
    if est.link is not None:
        return _under_link(est, which, level)
    allowed = est.n / 2 * float(np.log1p(fisher.ppf(level, 1, est.df_residual) / est.df_residual))
    if est.shape.finite:
        model = searched_model(est.rows, est.shape, est.state)
        rounding = 1e-15 * float(est.z @ est.z)  # what a difference of sums of squares can leave of a perfect fit
        rss, least = scan(model, est.z[:, None])[:, 0], float(est.residual @ est.residual)
        lost = est.n / 2 * np.log(np.maximum(rss, rounding) / max(least, rounding))
        return _listed(est, which, allowed, model.candidates, lost)

    plain = len(est.theta) == 1 and not est.remedy.left.searched
    around: dict[int, Callable[[float], float]] = {}

    def loss(value: float, part: Estimate) -> float:
        if plain:
            if part.n not in around:
                around[part.n] = _rss_loss(part)
            return around[part.n](value)
        return best_given(part, None)[0] - best_given(part, None, fixed=(which, value))[0]

    return _profile(est, loss, best, _local(est, len(est.coef) + which), _grid(est, which), allowed)


def _under_link(est: Estimate, which: int, level: float) -> Profile:
    """The same by the deviance."""
    allowed = allowed_loss(est, level)
    if est.shape.finite:
        candidates = est.shape.candidates(est.rows.x, est.state)
        return _listed(est, which, allowed, candidates, listed_losses(est, candidates))

    def without(model: Searched, held: int, value: float) -> Searched:
        return _without(model, held, value, joined=isinstance(est.shape, Hinge))

    # each place costs a fit by iteration, so corners are not looked at one by one
    grid = _grid(est, which, corners=False)
    loss = deviance_loss(est, which, without)
    return _profile(est, loss, est.theta[which], _local(est, len(est.coef) + which), grid, allowed)


def _grid(est: Estimate, which: int, *, corners: bool = True) -> Array:
    """Places along the search of one constant, its ends among them."""
    lower, upper = (float(end[which]) for end in est.shape.bounds(est.rows.x, est.state))
    grid = est.shape.candidates(est.rows.x, est.state)[:, which]
    if corners and isinstance(est.shape, Hinge):
        # a break's profile has a corner at every x
        x = np.unique(est.rows.x)
        if len(x) <= PLACES:
            grid = np.concatenate([x, (x[1:] + x[:-1]) / 2])
    return np.concatenate([grid[(grid > lower) & (grid < upper)], [lower, upper]])


def _rss_loss(est: Estimate) -> Callable[[float], float]:
    """Loss of a single searched constant with the other columns projected out once."""
    model = searched_model(est.rows, est.shape, est.state)
    q = model.basis
    e = est.z - q @ (q.T @ est.z)

    def rss(value: float) -> float:
        block = model.columns(np.array([value]))
        block = block - q @ (q.T @ block)
        length = np.sqrt(np.einsum("nk,nk->k", block, block))
        if not (np.isfinite(length).all() and length.min() > 0):
            return np.inf
        basis = np.linalg.qr(block / length)[0]
        left = e - basis @ (basis.T @ e)
        return float(left @ left)

    best = rss(est.theta[0])
    return lambda value: est.n / 2 * float(np.log(rss(value) / best))


def best_given(
    est: Estimate, c: Constants | None, *, fixed: tuple[int, float] | None = None
) -> tuple[float, Constants, Constants]:
    """Highest log-likelihood (units of y), with its theta and c, when some constants are held.

    c: the scale's constants, held; None: they are found when they are searched. fixed: (position, value) of one
    searched constant of the shape.
    """
    scale, y = est.scale, est.rows.y
    free = c is None and bool(scale.searched)
    power = scale_power(scale, est.rows) if scale.searched else None
    held = est.c if c is None else c
    theta = est.theta
    for _ in range(4 if free and est.moving else 1):
        z = est.rows.weigh(scale.forward(y, held))
        if est.moving and (fixed is not None or c is not None):
            theta = _theta_given(est, z, fixed)
        if power is not None and free:
            held = (best_power(power, y, _basis(est, theta), start=held[0])[0],)
    q = _basis(est, theta)
    if power is not None:
        return profile_likelihood(power, y, q, held[0]), theta, held
    z = est.rows.weigh(scale.forward(y, held))
    e = z - q @ (q.T @ z)
    rss = float(e @ e)
    level = -0.5 * len(y) * (np.log(2 * np.pi * rss / len(y)) + 1) if rss > 0 else np.inf
    return float(level + scale.log_jacobian(y, held).sum()), theta, held


def _basis(est: Estimate, theta: Constants) -> Array:
    return factor(weighted_design(est.rows, est.shape, est.state, theta)).q


def _theta_given(est: Estimate, z: Array, fixed: tuple[int, float] | None) -> Constants:
    """The shape's constants with the lowest RSS for z (n,) when one of them is held."""
    if fixed is not None and len(est.theta) == 1:
        return (fixed[1],)
    model = searched_model(est.rows, est.shape, est.state)
    if fixed is None:
        return tuple(float(v) for v in search(model, z, start=np.array(est.theta)).theta)
    which, value = fixed
    rest = _without(model, which, value, joined=isinstance(est.shape, Hinge))
    start = np.clip(np.delete(np.array(est.theta), which), rest.lower, rest.upper)
    found = refine(rest, start, z)
    if len(rest.candidates):
        profile = scan(rest, z[:, None])[:, 0]
        best = int(np.argmin(profile))
        if profile[best] < found.rss:
            found = min(found, refine(rest, rest.candidates[best], z), key=lambda f: f.rss)
    return tuple(float(v) for v in np.insert(found.theta, which, value))


def _without(model: Searched, which: int, value: float, *, joined: bool) -> Searched:
    """The search with one constant held; joined: breaks, of which the later stays the later."""

    def whole(rest: Array) -> Array:
        return np.insert(rest, which, value)

    candidates = np.unique(np.delete(model.candidates, which, axis=1), axis=0)
    lower, upper = np.delete(model.lower, which), np.delete(model.upper, which)
    if joined:
        gap = 1e-6 * float((model.upper - model.lower)[0])
        lower = np.maximum(lower, value + gap) if which == 0 else lower
        upper = np.minimum(upper, value - gap) if which == 1 else upper
        candidates = candidates[((candidates > lower) & (candidates < upper)).all(axis=1)]
        lower, upper = np.minimum(lower, model.upper[0]), np.maximum(upper, model.lower[0])
    return Searched(
        fixed=model.fixed, columns=lambda t: model.columns(whole(t)),
        slopes=lambda t: np.delete(model.slopes(whole(t)), which, axis=0), candidates=candidates, lower=lower,
        upper=upper, rebuild=lambda rows: _without(model.rebuild(rows), which, value, joined=joined),
    )  # fmt: skip


def _local(est: Estimate, position: int) -> Array:
    """Steps of one standard error around an estimate, out to six; the profile is looked at more closely there."""
    error = float(np.sqrt(est.covariance("constant")[position, position]))
    return error * np.linspace(-6, 6, 13)


def _profile(est: Estimate, loss: Loss, best: float, around: Array, grid: Array, allowed: float) -> Profile:
    lower, upper = float(grid.min()), float(grid.max())
    near = best + around[np.isfinite(around)]
    near = near[(near > lower) & (near < upper)]
    places = np.unique(np.concatenate([grid, near, [best]]))
    thin = _thinned(est)
    lost = np.zeros(len(places))
    for k in np.flatnonzero(places != best):
        if thin is not est and not near.min(initial=best) <= places[k] <= near.max(initial=best):
            lost[k] = est.n / thin.n * loss(float(places[k]), thin)
        if lost[k] <= allowed:  # near the estimate, or not ruled out by the part of the rows
            lost[k] = loss(float(places[k]), est)
    inside = lost <= allowed

    def over(value: float) -> float:
        # beyond any sensible loss the exact amount does not matter to the search for an end
        return min(loss(value, est), 1e6) - allowed

    edges = np.flatnonzero(np.diff(np.concatenate([[False], inside, [False]]).astype(int)))
    pieces = []
    for first, after in zip(edges[::2], edges[1::2], strict=True):
        left = places[0] if first == 0 else _end(over, places[first - 1], places[first])
        right = places[-1] if after == len(places) else _end(over, places[after], places[after - 1])
        pieces.append((float(left), float(right)))
    return Profile(best, tuple(pieces), lower, upper, bool(inside[0]), bool(inside[-1]), float(allowed), places, lost)


def _end(over: Callable[[float], float], outside: float, inside: float) -> float:
    """Where the loss crosses what is allowed, between a place outside the set and one inside."""
    if not over(float(outside)) > 0:
        return float(outside)
    if over(float(inside)) > 0:
        return float(inside)
    return float(brentq(over, float(inside), float(outside), xtol=1e-12 * max(abs(inside), abs(outside), 1e-300)))


def _thinned(est: Estimate) -> Estimate:
    """The estimate on an evenly spaced part of its rows, for looking far away at large n."""
    every = est.n // SCAN_ROWS
    if every < 2:
        return est
    return replace(est, rows=est.rows.take(np.arange(0, est.n, every)), kept=None)


def _listed(est: Estimate, which: int, allowed: float, candidates: Array, loss: Array) -> Profile:
    """A constant that can take only the listed values; the others are free. candidates (K, q), loss (K,)."""
    places = np.unique(candidates[:, which])
    lost = np.array([loss[candidates[:, which] == place].min() for place in places])
    kept = places[lost <= allowed]
    return Profile(
        est.theta[which], tuple((float(v), float(v)) for v in kept), float(places[0]), float(places[-1]),
        bool(lost[0] <= allowed), bool(lost[-1] <= allowed), allowed, places, np.maximum(lost, 0.0), finite=True,
    )  # fmt: skip
