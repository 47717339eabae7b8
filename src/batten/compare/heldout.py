"""Held-out scores of many remedies on the same splits, everything re-learned inside every training set.

Remedies that share a shape share its columns: fixed columns are solved for all training sets and all scales from one
orthonormal basis, since leaving rows K out only changes its cross-product to I - Q_K'Q_K. Shapes that learn knots or
edges get columns of their own in each training set, brought close to orthonormal by the all-rows triangle so that
cross-products keep their digits; constants searched with the response are searched again from the all-rows place.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from batten.compare.losses import LazySplits, Split, Trained, losses, losses_together
from batten.compare.many import Folded, score_alike
from batten.compare.many_means import score_mean_model
from batten.compare.many_searched import constants_near
from batten.compare.result import HeldOut, fewer, inverse_or_none, joined, rank_lost, unsafe, unsettled
from batten.compare.smoothed import smoothed_sets
from batten.compare.spread import spread_losses
from batten.engine.folds import Splits
from batten.engine.irls import Mean
from batten.engine.linear import design
from batten.engine.mean_search import search_mean
from batten.engine.power import best_power, fold_powers
from batten.engine.rows import Array, Ints, Rows
from batten.engine.search import search
from batten.engine.sets import BLOCK, masks, search_sets, solve_means
from batten.engine.threads import MANY_ROWS
from batten.errors import Refusal
from batten.families.base import Constants, Link
from batten.fit.estimate import Estimate
from batten.fit.guard import meets_constant, no_error_left
from batten.fit.searched import scale_power, searched_model, weighted_design

__all__ = ["HeldOut", "Prepared", "held_out"]


@dataclass(frozen=True, eq=False)
class Prepared:
    """What the scores of all remedies share: the splits' rows, and with many rows these sorted by fold."""

    sets: Sequence[Split]
    folded: list[Folded]
    folds: int

    @classmethod
    def of(cls, rows: Rows, splits: Splits) -> Prepared:
        many = rows.count > MANY_ROWS
        sets: Sequence[Split] = LazySplits(rows, splits)
        return cls(
            sets if many else list(sets), [Folded.of(rows, f, splits.k) for f in splits.fold] if many else [], splits.k
        )


def held_out(estimates: list[Estimate], splits: Splits | Prepared) -> list[HeldOut | Refusal]:
    """Scores of every estimate on the same splits, in the order given."""
    if not estimates:
        return []
    ready = splits if isinstance(splits, Prepared) else Prepared.of(estimates[0].rows, splits)
    members: list[list[int]] = []
    shapes: dict[str, list[int]] = {}
    for i, est in enumerate(estimates):
        if est.link is None and not est.shape.searched and est.spread is None:
            shapes.setdefault(est.shape.key, []).append(i)
        else:
            members.append([i])
    members += shapes.values()
    found = {
        i: one
        for some in members
        for i, one in zip(some, _scored([estimates[i] for i in some], ready), strict=True)
    }  # fmt: skip
    return [found[i] for i in range(len(estimates))]


def _scored(group: list[Estimate], ready: Prepared) -> list[HeldOut | Refusal]:
    sets, folded = ready.sets, ready.folded
    if group[0].link is not None:
        return [_score_link(group[0], sets, folded)]
    if group[0].spread is not None:
        return [_score_spread(group[0], sets)]
    if group[0].shape.searched:
        return [_score_searched(group[0], ready)]
    return _score_group(group, sets, folded)


def _score_group(group: list[Estimate], sets: Sequence[Split], folded: list[Folded]) -> list[HeldOut | Refusal]:
    """All scales of one shape whose columns do not depend on the response."""
    rows, shape = group[0].rows, group[0].shape
    states = [shape.learn(split.sorted_x, constant=meets_constant(rows, shape)) for split in sets]
    if group[0].roughness is not None:
        return _score_smooth(group, sets, states)
    if folded and all(state == group[0].state for state in states):
        near = [joined(parts) for parts in zip(*(score_alike(group, one) for one in folded), strict=True)]
        # the few whose training sets lie further away are fitted again
        return [
            _fitted_group([est], sets, states)[0] if one is None else one for est, one in zip(group, near, strict=True)
        ]
    return _fitted_group(group, sets, states)


def _fitted_group(group: list[Estimate], sets: Sequence[Split], states: list[Constants]) -> list[HeldOut | Refusal]:
    """The same by a fit to the rows of every training set."""
    rows, shape = group[0].rows, group[0].shape
    precondition = group[0].factored.root
    shared = all(state == group[0].state for state in states)
    whole = group[0].factored.q if shared else None
    width = len(precondition)
    trained: list[list[Trained]] = [[] for _ in group]
    z_fixed = np.column_stack([np.zeros(rows.count) if est.scale.searched else est.z for est in group])
    bases, inverses, powers = [], [], any(est.scale.searched for est in group)
    cross = right = np.empty((0, 0))
    for s, test in enumerate(split.test for split in sets):
        basis = whole
        if basis is None:
            columns = shape.columns(rows.x, states[s])
            if columns.shape[1] * rows.modifier.shape[1] + rows.base.shape[1] != width:
                return [fewer(shape.key)] * len(group)
            basis = rows.weigh(design(rows, columns) @ precondition)
        held = basis[test]
        if whole is None or not len(cross):
            cross, right = basis.T @ basis, basis.T @ z_fixed
        inverse = inverse_or_none(cross - held.T @ held)
        if inverse is None:
            return [rank_lost(shape.key)] * len(group)
        eta = basis @ (inverse @ (right - held.T @ z_fixed[test]))
        v = np.einsum("ij,jk,ik->i", held, inverse, held)
        for j, est in enumerate(group):
            trained[j].append(Trained(eta[:, j], est.c, v, width))
        bases += [basis] if powers else []
        inverses.append(inverse)
    return [
        _score(est, sets, iter(fits) if not est.scale.searched else _with_powers(est, sets, fits, bases, inverses))
        for est, fits in zip(group, trained, strict=True)
    ]


def _score_smooth(group: list[Estimate], sets: Sequence[Split], states: list[Constants]) -> list[HeldOut | Refusal]:
    """All scales of one penalised shape."""
    trained: list[list[Trained | Refusal]] = [[] for _ in group]
    found = smoothed_sets(group, states, [split.test for split in sets])
    for split, fit in zip(sets, found, strict=True):
        if fit is None:
            return [rank_lost(group[0].shape.key)] * len(group)
        for j, est in enumerate(group):
            edf, n = float(fit.edf[j]), len(split.train)
            trouble = no_error_left(est.remedy, n, n - edf)
            trained[j].append(trouble or Trained(fit.eta[:, j], est.c, fit.v[:, j], edf))
    return [_score(est, sets, iter(fits)) for est, fits in zip(group, trained, strict=True)]


def _with_powers(
    est: Estimate, sets: Sequence[Split], fits: list[Trained], bases: list[Array], inverses: list[Array]
) -> Iterator[Trained | Refusal]:
    """The power of y learned again in every training set, and the fit at it."""
    rows, shared = est.rows, bases[0] is bases[-1]
    y, power = rows.y, scale_power(est.scale, rows)
    found = fold_powers(power, y, bases[0], inverses, [split.test for split in sets], est.c[0]) if shared else None
    for s, (split, fit) in enumerate(zip(sets, fits, strict=True)):
        train = split.train
        if found is not None:
            c, inside = float(found[s]), True
        else:
            root = np.linalg.cholesky(inverses[s])
            part = scale_power(est.scale, rows.take(train))
            c, inside = best_power(part, y[train], bases[s][train] @ root, start=est.c[0])
        if not inside:
            yield Refusal(
                "The power of y is not settled in every training set.", f"It runs to {c:.3g} in one of them.",
                "A named scale: log y, sqrt y or 1/y.",
            )  # fmt: skip
            return
        z = rows.weigh(est.scale.forward(y, (c,)))
        eta = bases[s] @ (inverses[s] @ (bases[s][train].T @ z[train]))
        yield Trained(eta, (c,), fit.v, fit.columns)


def _score_searched(est: Estimate, ready: Prepared) -> HeldOut | Refusal:
    """A shape with constants of its own, searched again in each training set."""
    rows, shape, sets = est.rows, est.shape, ready.sets
    states = [shape.learn(split.sorted_x, constant=meets_constant(rows, shape)) for split in sets]
    thetas: Array | None = None
    if all(state == est.state for state in states) and not est.scale.searched:
        thetas = _shared_search(est, sets, ready.folds)
        if ready.folded and (thetas == np.array(est.theta)).all():  # then the columns are the same everywhere
            near = joined(tuple(score_alike([est], one)[0] for one in ready.folded))
            if near is not None:
                return near
    return _score(est, sets, _searched_fits(est, sets, states, thetas))


def _searched_fits(
    est: Estimate, sets: Sequence[Split], states: list[Constants], thetas: Array | None
) -> Iterator[Trained | Refusal]:
    """Fits of the training sets at their constants thetas (S, q), or at those searched here."""
    rows, shape = est.rows, est.shape
    p = len(est.coef)
    root = est.factored.root[:p, :p]  # the coefficients come first, so this is the triangle of the columns alone
    for s, split in enumerate(sets):
        train, test = split.train, split.test
        theta, c = (thetas[s], est.c) if thetas is not None else _own_search(est, rows.take(train), states[s])
        x = weighted_design(rows, shape, states[s], tuple(theta))
        z = est.z if c == est.c else rows.weigh(est.scale.forward(rows.y, c))
        fitted = _least_squares(x, z, root, test)
        if fitted is None:
            yield rank_lost(shape.key)
            return
        yield Trained(fitted[0], c, fitted[1], x.shape[1] + len(theta))


def _shared_search(est: Estimate, sets: Sequence[Split], folds: int) -> Array:
    """Best constants of every training set (S, q), all sets at once as far as memory allows."""
    held = [split.test for split in sets]
    if est.n > MANY_ROWS and est.moving:
        found = constants_near(est, held, folds)
        if found is not None:
            return found
    model = searched_model(est.rows, est.shape, est.state)
    block = max(1, BLOCK // (est.n * (1 + len(est.theta))))
    out = [
        search_sets(model, est.z, masks(est.n, held[s : s + block]), np.array(est.theta))
        for s in range(0, len(held), block)
    ]
    return np.vstack(out)


def _own_search(est: Estimate, part: Rows, state: Constants) -> tuple[Array, Constants]:
    """Constants of one training set whose columns or scale are its own."""
    model = searched_model(part, est.shape, state)
    c, theta = est.c, np.array(est.theta)
    for _ in range(8 if est.scale.searched else 1):
        found = search(model, part.weigh(est.scale.forward(part.y, c)), start=theta, precision=1e-9)
        moved, theta = np.abs(found.theta - theta).max(), found.theta
        if not est.scale.searched:
            break
        q = np.linalg.qr(np.hstack([model.fixed, model.columns(theta)]))[0]
        c = (best_power(scale_power(est.scale, part), part.y, q, start=c[0])[0],)
        if moved < 1e-8 * max(1.0, float(np.abs(theta).max())):
            break
    return theta, c


def _least_squares(x: Array, z: Array, root: Array, test: Ints) -> tuple[Array, Array] | None:
    """Linear predictor of all rows and v of the held-out ones, fitted on the other rows; root (p, p) brings the columns
    close to orthonormal."""
    if not np.isfinite(x).all():
        return None
    basis = x @ root
    held = basis[test]
    inverse = inverse_or_none(basis.T @ basis - held.T @ held)
    if inverse is None:
        return None
    eta = basis @ (inverse @ (basis.T @ z - held.T @ z[test]))
    return eta, np.einsum("ij,jk,ik->i", held, inverse, held)


def _score(est: Estimate, sets: Sequence[Split], fits: Iterator[Trained | Refusal]) -> HeldOut | Refusal:
    """Losses of one remedy on a transformed (or plain) response; sets of equal size are scored together."""
    out = np.empty((4, len(sets)))
    for members in _alike(sets, est.n):
        trained = [next(fits) for _ in members] if len(members) < len(sets) else list(fits)
        refusal = next((fit for fit in trained if isinstance(fit, Refusal)), None)
        if refusal is not None:
            return refusal
        some = [(place, fit) for place, fit in zip(members, trained, strict=True) if isinstance(fit, Trained)]
        for size in {len(sets[place].test) for place in members}:
            same = [(place, fit) for place, fit in some if len(sets[place].test) == size]
            losses = losses_together(est, [sets[place] for place, _ in same], [fit for _, fit in same])
            if losses is None:
                return unsafe(est)
            out[:, [place for place, _ in same]] = losses
    return HeldOut(out[0], out[1], out[2], out[3], np.array([len(split.test) for split in sets]))


def _alike(sets: Sequence[Split], n: int) -> list[list[int]]:
    """Which sets are held in memory together: all of them at small n, else one by one."""
    everything = list(range(len(sets)))
    return [everything] if n * len(sets) <= BLOCK else [[place] for place in everything]


def _score_link(est: Estimate, sets: Sequence[Split], folded: list[Folded]) -> HeldOut | Refusal:
    """Losses of a mean model; its median is the mean times the median of y / mu."""
    rows, shape, link = est.rows, est.shape, est.link
    assert isinstance(link, Link)
    model = Mean(link.mean, link.mean_slope, link.variance, link.deviance)
    if shape.searched:
        return _score_searched_link(est, model, sets)
    if folded:
        states = [shape.learn(split.sorted_x, constant=meets_constant(rows, shape)) for split in sets]
        k = len(folded[0].held)
        near = joined(tuple(score_mean_model(est, one, states[r * k : (r + 1) * k]) for r, one in enumerate(folded)))
        if near is not None:
            return near
    out = np.empty((3, len(sets)))
    block = max(1, BLOCK // (rows.count * len(est.coef)))
    for first in range(0, len(sets), block):
        some = sets[first : first + block]
        states = [shape.learn(split.sorted_x, constant=meets_constant(rows, shape)) for split in some]
        if any(len(state) != len(est.state) for state in states):
            return fewer(shape.key)
        shared = all(state == est.state for state in states)
        x = np.stack([
            design(rows, shape.columns(rows.x, state, est.theta), own_level=shape.own_level)
            for state in (states[:1] if shared else states)
        ])  # fmt: skip
        mask = masks(rows.count, [split.test for split in some])
        mask = mask if rows.weights is None else mask * rows.weights
        done = solve_means(model, x[0] if shared else x, rows.y, mask, est.coef)
        if not np.isfinite(done.eta).all():
            return rank_lost(shape.key)
        if not done.settled.all():
            return unsettled(est)
        mu = link.mean(done.eta)
        if not np.isfinite(mu).all():
            return unsafe(est)
        for s, split in enumerate(some):
            out[:, first + s] = _losses_of_means(rows, mu[s], split)
    return HeldOut(out[0], out[1], out[2], None, np.array([len(split.test) for split in sets]))


def _losses_of_means(rows: Rows, mu: Array, split: Split) -> Array:
    """Losses (3,) of means mu (n,) fitted to the training rows."""
    train, test = split.train, split.test
    median = float(np.median(1 + rows.root_weight[train] * (rows.y[train] / mu[train] - 1)))
    return losses(rows.y[test], mu[test], mu[test] * median, rows.weights, test)


def _score_searched_link(est: Estimate, model: Mean, sets: Sequence[Split]) -> HeldOut | Refusal:
    """The same where the shape's constants are searched again in each training set, from the all-rows place."""
    rows, shape = est.rows, est.shape
    out = np.empty((3, len(sets)))
    for s, split in enumerate(sets):
        part = rows.take(split.train)
        state = shape.learn(split.sorted_x, constant=meets_constant(rows, shape))
        found = search_mean(
            model, searched_model(replace(part, weights=None), shape, state), part.y, prior=part.weights,
            eta=est.eta[split.train], start=np.array(est.theta),
        )  # fmt: skip
        columns = shape.columns(rows.x, state, tuple(found.theta))
        with np.errstate(all="ignore"):
            mu = model.mean(design(rows, columns, own_level=shape.own_level) @ found.coef)
        if not np.isfinite(mu).all():
            return unsafe(est)
        out[:, s] = _losses_of_means(rows, mu, split)
    return HeldOut(out[0], out[1], out[2], None, np.array([len(split.test) for split in sets]))


def _score_spread(est: Estimate, sets: Sequence[Split]) -> HeldOut | Refusal:
    """Losses of a remedy whose weights are learned."""
    found = spread_losses(est, sets)
    if isinstance(found, str):
        return fewer(est.shape.key) if found == "fewer" else rank_lost(est.shape.key)
    return HeldOut(found[0], found[1], found[2], found[3], np.array([len(split.test) for split in sets]))
