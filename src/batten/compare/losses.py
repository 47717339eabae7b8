"""What held-out rows lose: errors in units of y and log scores of fits made without them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import overload

import numpy as np
from scipy.special import gammaln

from batten.engine.folds import Splits
from batten.engine.rows import Array, Ints, Rows
from batten.families.base import Constants, Scale
from batten.fit.estimate import Estimate
from batten.fit.guard import reaches
from batten.fit.smear import mean_of

__all__ = ["LazySplits", "Split", "Trained", "log_t", "losses", "losses_together", "sound"]


@dataclass(frozen=True, eq=False)
class Split:
    """Training rows, held-out rows, and the training rows' x in rising order."""

    train: Ints
    test: Ints
    sorted_x: Array


class LazySplits(Sequence[Split]):
    """The splits of some rows, made when asked for: all of them at once would take many times the rows' memory."""

    def __init__(self, rows: Rows, splits: Splits) -> None:
        self._rows, self._splits = rows, splits
        # what a shape learns from x does not depend on the order of the rows, and is had faster from sorted ones
        self._order = np.argsort(rows.x, kind="stable")

    def __len__(self) -> int:
        return self._splits.count

    @overload
    def __getitem__(self, place: int) -> Split: ...
    @overload
    def __getitem__(self, place: slice) -> list[Split]: ...
    def __getitem__(self, place: int | slice) -> Split | list[Split]:
        if isinstance(place, slice):
            return [self[i] for i in range(*place.indices(len(self)))]
        if not 0 <= place < len(self):
            raise IndexError(place)
        held = self._splits.fold[place // self._splits.k] == place % self._splits.k
        sorted_x = self._rows.x[self._order[~held[self._order]]]
        return Split(np.flatnonzero(~held), np.flatnonzero(held), sorted_x)


@dataclass(frozen=True, eq=False)
class Trained:
    """One training set's fit: linear predictor of all rows times sqrt(w) (n,), the scale's constants, and
    v = w x0'(X'WX)^-1 x0 of the held-out rows."""

    eta: Array
    c: Constants
    v: Array
    columns: float


def losses_together(est: Estimate, sets: list[Split], fits: list[Trained]) -> Array | None:
    """Squared and absolute error, share within 10% and log score of sets of one size (4, S), or None where one of them
    has no finite mean."""
    scale, rows, y, root = est.scale, est.rows, est.rows.y, est.rows.root_weight
    train, test = np.stack([split.train for split in sets]), np.stack([split.test for split in sets])
    c = [fit.c for fit in fits]
    moved = any(constants != est.c for constants in c)
    z = np.stack([rows.weigh(scale.forward(y, constants)) for constants in c]) if moved else est.z[None]
    z = np.broadcast_to(z, (len(sets), est.n))
    every = np.stack([fit.eta for fit in fits])
    weighted = np.take_along_axis(every, test, axis=1)
    eta = weighted if rows.weights is None else weighted / root[test]
    residual = np.take_along_axis(z, train, axis=1) - np.take_along_axis(every, train, axis=1)
    if not sound(scale, c, eta, residual):
        return None
    middle = eta + np.median(residual, axis=1)[:, None]
    with np.errstate(all="ignore"):
        mean = mean_of(scale, c, eta, residual)
        median = np.stack([scale.inverse(row, k) for row, k in zip(middle, c, strict=True)])
    if not np.isfinite(mean).all():
        return None
    df = train.shape[1] - np.array([fit.columns for fit in fits])
    jacobian = np.stack([scale.log_jacobian(y[rows], k) for rows, k in zip(test, c, strict=True)])
    rss = (residual**2).sum(axis=1)
    score = log_t(np.take_along_axis(z, test, axis=1) - weighted, rss, np.stack([fit.v for fit in fits]), df)
    if rows.weights is not None:
        jacobian = jacobian + np.log(root[test])
    return np.vstack([losses(y[test], mean, median, rows.weights, test), (score + jacobian).mean(axis=1)])


def sound(scale: Scale, c: list[Constants], eta: Array, residual: Array) -> bool:
    """Whether every eta, and every pair eta + e, can be brought back in every set."""
    ends = zip(c, eta.min(axis=1), eta.max(axis=1), residual.min(axis=1), residual.max(axis=1), strict=True)
    return not any(reaches(scale, k, (low, high), (least, most)) for k, low, high, least, most in ends)


def losses(y: Array, mean: Array, median: Array, weights: Array | None, test: Ints | slice) -> Array:
    """Mean losses over the last axis of the held-out rows `test`: (..., n) -> (3, ...)."""
    squared, absolute, within = (y - mean) ** 2, np.abs(y - median), np.abs(y - mean) <= 0.1 * np.abs(y)
    if weights is not None:
        squared, absolute = squared * weights[test], absolute * np.sqrt(weights[test])
    return np.array([squared.mean(axis=-1), absolute.mean(axis=-1), within.mean(axis=-1)])


def log_t(error: Array, rss: Array, v: Array, df: Array) -> Array:
    """Log density of held-out z (S, n) under the t predictive distribution with estimated coefficients and variance.

    rss, df (S,): residual sum of squares of the training rows and its degrees of freedom.
    """
    d = df[:, None]
    variance = (rss / df)[:, None] * (1 + v)
    return np.asarray(
        gammaln((d + 1) / 2) - gammaln(d / 2) - 0.5 * np.log(d * np.pi * variance)
        - (d + 1) / 2 * np.log1p(error**2 / (variance * d))
    )  # fmt: skip
