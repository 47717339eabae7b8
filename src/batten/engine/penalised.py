"""Least squares with a penalty on roughness, its amount chosen by restricted likelihood.

A penalised fit is least squares on the rows of the data followed by rows sqrt(amount) D whose response is zero, D'D
being the penalty. Turned to the directions of Demmler and Reinsch (1975), in which data and penalty do not mix, a fit
costs p operations for any amount, and so does its restricted likelihood, that of the mixed model whose rough directions
are random (Patterson and Thompson 1971; Reiss and Ogden 2009; Wood 2011). Columns that the data alone could not tell
apart are held by the penalty, as long as the directions free of it are settled.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

from batten.engine.linear import REFINE_UP_TO, Factored, factor, solve
from batten.engine.rows import Array, Ints

__all__ = ["Roughness", "Smoothed", "TrainedSets", "joined", "penalty_rows", "smooth", "smooth_sets"]

End = Literal["straight", "free", ""]

#: directions of the penalty under this share of the largest, in scaled columns, are rounding
ROUNDING = 1e-12
#: where the search ends, the penalty leaves e^-END of every rough direction, or takes as little of it
END = 14.0
#: width of the search's cells: what the penalty takes of one direction rises from a tenth to nine within three of them
CELL = 1.5
#: weight of the penalty against the data in the factor that serves every amount: enough to hold columns that the data
#: do not tell apart, little enough to keep the data's digits
SLIGHT = 1e-6
#: share of a column's square left beside the others under which cross-products have lost it
LOST = 1e-12
#: share of a direction that the data must carry to say anything about it
CARRIED = 1e-10


@dataclass(frozen=True, eq=False)
class Roughness:
    """What a penalty did to a fit.

    rows (r, p): sqrt(amount) D, on raw coefficients. pull (r, p): those rows of the orthonormal basis of data and
    penalty together. edf: trace of the hat matrix. end: "straight" or "free" where the restricted likelihood goes on
    rising until nothing or all of the roughness is left. near (p, p): root of the factor that serves every amount.
    """

    rows: Array
    pull: Array
    amount: float
    edf: float
    end: End
    near: Array


@dataclass(frozen=True, eq=False)
class Smoothed:
    """A penalised fit: coefficients (p,) in raw units and residuals (n,).

    factored: an orthonormal basis of the data's rows followed by those of the penalty (its r is not a triangle), q cut
    to the rows of the data, so that row i has squared length h_i and root root' = (X'X + penalty)^-1.
    """

    coef: Array
    residual: Array
    factored: Factored
    roughness: Roughness


def penalty_rows(penalty: Array, curves: Array, fixed: int) -> Array:
    """Rows D (..., r, fixed + m k) with D'D the sum of the penalties of all curves (u, m).

    penalty (..., k, k) is on one curve's coefficients, of which each modifier multiplies a set of its own. Summed over
    the curves themselves it does not depend on how a factor is coded. The first `fixed` coefficients are free.
    """
    size = np.sqrt(np.einsum("...kk->...k", penalty))
    rough = np.flatnonzero(size.reshape(-1, size.shape[-1]).all(axis=0))
    size = size[..., rough]
    scaled = penalty[..., rough[:, None], rough] / (size[..., :, None] * size[..., None, :])
    values, vectors = np.linalg.eigh(scaled)
    turned = vectors * np.sqrt(np.maximum(values, ROUNDING))[..., None, :]
    one = np.zeros((*penalty.shape[:-2], len(rough), penalty.shape[-1]))
    one[..., rough] = turned.swapaxes(-1, -2) * size[..., None, :]
    every = np.kron(np.linalg.qr(curves, mode="r"), one)
    return np.concatenate([np.zeros((*every.shape[:-1], fixed)), every], axis=-1)


def joined(x: Array, penalty: Array) -> Factored:
    """QR of a design x (n, p) followed by a slight penalty, for `smooth`; ask `aliased` before using it."""
    return factor(np.vstack([x, _slight(np.einsum("np,np->p", x, x), penalty) * penalty]))


def smooth(
    x: Array, linear: Factored, z: Array, penalty: Array, *, log_amount: float | None = None
) -> Smoothed:  # fmt: skip
    """The penalised fit of z (n,) on the design x (n, p) with `joined` QR linear; penalty (r, p): D.

    log_amount: a given amount instead of that of highest restricted likelihood.
    """
    (n, p), r = x.shape, len(penalty)
    slight = float(_slight(np.einsum("np,np->p", x, x), penalty))
    basis, found = linear.q[:n], _directions(linear.q[n:])
    end: End = ""
    if log_amount is None:
        along = found.vectors.T @ (basis.T @ z) / found.data
        left = z - basis @ (found.vectors @ along)
        squares, free = (found.data * along**2)[None, :r], np.array([float(n - p + r)])
        # rounding must not be read as noise, nor as bends
        rest = np.array([max(left @ left, 1e-26 * (z @ z))])
        at, side = _amounts(squares, rest, found.stiffness[None] / slight**2, free)
        log_amount, end = float(at[0]), _END_NAMES[int(side[0])]
    amount = float(np.exp(log_amount))
    weight = 1 / (found.data + amount / slight**2 * found.penalty)
    # orthonormal together with the penalty's rows: nothing large has to cancel in these directions
    turn, rows = found.vectors * np.sqrt(weight), np.sqrt(amount) * penalty
    q, triangle, root = basis @ turn, np.linalg.inv(turn) @ linear.r, linear.root @ turn
    roughness = Roughness(rows, rows @ root, amount, float(found.data @ weight), end, linear.root)
    factored = _with_root(Factored(q, triangle, linear.length), root)
    if x.size > REFINE_UP_TO:
        coef, residual = solve(factored, x, z)
    else:
        whole = _with_root(Factored(np.vstack([q, roughness.pull]), triangle, linear.length), root)
        coef, residual = solve(whole, np.vstack([x, rows]), np.append(z, np.zeros(r)))
    return Smoothed(coef, residual[:n], factored, roughness)


@dataclass(frozen=True, eq=False)
class TrainedSets:
    """Penalised fits of E responses in S training sets.

    coef (S, p, E), edf (S, E). spread (S, E, p, p): the squared length of its product with a design row is that row's
    x'(X'X + penalty)^-1 x.
    """

    coef: Array
    edf: Array
    spread: Array


def smooth_sets(cross: Array, right: Array, total: Array, count: Array, penalty: Array) -> TrainedSets | None:
    """Every set's amount by its own restricted likelihood; None where a set has lost a direction free of the penalty.

    cross (S, p, p): X'X of columns of about one length; right (S, p, E): X'z; total (S, E): z'z; count (S,): rows;
    penalty (S, r, p): D.
    """
    (p, responses), r = right.shape[1:], penalty.shape[1]
    slight = _slight(np.einsum("spp->sp", cross), penalty)
    inner = slight[:, None, None] * penalty
    whole = cross + inner.swapaxes(1, 2) @ inner
    try:
        lower = np.linalg.cholesky(whole)
    except np.linalg.LinAlgError:
        return None
    if (np.einsum("spp->sp", lower) ** 2 < LOST * np.einsum("spp->sp", whole)).any():
        return None
    root = np.linalg.inv(lower).swapaxes(1, 2)
    found = _directions(inner @ root)
    turn = root @ found.vectors
    push = turn.swapaxes(1, 2) @ right
    squares = push**2 / found.data[:, :, None]
    rest = np.maximum(total - squares.sum(axis=1), 1e-15 * total)
    weight = np.empty_like(push)
    for j in range(responses):
        at, _ = _amounts(squares[:, :r, j], rest[:, j], found.stiffness / slight[:, None] ** 2, count - p + r)
        weight[:, :, j] = 1 / (found.data + (np.exp(at) / slight**2)[:, None] * found.penalty)
    spread = turn[:, None] * np.sqrt(weight).swapaxes(1, 2)[:, :, None, :]
    return TrainedSets(turn @ (push * weight), (found.data[:, :, None] * weight).sum(axis=1), spread)


_END_NAMES: dict[int, End] = {-1: "free", 0: "", 1: "straight"}


@dataclass(frozen=True, eq=False)
class _Directions:
    """Orthonormal directions (..., p, p) of data and slight penalty together, free ones last, and the part of each that
    the data and the penalty carry: data + penalty = 1, (..., p). stiffness (..., r): their ratio in the rough ones."""

    vectors: Array
    data: Array
    penalty: Array
    stiffness: Array


def _directions(inner: Array) -> _Directions:
    """inner (..., r, p): the penalty's rows of the orthonormal basis."""
    _, sizes, turned = np.linalg.svd(inner)
    r, p = inner.shape[-2:]
    penalty = np.concatenate([sizes**2, np.zeros((*sizes.shape[:-1], p - r))], axis=-1)
    data = np.maximum(1 - penalty, CARRIED)
    return _Directions(turned.swapaxes(-1, -2), data, penalty, penalty[..., :r] / data[..., :r])


def _slight(squares: Array, penalty: Array) -> Array:
    """Factor (...) for D (..., r, p) that makes it slight beside columns of squared lengths `squares` (..., p).

    Beside most of those that it holds: the data may say nothing about some.
    """
    held = (penalty**2).sum(axis=-2)
    rough = np.flatnonzero(held.reshape(-1, held.shape[-1]).all(axis=0))
    if not len(rough):
        return np.ones(held.shape[:-1])
    ratio = np.sort(squares[..., rough] / held[..., rough], axis=-1)[..., (3 * len(rough)) // 4]
    return np.asarray(np.sqrt(SLIGHT * np.maximum(ratio, 1e-300)))


def _with_root(factored: Factored, root: Array) -> Factored:
    """The same with its root known to full accuracy."""
    factored.__dict__["root"] = root
    return factored


def _amounts(squares: Array, rest: Array, stiffness: Array, free: Array) -> tuple[Array, Ints]:
    """Log amount of highest restricted likelihood in each of S data sets (S,), and at which end it lies (-1, 0, 1).

    squares (S, r): squared response along the rough directions; rest (S,): residual sum of squares without a penalty;
    stiffness (S, r), falling; free (S,): rows less directions free of the penalty. A grid finds the cell, for there may
    be several maxima; Newton steps, kept inside it by bisection, find the place.
    """
    if not stiffness.shape[1]:
        return np.zeros(len(rest)), np.zeros(len(rest), dtype=np.intp)
    low, high = -np.log(stiffness[:, 0]) - END, -np.log(stiffness[:, -1]) + END
    count = int(np.ceil((high - low).max() / CELL)) + 1
    grid = low[:, None] + (high - low)[:, None] * np.linspace(0, 1, count)
    rest = np.maximum(rest, 1e-300)
    best = _loss(grid, squares[:, None], rest[:, None], stiffness[:, None], free[:, None]).argmin(axis=1)
    end = (best == count - 1).astype(np.intp) - (best == 0)
    each = np.arange(len(grid))
    left, at, right = (grid[each, np.clip(best + k, 0, count - 1)] for k in (-1, 0, 1))
    for _ in range(60):
        slope, bend = _slopes(at, squares, rest, stiffness, free)
        left, right = np.where(slope < 0, at, left), np.where(slope < 0, right, at)
        with np.errstate(all="ignore"):
            trial = at - slope / bend
        trial = np.where((trial > left) & (trial < right) & (bend > 0), trial, (left + right) / 2)
        step = np.where(end == 0, trial - at, 0.0)
        at = at + step
        if np.abs(step).max() <= 1e-12:
            break
    return at, end


def _taken(log_amount: Array, stiffness: Array) -> Array:
    """Share of each rough direction (..., r) that the penalty takes away."""
    return np.asarray(1 / (1 + np.exp(-log_amount[..., None]) / stiffness))


def _loss(at: Array, squares: Array, rest: Array, stiffness: Array, free: Array) -> Array:
    """Minus twice the restricted log-likelihood, up to a constant."""
    taken = _taken(at, stiffness)
    return np.asarray(free * np.log(rest + (squares * taken).sum(axis=-1)) - np.log(taken).sum(axis=-1))


def _slopes(at: Array, squares: Array, rest: Array, stiffness: Array, free: Array) -> tuple[Array, Array]:
    """First and second slope of `_loss` in the log amount."""
    taken = _taken(at, stiffness)
    change = squares * taken * (1 - taken)
    total = rest + (squares * taken).sum(axis=-1)
    first = change.sum(axis=-1) / total
    second = (change * (1 - 2 * taken)).sum(axis=-1) / total
    return free * first - (1 - taken).sum(axis=-1), free * (second - first**2) + (taken * (1 - taken)).sum(axis=-1)
