"""Penalised curves in training sets: knots and the amount of smoothing learned again in each.

Between two cuts every column of a shape is a cubic, so a row is described by the powers of its place in its cell. What
a set needs of its rows, cross-products, is summed cell by cell in these few columns and then turned to the shape's own.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from batten.engine.penalised import joined, penalty_rows, smooth_sets
from batten.engine.rows import Array, Ints, Rows
from batten.engine.sets import BLOCK
from batten.families.base import Constants, Shape
from batten.fit.estimate import Estimate
from batten.fit.searched import weighted_design
from batten.fit.smoothing import curves_of, roughness_rows

__all__ = ["SmoothedSet", "smoothed_sets"]

Bools = npt.NDArray[np.bool_]

#: up to this many rows the design itself is quicker
ONE_CELL = 2_000
#: places in a cell, in cell widths, at which a cubic is read off, and the way from its values there to its powers
_PLACES = np.array([0.05, 0.35, 0.65, 0.95])
_CUBIC = np.linalg.inv(np.vander(_PLACES, 4, increasing=True))


@dataclass(frozen=True, eq=False)
class SmoothedSet:
    """One training set's fits of E responses.

    eta (n, E): linear predictors of all rows times sqrt(w); edf (E,); v (h, E): w x'(X'WX + penalty)^-1 x of the
    held-out rows.
    """

    eta: Array
    edf: Array
    v: Array


@dataclass(frozen=True, eq=False)
class _Sorted:
    """Rows in rising order of x, with responses z (n, E) and each row's curve (n,)."""

    order: Ints
    rows: Rows
    z: Array
    curve: Ints
    curves: Array

    @classmethod
    def of(cls, rows: Rows, z: Array) -> _Sorted:
        order = np.argsort(rows.x, kind="stable")
        curves, curve = curves_of(rows)
        return cls(order, rows.take(order), z[order], curve[order], curves)

    @property
    def x(self) -> Array:
        return self.rows.x


@dataclass(frozen=True, eq=False)
class _Set:
    """One set's rows by cell.

    local (n, w + E): base columns, powers of the place in the cell times each modifier, responses. ends (C + 1,): where
    each cell starts. maps (C, w, p): from a cell's local columns to the design. With few rows one cell holds all, and
    its local columns are the design. out (n,): True for held-out rows.
    """

    local: Array
    ends: Ints
    maps: Array
    out: Bools

    def times(self, coef: Array, rows: Bools | slice = slice(None)) -> Array:
        """The design times coef (p, k), for these rows."""
        maps = self.maps @ coef
        local, ends = self.local[rows, : maps.shape[1]], self.ends
        if not isinstance(rows, slice):
            ends = np.concatenate([[0], np.cumsum(rows)])[ends]
        return np.concatenate([local[a:b] @ m for (a, b), m in zip(pairwise(ends), maps, strict=True)])

    def cross_products(self) -> tuple[Array, Array, Array]:
        """Of the training rows: X'X (p, p), X'z (p, E), z'z (E,)."""
        ends = np.concatenate([[0], np.cumsum(~self.out)])[self.ends]
        local, w = self.local[~self.out], self.maps.shape[1]
        cells = np.stack([local[a:b].T @ local[a:b] for a, b in pairwise(ends)])
        turned = self.maps.swapaxes(1, 2)
        cross, right = turned @ cells[:, :w, :w] @ self.maps, turned @ cells[:, :w, w:]
        return cross.sum(axis=0), right.sum(axis=0), np.einsum("cjj->j", cells[:, w:, w:])


def smoothed_sets(
    group: list[Estimate], states: list[Constants], held: list[Ints]
) -> Iterator[SmoothedSet | None]:  # fmt: skip
    """Fits of estimates that share one penalised shape, set by set; None where one cannot be had."""
    rows, z = group[0].rows, np.column_stack([est.z for est in group])
    # a constant is free of the penalty, so fits follow it
    shift = z.mean(axis=0) * rows.root_weight[:, None] * rows.constant
    ordered = _Sorted.of(rows, z - shift)
    first = group[0].roughness
    assert first is not None
    near = {len(group[0].state): first.near}
    most = max(1, BLOCK // (rows.count * (rows.base.shape[1] + 4 * rows.modifier.shape[1] + len(group))))
    start = 0
    while start < len(states):
        width, stop = len(states[start]), start + 1
        while stop < min(len(states), start + most) and len(states[stop]) == width:
            stop += 1
        if width not in near:
            near[width] = _near(rows, group[0].shape, states[start])
        for one in _together(ordered, group[0].shape, states[start:stop], held[start:stop], near[width]):
            yield None if one is None else SmoothedSet(one.eta + shift, one.edf, one.v)
        start = stop


def _near(rows: Rows, shape: Shape, state: Constants) -> Array:
    """What brings the columns of all sets with as many knots close to orthonormal (p, p), so that cross-products keep
    their digits."""
    penalty = roughness_rows(rows, shape, state)
    assert penalty is not None
    return joined(weighted_design(rows, shape, state, ()), penalty).root


def _together(
    ordered: _Sorted, shape: Shape, states: list[Constants], held: list[Ints], near: Array
) -> Iterator[SmoothedSet | None]:
    """Sets whose columns are alike in number."""
    sets = [_set(ordered, shape, state, rows, near) for state, rows in zip(states, held, strict=True)]
    cross, right, total = (np.stack(part) for part in zip(*(one.cross_products() for one in sets), strict=True))
    count = np.array([len(ordered.x) - float(len(rows)) for rows in held])
    found = smooth_sets(cross, right, total, count, _penalties(ordered, shape, states, sets) @ near)
    for s, rows in enumerate(held):
        if found is None:
            yield None
            continue
        eta, v = np.empty(ordered.z.shape), np.empty(ordered.z.shape)
        eta[ordered.order] = sets[s].times(found.coef[s])
        out = ordered.order[sets[s].out]
        for e, spread in enumerate(found.spread[s]):
            v[out, e] = (sets[s].times(spread, sets[s].out) ** 2).sum(axis=1)
        yield SmoothedSet(eta, found.edf[s], v[rows])


def _set(ordered: _Sorted, shape: Shape, state: Constants, held: Ints, near: Array) -> _Set:
    out = np.zeros(len(ordered.x), dtype=bool)
    out[held] = True
    if len(ordered.x) <= ONE_CELL:
        own = weighted_design(ordered.rows, shape, state, ()) @ near
        ends = np.array([0, len(own)])
        return _Set(np.hstack([own, ordered.z]), ends, np.eye(own.shape[1])[None], out[ordered.order])
    cuts = np.asarray(shape.cuts(state))
    width = np.diff(cuts)
    width = np.concatenate([width[:1], width, width[-1:]]) if len(width) else np.ones(2)
    left = np.concatenate([cuts[:1] - width[0], cuts])
    ends = np.searchsorted(ordered.x, cuts)
    ends = np.concatenate([[0], ends, [len(ordered.x)]])
    size = np.diff(ends)
    u = (ordered.x - np.repeat(left, size)) / np.repeat(width, size)
    places = (left[:, None] + width[:, None] * _PLACES).ravel()
    cubic = _CUBIC @ shape.columns(places, state).reshape(len(left), 4, -1)
    fixed, m, k = ordered.rows.base.shape[1], ordered.rows.modifier.shape[1], cubic.shape[2]
    local = np.empty((len(u), fixed + 4 * m + ordered.z.shape[1]))
    local[:, :fixed], local[:, fixed + 4 * m :] = ordered.rows.weigh(ordered.rows.base), ordered.z
    maps = np.zeros((len(left), fixed + 4 * m, fixed + k * m))
    maps[:, :fixed, :fixed] = np.eye(fixed)
    for j, power in enumerate(ordered.rows.weigh(ordered.rows.modifier).T):
        for place in range(fixed + 4 * j, fixed + 4 * (j + 1)):
            local[:, place] = power
            power = power * u
        maps[:, fixed + 4 * j : fixed + 4 * (j + 1), fixed + k * j : fixed + k * (j + 1)] = cubic
    return _Set(local, ends, maps @ near, out[ordered.order])


def _penalties(ordered: _Sorted, shape: Shape, states: list[Constants], sets: list[_Set]) -> Array:
    """Rows D of every set (S, r, p); a set counts the curves that its training rows have."""
    penalty = np.stack([shape.penalty(state) for state in states])  # type: ignore[misc]
    count, fixed = len(ordered.curves), ordered.rows.base.shape[1]
    if count == 1:
        return penalty_rows(penalty, ordered.curves, fixed)
    seen = [np.bincount(ordered.curve[~one.out], minlength=count) > 0 for one in sets]
    if np.all(seen):
        return penalty_rows(penalty, ordered.curves, fixed)
    return np.stack([penalty_rows(p, ordered.curves[some], fixed) for p, some in zip(penalty, seen, strict=True)])
