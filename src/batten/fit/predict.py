"""Predictions in units of y: means, medians, intervals for the estimate, for a new row and for a total."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.stats import t as student

from batten.engine.rows import Array
from batten.families.base import Link
from batten.fit.averaged import Averaged, interval
from batten.fit.estimate import Estimate
from batten.fit.means import means_at_rows
from batten.fit.smear import row_means

__all__ = ["Prediction", "Total", "new_row_interval", "positive_by_nature", "predict", "rows_needed", "total"]

#: rows predicted at once while every deletion is held
CHUNK = 256
#: beyond this many rows a left-out row no longer moves the fit visibly
DELETIONS_ROWS = 3_000


@dataclass(frozen=True, eq=False)
class Prediction:
    """estimate, low, high (k,) in units of y; NaN where the scale cannot be undone. note: one text per row."""

    estimate: Array
    low: Array
    high: Array
    note: tuple[str, ...]


def predict(
    est: Estimate,
    x: Array,
    base: Array,
    modifier: Array,
    *,
    of: str = "mean",
    kind: str | None = None,
    level: float = 0.95,
    errors: str = "robust",
    weight: Array | None = None,
) -> Prediction:
    """Predict k complete rows: x (k,), base (k, q), modifier (k, m).

    kind: None, "estimate" (interval for the mean or median itself) or "new row" (for one further row). weight (k,): of
    the further rows, as a multiple of the average weight; 1 when None. Means are those of a row of average weight.
    """
    k = len(x)
    value, low, high = np.empty(k), np.full(k, np.nan), np.full(k, np.nan)
    for start in range(0, k, CHUNK):
        some = slice(start, min(k, start + CHUNK))
        part = x[some], base[some], modifier[some]
        averaged = means_at_rows(est, *part, of=of, errors=errors, root=kind == "estimate")
        value[some] = averaged.value
        if kind == "estimate":
            low[some], high[some] = interval(averaged, level, positive=positive_by_nature(est, averaged))
        elif kind == "new row":
            low[some], high[some] = new_row_interval(
                est, *part, level=level, errors=errors, weight=None if weight is None else weight[some]
            )
    notes = [""] * k
    eta = est.design_at(x, base, modifier) @ est.coef
    if isinstance(est.remedy.left, Link):
        return Prediction(value, low, high, tuple(notes))
    bottom, top = est.scale.limits(est.c)
    bad = (eta <= bottom) | (eta >= top)
    for i in np.flatnonzero(bad):
        notes[i] = f"outside what {est.scale.key} can undo"
    for column in (value, low, high):
        column[bad] = np.nan
    return Prediction(value, low, high, tuple(notes))


def positive_by_nature(est: Estimate, averaged: Averaged) -> bool:
    """Whether the mean is positive by construction, so that its interval is taken on the log scale."""
    if isinstance(est.remedy.left, Link):
        return est.remedy.left.reading == "ratio"
    return est.scale.closed != "identity" and bool((est.rows.y > 0).all()) and bool((averaged.value > 0).all())


def rows_needed(level: float) -> int:
    """Smallest n for which the rows' own residuals can give an interval at this level, each tail by itself."""
    return int(np.ceil(2 / (1 - level) - 1 - 1e-9))


def new_row_interval(
    est: Estimate, x: Array, base: Array, modifier: Array, *, level: float, errors: str, weight: Array | None = None
) -> tuple[Array, Array]:
    """Interval for one further row at each of k places, in units of y; with clusters, a row from a new cluster.

    weight (k,): of the further rows, as a multiple of the average weight; 1 when None.
    Robust errors: jackknife+ with each tail by itself (Barber, Candes, Ramdas and Tibshirani 2021, signed), no normal
    shape assumed; constant errors, or too few rows for the level: the t interval on the fitting scale. Ends are mapped
    by the inverse, which keeps their coverage.
    """
    j = est.jacobian_at(x, base, modifier)
    root = est.further_root(j[:, : len(est.coef)], weight)
    if isinstance(est.remedy.left, Link):
        return _link_interval(est, j, root, level=level)
    eta = j[:, : len(est.coef)] @ est.coef
    if errors == "robust" and est.n >= rows_needed(level):
        low, high = _from_deletions(est, j, eta, root, level=level)
    else:
        kept = j[:, :-1] if est.remedy.left.searched else j
        v = np.einsum("kp,kp->k", kept @ est.factored.inverse_cross, kept) * est.sigma**2
        half = float(student.ppf(0.5 + level / 2, est.df_residual)) * np.sqrt(est.sigma**2 / root**2 + v)
        low, high = eta - half, eta + half
    ends = est.scale.inverse(low, est.c), est.scale.inverse(high, est.c)
    return np.minimum(*ends), np.maximum(*ends)


def _from_deletions(est: Estimate, j: Array, centre: Array, root: Array, *, level: float) -> tuple[Array, Array]:
    """Ordered values of centre without row i plus row i's own left-out residual over root (k,) = sqrt(weight)."""
    spread, n = est.left_out_residual, est.n
    tail = (1 - level) / 2
    first = int(np.floor(tail * (n + 1) + 1e-9)) - 1
    last = n - 1 - first
    if n > DELETIONS_ROWS:
        ordered = np.partition(spread, [first, last])
        return centre + ordered[first] / root, centre + ordered[last] / root
    values = np.partition(centre + est.row_moves() @ j.T + spread[:, None] / root, [first, last], axis=0)
    return values[first], values[last]


def _link_interval(est: Estimate, j: Array, root: Array, *, level: float) -> tuple[Array, Array]:
    """The same for a link: left-out ratios y/mu for the log link, left-out differences for a share (kept in 0..1)."""
    link, n = est.remedy.left, est.n
    assert isinstance(link, Link)
    level = min(level, 1 - 2 / (n + 1))
    eta = j[:, : len(est.coef)] @ est.coef
    moves = est.row_moves()
    own = link.mean(est.eta + np.einsum("np,np->n", moves, est.residual_jacobian))
    first = int(np.floor((1 - level) / 2 * (n + 1) + 1e-9)) - 1
    last = n - 1 - first
    centre = link.mean(eta + moves @ j.T) if n <= DELETIONS_ROWS else link.mean(eta)[None]
    between = root / est.rows.root_weight[:, None]
    values = further_values(est, centre, own[:, None], est.rows.y[:, None], between)
    ordered = np.partition(values, [first, last], axis=0)
    return ordered[first], ordered[last]


def further_values(est: Estimate, centre: Array, own: Array, y: Array, root: Array) -> Array:
    """A link's further values at means `centre`, with the errors that values y had about their left-out means `own`.

    root: sqrt(weight) of the further row over that of the row whose error it takes.
    """
    link = est.remedy.left
    assert isinstance(link, Link)
    if link.reading == "ratio":
        return np.asarray(centre * np.maximum(1 + (y / own - 1) / root, 0.0))
    return np.clip(centre + (y - own) / root, 0.0, 1.0)


@dataclass(frozen=True)
class Total:
    """Sum of k rows' means with an interval that counts shared error and row error; units of y."""

    estimate: float
    low: float
    high: float
    shared_error: float
    row_error: float


def total(
    est: Estimate,
    x: Array,
    base: Array,
    modifier: Array,
    *,
    level: float = 0.95,
    errors: str = "robust",
    amount: Array | None = None,
    weight: Array | None = None,
) -> Total:
    """Total of k further rows. Shared error: the fit is the same for all. Row error: each row's own spread.

    amount (k,): what each row's mean counts times (its exposure); 1 when None. weight (k,): as for `predict`.
    """
    amount = np.ones(len(x)) if amount is None else amount
    value, shared, root = 0.0, 0.0, None
    for start in range(0, len(x), CHUNK):
        some = slice(start, start + CHUNK)
        averaged = means_at_rows(est, x[some], base[some], modifier[some], errors=errors)
        summed = averaged.root @ amount[some]
        root = summed if root is None else root + summed
        value += float(averaged.value @ amount[some])
    if root is not None:
        shared = float(root @ root)
    design = est.design_at(x, base, modifier)
    own = float((_row_variance(est, design @ est.coef) * (amount / est.further_root(design, weight)) ** 2).sum())
    half = float(student.ppf(0.5 + level / 2, est.df_error)) * float(np.sqrt(shared + own))
    return Total(value, value - half, value + half, float(np.sqrt(shared)), float(np.sqrt(own)))


def _row_variance(est: Estimate, eta: Array) -> Array:
    """Variance of a further y, of average weight, about its mean at each linear predictor (k,)."""
    if isinstance(est.remedy.left, Link):
        return np.asarray(est.sigma**2 * est.remedy.left.variance(est.remedy.left.mean(eta)))
    if est.scale.closed == "identity":
        return np.full(len(eta), est.sigma**2)
    # residuals are inflated so that their mean square is sigma^2 rather than RSS/n
    e = est.residual * np.sqrt(est.n / est.df_residual)
    first = row_means(lambda z: est.scale.inverse(z, est.c), eta, e)
    return np.asarray(row_means(lambda z: est.scale.inverse(z, est.c) ** 2, eta, e) - first**2)
