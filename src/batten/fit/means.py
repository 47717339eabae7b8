"""Means in units of y along the focal predictor, averaged over the rows' covariates, with their uncertainty.

One routine serves curves, spans, slopes and totals of every remedy. A remedy's numbers are seen as a functional T of
the rows: it depends on the parameters, on the residuals that are averaged over, and on the covariates that are averaged
over. Leaving row i out changes all three (jackknife, up to 3,000 rows); to first order the change is row i's influence
(beyond, and wherever many curves are compared).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from batten.engine.clusters import Clusters
from batten.engine.rows import Array, Ints
from batten.families.base import Constants
from batten.fit.averaged import Averaged, jackknife_root
from batten.fit.estimate import Estimate
from batten.fit.medians import middle
from batten.fit.own_scale import OwnScale, on_own_scale
from batten.fit.smear import mean_of, shares_of_residuals

__all__ = [
    "BLOCK", "Target", "averaged_means", "by_replicate", "jackknifed", "means_at_rows", "pattern_weights", "patterns",
    "target", "with_errors",
]  # fmt: skip

#: up to this many rows intervals of retransformed means leave out each row in turn
JACKKNIFE_ROWS = 3_000
#: the same where the scale has no closed form for its mean
JACKKNIFE_GENERAL = 1_000
#: numbers held at once while replicates are averaged
BLOCK = 3_000_000
#: up to this many covariate patterns a row is described by which of them it has
FEW_PATTERNS = 12

#: row i's share (n, G), or (features (n, r), loads (r, G)) whose product it is
Share = Array | tuple[Array, Array]


@dataclass(frozen=True, eq=False)
class Target:
    """What is averaged: for every value g, the design of its covariate rows.

    eta (u, G), jacobian (G, u, P): linear predictor and its change with the parameters, for u covariate patterns.
    count (u,): rows of each pattern. pattern (n,): each row's pattern, or None when the patterns are not the rows' own.
    """

    eta: Array
    jacobian: Array
    count: Array
    pattern: Ints | None


def target(est: Estimate, xs: Array, *, base: Array | None = None, modifier: Array | None = None) -> Target:
    """Covariate patterns at each x of xs (G,): the rows' own unless base (u, q) and modifier (u, m) are given."""
    if base is None or modifier is None:
        base, modifier, count, pattern = patterns(est)
    else:
        count, pattern = np.ones(len(base)), None
    u, places = len(base), len(xs)
    every = np.repeat(np.asarray(xs, dtype=float), u)
    j = est.jacobian_at(every, np.tile(base, (places, 1)), np.tile(modifier, (places, 1)))
    eta = (j[:, : len(est.coef)] @ est.coef).reshape(places, u).T
    return Target(eta, j.reshape(places, u, -1), count, pattern)


def patterns(est: Estimate) -> tuple[Array, Array, Array, Ints]:
    """Distinct covariate rows: base (u, q), modifier (u, m), count (u,), pattern of each row (n,)."""
    first, count, pattern = est.rows.patterns
    return est.rows.base[first], est.rows.modifier[first], count, pattern


def averaged_means(
    est: Estimate,
    xs: Array,
    *,
    of: str = "mean",
    base: Array | None = None,
    modifier: Array | None = None,
    errors: str = "robust",
    jackknife: bool = True,
    weights: Array | None = None,
    root: bool = True,
    rows: Ints | None = None,
) -> Averaged:
    """Mean (or "median") of y at each x of xs (G,), averaged over covariate rows.

    base (u, q), modifier (u, m): covariate rows to average over instead of the rows' own, taken as fixed.
    weights (u,): their weights, summing to one; equal when None. root=False leaves the uncertainty out.
    rows: have the uncertainty from these rows alone, an even part of all (clusters count in full).
    """
    tar = target(est, np.asarray(xs, dtype=float), base=base, modifier=modifier)
    share = tar.count / tar.count.sum() if weights is None else weights
    if not root:
        return _plain(est, tar, share, of)
    return _with_errors(est, tar, share, of, errors=errors, jackknife=jackknife, rows=rows)


def means_at_rows(
    est: Estimate,
    x: Array,
    base: Array,
    modifier: Array,
    *,
    of: str = "mean",
    errors: str = "robust",
    root: bool = True,
) -> Averaged:
    """Mean (or "median") of y at each of k rows, x (k,), base (k, q), modifier (k, m), not averaged over anything.

    root=False leaves the uncertainty out.
    """
    j = est.jacobian_at(x, base, modifier)
    eta = (j[:, : len(est.coef)] @ est.coef)[None]
    tar, share = Target(eta, j[:, None, :], np.ones(1), None), np.ones(1)
    if not root:
        return _plain(est, tar, share, of)
    return _with_errors(est, tar, share, of, errors=errors)


def _plain(est: Estimate, tar: Target, share: Array, of: str) -> Averaged:
    """Values without their uncertainty."""
    value = _values(est, tar, share, of, np.zeros((1, tar.jacobian.shape[2])), None)[0]
    return Averaged(value, np.empty((0, len(value))), None, est.df_error)


def _with_errors(
    est: Estimate,
    tar: Target,
    share: Array,
    of: str,
    *,
    errors: str,
    jackknife: bool = True,
    rows: Ints | None = None,
) -> Averaged:
    if rows is not None and est.clusters is None:
        return _from_part(est, tar, share, of, errors=errors, rows=rows)

    def values(move: Array, keep: Array | None) -> Array:
        return _values(est, tar, share, of, move, keep)

    def own_shares(value: Array) -> list[Share]:
        return [part for part in _direct_parts(est, tar, share, of, value) if part is not None]

    return with_errors(
        est, values, own_shares, parameters=tar.jacobian.shape[2], of=of, errors=errors, jackknife=jackknife
    )


def _from_part(est: Estimate, tar: Target, share: Array, of: str, *, errors: str, rows: Ints) -> Averaged:
    """Values from all rows, their uncertainty from an even part of them, shrunk to stand for all."""
    pattern = None if tar.pattern is None else tar.pattern[rows]
    some = _with_errors(est.part(rows), replace(tar, pattern=pattern), share, of, errors=errors, jackknife=False)
    value, shrink = _plain(est, tar, share, of).value, np.sqrt(len(rows) / est.n)
    bias = None if some.bias is None else some.bias * shrink
    return replace(some, value=value, loads=some.loads * shrink, df=est.df_error, bias=bias)


def with_errors(
    est: Estimate,
    values: Callable[[Array, Array | None], Array],
    own_shares: Callable[[Array], list[Share]],
    *,
    parameters: int,
    of: str,
    errors: str,
    jackknife: bool = True,
) -> Averaged:
    """A functional of the rows with its uncertainty.

    values(move (R, P), keep (R, n) or None) -> (R, G): the functional when the parameters have moved and row j counts
    keep times. own_shares(value (G,)) -> arrays (n, G): row i's share in each average it enters, minus the value,
    or (features (n, r), loads (r, G)) whose product that is.
    """
    value = values(np.zeros((1, parameters)), None)[0]
    if errors == "robust" and jackknife and jackknifed(est, of):
        left = values(est.moves(), _kept(est))
        # a mean that is infinite without one row has no error
        left = np.where(np.isfinite(left), left, np.nan)
        bias = None if est.roughness is None else _along(values, est.bias_moves)
        return Averaged(value, jackknife_root(left), left, est.df_error, bias=bias)
    moves = est.moves() * est.few_clusters
    gradient = _gradient(values, moves)
    shares = own_shares(value)
    if est.clusters is not None:
        shares = [_summed(part, est.clusters) for part in shares]
    if errors == "constant":
        root = np.linalg.cholesky(est.covariance("constant")).T @ gradient
        parts = [_whole(part) / est.n for part in shares]
        return Averaged(value, np.vstack([root, *parts]), None, est.df_error)
    # moves are what leaving a row out does; its influence points the other way
    features, loads = [moves], [-gradient]
    for part in shares:
        feature, load = part if isinstance(part, tuple) else (part, np.eye(len(value)))
        features.append(feature)
        loads.append(load / est.n)
    bias = None if est.roughness is None else est.bias_moves @ gradient
    return Averaged(value, np.vstack(loads), None, est.df_error, tuple(features), bias)


def _along(values: Callable[[Array, Array | None], Array], moves: Array) -> Array:
    """How far each move (R, P) takes the values to first order, by central differences: (R, G)."""
    return np.asarray((values(1e-3 * moves, None) - values(-1e-3 * moves, None)) / 2e-3)


def _kept(est: Estimate) -> Array:
    """How often each row counts when a row, or a cluster, is left out in turn: (n, n) or (G, n)."""
    if est.rows.cluster is None:
        return 1.0 - np.eye(est.n)
    units = np.arange(int(est.rows.cluster.max()) + 1)
    return np.where(est.rows.cluster == units[:, None], 0.0, 1.0)


def _summed(part: Share, clusters: Clusters) -> Share:
    """Shares of clusters from those of their rows, with the factor G / (G - 1) of few clusters in the variance."""
    few = float(np.sqrt(clusters.count / (clusters.count - 1)))
    if isinstance(part, tuple):
        return clusters.sums(part[0]) * few, part[1]
    return clusters.sums(part) * few


def _whole(part: Share) -> Array:
    return part[0] @ part[1] if isinstance(part, tuple) else part


def jackknifed(est: Estimate, of: str = "mean") -> bool:
    """Whether intervals of this estimate leave out each row in turn.

    A mean that is linear in the coefficients does not: its error is that of the coefficients (HC3), so that a straight
    line's span effect and its coefficient carry the same interval.
    """
    if of == "median":  # see medians.py
        return False
    if not est.theta and est.link is None and est.scale.closed == "identity":
        return False
    closed = est.link is not None or est.scale.closed != ""
    return est.n <= (JACKKNIFE_ROWS if closed else JACKKNIFE_GENERAL)


def _gradient(values: Callable[[Array, Array | None], Array], moves: Array) -> Array:
    """d values / d parameters (P, G), by central differences a small part of each parameter's own error wide."""
    width = 1e-4 * np.sqrt(np.maximum((moves**2).sum(axis=0), 1e-300))
    steps = np.diag(width)
    both = values(np.vstack([steps, -steps]), None)
    return np.asarray((both[: len(steps)] - both[len(steps) :]) / (2 * width[:, None]))


def _values(est: Estimate, tar: Target, share: Array, of: str, move: Array, keep: Array | None) -> Array:
    """Averaged values (R, G) when the parameters have moved by move (R, P) and residual j counts keep (R, n) times."""
    if of == "mean" and keep is None and est.link is None and est.scale.closed == "identity":
        return np.asarray(share @ tar.eta + move @ np.einsum("gup,u->pg", tar.jacobian, share))
    count, (u, places) = len(move), tar.eta.shape
    out = np.empty((count, places))
    block = max(1, BLOCK // max(est.n, u * places))
    for start in range(0, count, block):
        some = slice(start, min(count, start + block))
        out[some] = _block_values(est, tar, share, of, move[some], None if keep is None else keep[some])
    return out


def _block_values(est: Estimate, tar: Target, share: Array, of: str, move: Array, keep: Array | None) -> Array:
    weights = pattern_weights(tar.pattern, share, keep)
    u, places = tar.eta.shape
    eta = tar.eta.T.reshape(-1) + move @ tar.jacobian.reshape(places * u, -1).T
    back = _bring_back(est, of, move, keep)(eta).reshape(len(move), places, u)
    return np.asarray(back @ weights if weights.ndim == 1 else np.einsum("rgu,ru->rg", back, weights))


def pattern_weights(pattern: Ints | None, share: Array, keep: Array | None) -> Array:
    """Weights of the covariate patterns in each replicate: (u,) or (R, u), summing to one."""
    if keep is None or pattern is None or len(share) == 1:
        return share
    u = len(share)
    counts = np.stack([np.bincount(pattern, k, u) for k in keep]) if u < keep.shape[1] else keep[:, np.argsort(pattern)]
    return np.asarray(counts / counts.sum(axis=1, keepdims=True))


def _bring_back(est: Estimate, of: str, move: Array, keep: Array | None) -> Callable[[Array], Array]:
    """The map from linear predictors (R, u) to units of y under each replicate's residuals."""
    if est.link is not None:
        link = est.link
        if of == "mean":
            return link.mean
        factor = middle(est).moved(move)[:, None]
        return lambda eta: link.mean(eta) * factor
    scale = est.scale
    if of == "mean" and scale.closed == "identity":
        return lambda eta: eta
    own = on_own_scale(est, move)
    if of == "mean":
        residual = own.residual(est.residual - move @ est.residual_jacobian.T)
        return lambda eta: mean_of(scale, own.c, own.eta(eta), residual, keep)
    shift = middle(est).moved(move)[:, None]
    return lambda eta: by_replicate(scale.inverse, own, own.eta(eta + shift))


def by_replicate(undo: Callable[[Array, Constants], Array], own: OwnScale, eta: Array) -> Array:
    """The scale's inverse (or its slope) at (R, k), each replicate with its own constants."""
    if all(c == own.c[0] for c in own.c):
        return undo(eta, own.c[0])
    return np.stack([undo(row, c) for row, c in zip(eta, own.c, strict=True)])


def _direct_parts(est: Estimate, tar: Target, share: Array, of: str, value: Array) -> tuple[Share | None, Share | None]:
    """Row i's own share in the average over residuals and in the average over covariates, minus the value."""
    by_residual: Share | None = None
    if of == "median":
        by_residual = middle(est).influence[:, None], _lean(est, tar, share)[None]
    elif est.link is None and est.scale.closed != "identity":
        by_residual = _residual_part(est, tar, share, value)
    by_covariate: Share | None = None
    if tar.pattern is not None and len(share) > 1:
        still = _bring_back(est, of, np.zeros((1, tar.jacobian.shape[2])), None)
        back = still(tar.eta.reshape(1, -1)).reshape(tar.eta.shape) - value
        few = len(share) <= FEW_PATTERNS
        by_covariate = ((tar.pattern[:, None] == np.arange(len(share))) + 0.0, back) if few else back[tar.pattern]
    return by_residual, by_covariate


def _lean(est: Estimate, tar: Target, share: Array) -> Array:
    """Change of each median with the middle of the residuals (G,)."""
    if est.link is not None:
        return np.asarray(share @ est.link.mean(tar.eta))
    return np.asarray(share @ est.scale.inverse_slope(tar.eta + middle(est).value, est.c))


def _residual_part(est: Estimate, tar: Target, share: Array, value: Array) -> Share:
    e = est.residual
    if est.scale.closed == "exp":
        each = np.column_stack([np.exp(e), np.ones(len(e))])
        return each, np.vstack([share @ np.exp(tar.eta), -value])
    features, loads = shares_of_residuals(lambda z: est.scale.inverse(z, est.c), e, tar.eta, share)
    loads[0] -= value  # the first polynomial is one
    return features, loads
