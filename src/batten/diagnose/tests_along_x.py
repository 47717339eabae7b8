"""Curvature read along the predictor or from the middle of the rows outwards, without naming a shape.

Both tests are made so that the order in which rows are stored cannot move them: general libraries' versions follow the
stored order, and their p-values change when the rows are shuffled.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy import stats
from scipy.linalg import solve_triangular

from batten.diagnose.repeats import repeat_groups
from batten.diagnose.span import basis, leverages, outside, whitened
from batten.engine.rows import Array

__all__ = ["HarveyCollier", "Rainbow", "harvey_collier", "rainbow", "recursive_residuals"]

#: most rows predicted at once; a block's errors are decorrelated by a Cholesky factor, which is the recursion
BLOCK = 64
#: rows that reach farther than this beyond those before are predicted one by one: of several the squares would drown
FAR = 1e4
#: a row (of an orthonormal design) this close to the rows before it adds no direction; its residual is then a contrast
#: with the same law, since what is neglected is rounding
NEW = 1e-12


@dataclass(frozen=True, eq=False)
class HarveyCollier:
    """mean: average recursive residual along x, units of z; above zero where the curve turns up. residuals (m - p,)."""

    statistic: float
    df: int
    p: float
    mean: float
    residuals: Array


@dataclass(frozen=True)
class Rainbow:
    """rows: how many central rows. sd_all, sd_centre: residual SD of the fit to all rows and to those, units of z."""

    statistic: float
    df: tuple[int, int]
    p: float
    rows: int
    sd_all: float
    sd_centre: float


def harvey_collier(X: Array, z: Array, *, along: Array, weights: Array | None = None) -> HarveyCollier | None:
    """t test that the recursive residuals along the focal predictor average zero (Harvey and Collier 1977).

    Use against a curve that is convex or concave throughout; blind to S shapes. Works for any number of columns of
    X (n, p). Departure: repeats of a whole row enter as their mean, and their spread enters the SD only, since in the
    original the answer would depend on which repeat is stored first; df n - p - 1 and exactness under normal errors
    stay. Rows that share a value of `along` (n,) are ordered by their other columns. None when fewer than two recursive
    residuals exist. Some ten seconds for a million rows on an idle machine: a sample serves as well.
    """
    w = np.ones(len(z)) if weights is None else weights
    groups = repeat_groups(np.column_stack([along, X]))
    total = np.bincount(groups, w)
    means = np.bincount(groups, w * z) / total
    first = np.unique(groups, return_index=True)[1]
    root = np.sqrt(total)
    found = recursive_residuals(X[first] * root[:, None], means * root)
    count, within = len(found), float(w @ (z - means[groups]) ** 2)
    if count < 2:
        return None
    df = count + len(z) - len(total) - 1
    mean = float(found.mean())
    sd = float(np.sqrt((np.sum((found - mean) ** 2) + within) / df))
    if sd <= 1e-12 * float(np.sqrt(np.mean(z**2))):
        return None
    t = mean / (sd / count**0.5)
    return HarveyCollier(t, df, float(2 * stats.t.sf(abs(t), df)), mean, found)


def rainbow(X: Array, z: Array, *, weights: Array | None = None) -> Rainbow | None:
    """F test of the fit to all rows against the fit to the half with the lowest leverage (Utts 1982).

    Use against any curve that is nearly straight in the middle of the data. Rows tied with the last of the central half
    belong to it. None when the centre has no degrees of freedom, or every row is central.
    """
    X, z = whitened(weights, X, z)
    Q = basis(X)
    h = leverages(Q)
    half = (len(z) + 1) // 2
    central = h <= np.partition(h, half - 1)[half - 1] * (1 + 1e-9)
    inner = basis(Q[central])
    rss, rss_centre = float(np.sum(outside(Q, z) ** 2)), float(np.sum(outside(inner, z[central]) ** 2))
    df_all, df_centre = len(z) - Q.shape[1], int(central.sum()) - inner.shape[1]
    if df_centre < 1 or df_all <= df_centre or rss_centre <= 1e-24 * float(z @ z):
        return None
    df = df_all - df_centre, df_centre
    f = ((rss - rss_centre) / df[0]) / (rss_centre / df[1])
    sds = float(np.sqrt(rss / df_all)), float(np.sqrt(rss_centre / df_centre))
    return Rainbow(f, df, float(stats.f.sf(f, *df)), int(central.sum()), *sds)


def recursive_residuals(X: Array, z: Array) -> Array:
    """Recursive residuals (n - rank,) of z (n,) on X (n, p), rows in the order given (Brown, Durbin and Evans 1975).

    w_r = (z_r - x_r'b) / sqrt(1 + x_r'(X'X)^-1 x_r) with b and X from the rows before r. A row that brings a new
    direction (the first p rows; later the first row of a new category) fixes a coefficient and has no residual; so
    there are n - rank of them, uncorrelated, and their squares sum to the residual sum of squares.
    """
    Q = basis(X)
    p = Q.shape[1]
    found: list[Array] = []
    axes = np.empty((p, 0))  # directions met so far
    seen = np.empty((0, 1))  # triangle of [rows met so far in those directions | z]
    for new, start, stop in _stretches(Q):
        axes = np.column_stack([axes, new])
        row = np.append(Q[start - 1] @ axes, z[start - 1])
        seen = _triangle(np.insert(seen, -1, 0.0, axis=1), row)
        at = start
        while at < stop:
            # blocks grow with what is known: predicted far ahead of a few rows, the unit error would drown in rounding
            end = min(stop, at + max(1, min(BLOCK, at // 2)))
            rows = np.column_stack([Q[at:end] @ axes, z[at:end]])
            if end > at + 1 and np.abs(_reach(seen, rows)).max() > FAR:
                end, rows = at + 1, rows[:1]
            found.append(_predicted(seen, rows))
            seen = _triangle(seen, rows)
            at = end
    return np.concatenate(found) if found else np.empty(0)


def _stretches(Q: Array) -> Iterator[tuple[Array, int, int]]:
    """(unit vector of a new direction, index after the row that brings it, end of the rows before the next)."""
    axes = np.empty((Q.shape[1], 0))
    at = _first_new(Q, 0)
    while at < len(Q):
        # a short leftover holds rounding along the axes already met; the second projection clears it
        new = outside(axes, outside(axes, Q[at]) / np.linalg.norm(outside(axes, Q[at])))
        axes = np.column_stack([axes, new / np.linalg.norm(new)])
        after = _first_new(outside(axes, Q.T).T, at + 1) if axes.shape[1] < Q.shape[1] else len(Q)
        yield axes[:, -1], at + 1, after
        at = after


def _triangle(seen: Array, rows: Array) -> Array:
    return np.asarray(np.linalg.qr(np.vstack([seen, rows]), mode="r"))


def _first_new(left: Array, start: int) -> int:
    big = np.flatnonzero(np.linalg.norm(left[start:], axis=1) > NEW)
    return start + int(big[0]) if len(big) else len(left)


def _reach(seen: Array, rows: Array) -> Array:
    """How far each row lies beyond those before it (b, k): its weights on the triangle's rows."""
    k = rows.shape[1] - 1
    return np.asarray(solve_triangular(seen[:k, :k], rows[:, :k].T, trans="T").T)


def _predicted(seen: Array, rows: Array) -> Array:
    """Recursive residuals of a block of rows [x | z] after a triangle [R u; 0 s]."""
    k = rows.shape[1] - 1
    u, reach = seen[:k, k], _reach(seen, rows)
    errors = rows[:, k] - reach @ u
    return np.asarray(solve_triangular(np.linalg.cholesky(np.eye(len(rows)) + reach @ reach.T), errors, lower=True))
