"""Folds dealt along the rows sorted by x, then y, then covariates.

Each run of K rows is dealt by a seeded permutation, so every fold covers the range of x, and the folds ignore the
stored order of the rows and any increasing change of unit. Identical rows stay together, and so do clusters.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.linear import design, factor
from batten.engine.rows import Array, Ints, Rows

__all__ = ["Splits", "deal", "default_repeats"]


#: a training set has lost a direction when less than this share of its squared length is left
LOST = 1e-9


@dataclass(frozen=True, eq=False)
class Splits:
    """fold (repeats, n): where each row is held out, -1 for a row that always trains. k: number of folds."""

    fold: Ints
    k: int

    @property
    def sets(self) -> list[tuple[Ints, Ints]]:
        """(training rows, held-out rows) of every split, repeat by repeat."""
        out = []
        for fold in self.fold:
            for k in range(self.k):
                held = fold == k
                out.append((np.flatnonzero(~held), np.flatnonzero(held)))
        return out

    @property
    def count(self) -> int:
        return len(self.fold) * self.k


def default_repeats(n: int) -> int:
    """Repeats of the K folds: 10 below 300 rows, then 1."""
    return 10 if n < 300 else 1


def deal(rows: Rows, *, folds: int, repeats: int, seed: int) -> Splits:
    """Deal the rows into `folds` folds, `repeats` times, from one seed."""
    order = _sorted_rows(rows)
    unit = _units(rows, order)
    k = min(folds, int(unit.max()) + 1)
    runs = -(-(int(unit.max()) + 1) // k)
    rng = np.random.default_rng(seed)
    basis = factor(design(rows, rows.x[:, None])).q
    out = np.empty((repeats, rows.count), dtype=np.intp)
    for r in range(repeats):
        dealt = rng.permuted(np.tile(np.arange(k), (runs, 1)), axis=1).ravel()
        out[r, order] = dealt[unit]
        _keep_owners(out[r], basis, k)
    return Splits(out, k)


def _keep_owners(fold: Ints, basis: Array, k: int) -> None:
    """Rows without which a training set could not fit the straight line always train: the only rows of a level, say.

    Held out they could be predicted by no remedy. Along a direction that a training set loses, all length lies in the
    held-out rows; those that carry it are set to -1.
    """
    for number in range(k):
        for _ in range(basis.shape[1]):
            held = np.flatnonzero(fold == number)
            values, vectors = np.linalg.eigh(basis[held].T @ basis[held])
            if values[-1] < 1 - LOST:
                break
            share = (basis[held] @ vectors[:, -1]) ** 2
            fold[held[share > 1e-6 * share.max()]] = -1


def _sorted_rows(rows: Rows) -> Ints:
    """Row positions sorted by x, then y, then every covariate column; columns are compared only where rows tie."""
    order = np.argsort(rows.x, kind="stable")
    if (np.diff(rows.x[order]) > 0).all():
        return order
    columns = [rows.base[:, j] for j in range(rows.base.shape[1])]
    columns += [rows.modifier[:, j] for j in range(rows.modifier.shape[1])]
    return np.lexsort([*reversed(columns), rows.y, rows.x])


def _units(rows: Rows, order: Ints) -> Ints:
    """For the sorted rows, the number of the unit that is dealt as one: identical rows, or a whole cluster."""
    if rows.cluster is not None:
        cluster = rows.cluster[order]
        _, first = np.unique(cluster, return_index=True)
        place = np.empty(int(cluster.max()) + 1, dtype=np.intp)
        place[cluster[np.sort(first)]] = np.arange(len(first))
        return np.asarray(place[cluster])
    same = np.ones(len(order) - 1, dtype=bool)
    for column in _columns(rows):
        same &= column[order[1:]] == column[order[:-1]]
        if not same.any():
            break
    return np.concatenate([[0], np.cumsum(~same)])


def _columns(rows: Rows) -> list[Array]:
    return [rows.x, rows.y, *rows.base.T, *rows.modifier.T]
