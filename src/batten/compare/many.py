"""Held-out scores at many rows: training sets seen as small moves away from the fit to all rows.

Every row is held out once, so its prediction costs one product. What a training set needs of its own rows (residual
sum of squares, average and median residual) comes from sums over all rows less those over the held-out ones, exact or
with a bounded error; see `engine.left_out`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.compare.losses import log_t, losses, sound
from batten.compare.result import HeldOut, inverse_or_none, rank_lost, unsafe
from batten.engine.left_out import LeftOut
from batten.engine.power import likelihood_width, peaks
from batten.engine.rows import Array, Ints, Rows
from batten.errors import Refusal
from batten.families.base import Constants
from batten.fit.estimate import Estimate
from batten.fit.searched import scale_power, weighted_design
from batten.fit.smear import mean_of

__all__ = ["Folded", "score_alike"]

#: places beside the best power of y through which responses are interpolated, in standard errors of the power: K
#: training sets' powers spread by 1 / sqrt(K - 1) of one
PLACES = np.array([-2.0, -1.2, -0.5, 0.5, 1.2, 2.0])
#: places at which a training set's likelihood is taken
CHEBYSHEV = 12


@dataclass(frozen=True, eq=False)
class Folded:
    """Rows sorted by the fold that holds them out. order (n,): where they stood. starts (K + 1,): where folds start;
    rows before starts[0] always train."""

    rows: Rows
    order: Ints
    starts: Ints

    @classmethod
    def of(cls, rows: Rows, fold: Ints, k: int) -> Folded:
        order = np.argsort(fold, kind="stable")
        return cls(rows.take(order), order, np.searchsorted(fold[order], np.arange(k + 1)))

    @property
    def held(self) -> list[slice]:
        return [slice(int(a), int(b)) for a, b in zip(self.starts[:-1], self.starts[1:], strict=True)]


@dataclass(frozen=True, eq=False)
class _Basis:
    """Orthonormal columns a (n, p) of one shape, their rows' lengths, the inverse cross-product of every training set
    and v = a0'(A'A)^-1 a0 of the held-out rows (n,)."""

    a: Array
    length: Array
    inverse: list[Array]
    v: Array

    @classmethod
    def of(cls, est: Estimate, folded: Folded) -> _Basis | None:
        p = len(est.coef)
        a = weighted_design(folded.rows, est.shape, est.state, est.theta) @ est.factored.root[:p, :p]
        inverses, v = [], np.zeros(len(a))
        for held in folded.held:
            inverse = inverse_or_none(np.eye(p) - a[held].T @ a[held])
            if inverse is None:
                return None
            inverses.append(inverse)
            v[held] = np.einsum("ij,ij->i", a[held] @ inverse, a[held])
        return cls(a, np.einsum("ij,ij->i", a, a), inverses, v)


@dataclass(frozen=True, eq=False)
class _Sets:
    """All training sets of one remedy: what they leave of their rows, linear predictors (times sqrt(w)) and errors of
    the held-out rows (n,) on the fitting scale, residual sums of squares (K,), constants of the scale."""

    left: LeftOut
    eta: Array
    error: Array
    rss: Array
    c: list[Constants]


def score_alike(group: list[Estimate], folded: Folded) -> list[HeldOut | Refusal | None]:
    """Scores of remedies that share one shape whose columns are the same in every training set.

    None for a remedy whose training sets lie too far from the fit to all rows.
    """
    basis = _Basis.of(group[0], folded)
    if basis is None:
        return [rank_lost(group[0].shape.key)] * len(group)
    return [_score(est, folded, basis) for est in group]


def _score(est: Estimate, folded: Folded, basis: _Basis) -> HeldOut | Refusal | None:
    sets = _with_powers(est, folded, basis) if est.scale.searched else _plain_sets(est, folded, basis)
    if sets is None:
        return None
    out = np.empty((4, len(folded.held)))
    for k, held in enumerate(folded.held):
        found = _losses(est, folded.rows, sets, basis.v, k, held)
        if found is None:
            return unsafe(est)
        out[:, k] = found
    return HeldOut(out[0], out[1], out[2], out[3], np.diff(folded.starts))


def _plain_sets(est: Estimate, folded: Folded, basis: _Basis) -> _Sets:
    e, z = est.residual[folded.order], est.z[folded.order]
    eta, d, rss = z - e, np.empty((len(folded.held), basis.a.shape[1])), np.empty(len(folded.held))
    total = float(e @ e)
    for k, held in enumerate(folded.held):
        pull = basis.a[held].T @ e[held]
        d[k] = -basis.inverse[k] @ pull
        # the training rows' pull is the held-out rows' with the other sign
        rss[k] = total - e[held] @ e[held] + d[k] @ pull
        eta[held] += basis.a[held] @ d[k]
    left = LeftOut(e, basis.a, d, folded.starts, basis.length)
    return _Sets(left, eta, z - eta, rss, [est.c] * len(d))


def _with_powers(est: Estimate, folded: Folded, basis: _Basis) -> _Sets | None:
    """The power of y learned again in every training set; None where the likelihood of one peaks far away."""
    width = likelihood_width(scale_power(est.scale, folded.rows), folded.rows.y, basis.a, est.c[0])
    # errors that are far from normal move the power further
    tried = (_near_powers(est, folded, basis, stretch * width) for stretch in (1.0, 3.0))
    return next((sets for sets in tried if sets is not None), None)


def _near_powers(est: Estimate, folded: Folded, basis: _Basis, width: float) -> _Sets | None:
    """The same by responses interpolated between a few near powers; None where a likelihood peaks beyond them."""
    rows, a = folded.rows, basis.a
    power = scale_power(est.scale, rows)
    e, z = est.residual[folded.order], est.z[folded.order]
    near = np.column_stack([power.forward(rows.y, est.c[0] + width * place) for place in PLACES]) - z[:, None]
    along = a.T @ near
    r = np.column_stack([e, near - a @ along])
    rss = _profiles(r, basis, folded)
    jump = np.column_stack([power.jacobian(rows.y, est.c[0] + width * place) for place in (0.0, *PLACES)])
    jumps = jump.sum(axis=0) - np.stack([jump[held].sum(axis=0) for held in folded.held])
    moved = _best_moves(rss, jumps, len(e) - np.diff(folded.starts))
    if moved is None:
        return None
    weight = np.column_stack([np.ones(len(moved)), np.stack([_lagrange(m) for m in moved])])
    d, eta, error = np.empty((len(moved), a.shape[1])), np.empty_like(e), np.empty_like(e)
    for k, held in enumerate(folded.held):
        own = r[held] @ weight[k]
        d[k] = -basis.inverse[k] @ (a[held].T @ own)
        error[held] = own - a[held] @ d[k]
        eta[held] = z[held] + near[held] @ weight[k, 1:] - error[held]
    size = np.sqrt((r[:, 1:] ** 2).sum(axis=0))
    off = r[:, 1:] / np.where(size > 0, size, 1.0)
    left = LeftOut(
        e, np.hstack([a, off]), np.hstack([d, -weight[:, 1:] * size]), folded.starts,
        basis.length + (off**2).sum(axis=1),
    )  # fmt: skip
    total = np.einsum("kj,kjl,kl->k", weight, rss, weight)
    return _Sets(left, eta, error, total, [(est.c[0] + width * float(m),) for m in moved])


def _profiles(r: Array, basis: _Basis, folded: Folded) -> Array:
    """Cross-products (K, m, m) of responses r (n, m) in every training set, the columns projected out; A'r is zero."""
    out = np.empty((len(folded.held), r.shape[1], r.shape[1]))
    whole = r.T @ r
    for k, held in enumerate(folded.held):
        pull = basis.a[held].T @ r[held]
        out[k] = whole - r[held].T @ r[held] - pull.T @ basis.inverse[k] @ pull
    return out


def _best_moves(rss: Array, jumps: Array, count: Ints) -> Array | None:
    """Where each training set's likelihood peaks (K,), in widths from the best power of all rows."""
    nodes = np.cos(np.pi * (np.arange(CHEBYSHEV) + 0.5) / CHEBYSHEV)
    weight = np.array([[1.0, *_lagrange(at * PLACES[-1])] for at in nodes])
    square = np.einsum("mj,kjl,ml->mk", weight, rss, weight)
    if not (square > 0).all():
        return None
    jump = jumps[:, 0] + weight[:, 1:] @ (jumps[:, 1:] - jumps[:, :1]).T
    at = peaks(-0.5 * count * np.log(square) + jump, nodes)
    return None if at is None else np.asarray(at * PLACES[-1])


def _lagrange(at: float) -> Array:
    """Weights of the values at PLACES in the polynomial through them and through zero at 0."""
    nodes = np.append(PLACES, 0.0)
    return np.array([
        np.prod([(at - other) / (node - other) for j, other in enumerate(nodes) if j != i])
        for i, node in enumerate(PLACES)
    ])  # fmt: skip


def _losses(est: Estimate, rows: Rows, sets: _Sets, v: Array, k: int, held: slice) -> Array | None:
    """Squared and absolute error, share within 10% and log score (4,) of one fold's rows; None without finite means."""
    scale, c, left = est.scale, sets.c[k], sets.left
    y, root = rows.y[held], rows.root_weight[held]
    eta = sets.eta[held] if rows.weights is None else sets.eta[held] / root
    low, high = left.bounds
    if not sound(scale, [c], eta[None], np.array([[low - left.shift[k], high + left.shift[k]]])) and not sound(
        scale, [c], eta[None], left.own(k)[None]
    ):
        return None
    middle = eta + left.middles[k].mean()
    with np.errstate(all="ignore"):
        mean, median = _means(est, sets, k, eta), scale.inverse(middle, c)
    if not np.isfinite(mean).all():
        return None
    df = np.array([left.count[k] - len(est.coef) - len(est.theta)])
    score = log_t(sets.error[None, held], sets.rss[k : k + 1], v[None, held], df)[0] + scale.log_jacobian(y, c)
    if rows.weights is not None:
        score = score + np.log(root)
    return np.append(losses(y, mean, median, rows.weights, held), score.mean())


def _means(est: Estimate, sets: _Sets, k: int, eta: Array) -> Array:
    """Mean response of the held-out rows, corrected by the training set's own residuals."""
    left, closed = sets.left, est.scale.closed
    if closed == "identity":
        return eta
    if closed == "exp":
        return np.asarray(np.exp(eta) * left.exponentials[k])
    mean_square = float(sets.rss[k] / left.count[k])
    if closed == "square":
        return left.squares(k, eta, mean_square)
    residual, weight = left.pooled(k, mean_square)
    return np.asarray(mean_of(est.scale, [sets.c[k]], eta[None], residual[None], weight[None])[0])
