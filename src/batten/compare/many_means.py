"""Held-out scores of mean models at many rows: scoring steps from the fit to all rows for every training set."""

from __future__ import annotations

import numpy as np

from batten.compare.losses import losses
from batten.compare.many import Folded
from batten.compare.result import HeldOut, inverse_or_none, rank_lost, unsafe
from batten.engine.left_out import LeftOut
from batten.engine.linear import design
from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families.base import Link
from batten.fit.estimate import Estimate

__all__ = ["score_mean_model"]

#: up to this many rows a training set takes a second step; beyond, the first leaves less than a ten-millionth undone
SECOND_STEP_ROWS = 200_000
#: half the step of slopes along the linear predictor
SLOPE = 1e-4


def score_mean_model(est: Estimate, folded: Folded) -> HeldOut | Refusal:
    """Losses of a mean model whose columns are the same in every training set.

    The step of a training set is -(A'WA - A_k'W_kA_k)^-1 A_k's_k, s the held-out rows' part of the score and W its
    slope: at n rows it is of order 1 / sqrt(n), and what it leaves undone of order 1 / n.
    """
    rows, link, p = folded.rows, est.link, len(est.coef)
    assert isinstance(link, Link)
    columns = est.shape.columns(rows.x, est.state, est.theta)
    a = design(rows, columns, own_level=est.shape.own_level) @ est.factored.root[:p, :p]
    eta = est.eta[folded.order]
    score = _score(link, rows, eta)
    # the observed slope: with the expected one a mean that is not quite right would leave a part of order 1 / sqrt(n)
    weight = (_score(link, rows, eta - SLOPE) - _score(link, rows, eta + SLOPE)) / (2 * SLOPE)
    whole = a.T @ (a * weight[:, None])
    d = np.empty((len(folded.held), p))
    for k, held in enumerate(folded.held):
        inverse = inverse_or_none(whole - a[held].T @ (a[held] * weight[held, None]))
        if inverse is None:
            return rank_lost(est.shape.key)
        d[k] = -inverse @ (a[held].T @ score[held])
        if rows.count <= SECOND_STEP_ROWS:
            left = _score(link, rows, eta + a @ d[k])
            left[held] = 0.0
            d[k] += inverse @ (a.T @ left)
    with np.errstate(all="ignore"):
        middles = _middles(est, folded, a, eta, d)
    out = np.empty((3, len(d)))
    for k, held in enumerate(folded.held):
        own = link.mean(eta[held] + a[held] @ d[k])
        if not np.isfinite(own).all() or not np.isfinite(middles[k]):
            return unsafe(est)
        out[:, k] = losses(rows.y[held], own, own * middles[k], rows.weights, held)
    return HeldOut(out[0], out[1], out[2], None, np.diff(folded.starts))


def _score(link: Link, rows: Rows, eta: Array) -> Array:
    """Each row's part of the score along eta (n,)."""
    mu = link.mean(eta)
    part = link.mean_slope(eta) / link.variance(mu) * (rows.y - mu)
    return part if rows.weights is None else part * rows.weights


def _middles(est: Estimate, folded: Folded, a: Array, eta: Array, d: Array) -> Array:
    """Median ratio of y to its mean in every training set (K,), those of rows of average weight."""
    rows, link = folded.rows, est.link
    assert isinstance(link, Link)
    if link.multiplies and link.reading == "ratio" and rows.weights is None:
        length = np.einsum("ij,ij->i", a, a)
        ratios = LeftOut(np.log(rows.y) - eta, a, d, folded.starts, length)
        return np.asarray(np.exp(ratios.middles).mean(axis=1))
    out = np.empty(len(d))
    for k, held in enumerate(folded.held):
        ratio = 1 + rows.root_weight * (rows.y / link.mean(eta + a @ d[k]) - 1)
        out[k] = np.median(np.delete(ratio, held))
    return out
