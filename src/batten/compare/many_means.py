"""Held-out scores of mean models at many rows: a few scoring steps from the fit to all rows for every training set."""

from __future__ import annotations

import numpy as np

from batten.compare.losses import losses
from batten.compare.many import Folded
from batten.compare.result import HeldOut, fewer, inverse_or_none, rank_lost, unsafe
from batten.engine.left_out import LeftOut
from batten.engine.linear import design
from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families.base import Constants, Link
from batten.fit.estimate import Estimate

__all__ = ["score_mean_model"]

#: steps of a training set at most, and the share of its whole move that a last one may be
STEPS, SETTLED = 12, 1e-5
#: after this many steps the slope is taken anew
RENEWED = 3
#: half the step of slopes along the linear predictor
SLOPE = 1e-4


def score_mean_model(est: Estimate, folded: Folded, states: list[Constants]) -> HeldOut | Refusal | None:
    """Losses of a mean model with these constants of its shape in every training set; None where one does not settle.

    A training set's steps are (A'WA)^-1 A's over its rows, s each row's part of the score along the linear predictor
    and W the observed slope of s at the fit to all rows, the same in the first steps: with the expected slope a mean
    that is not quite right would converge slowly.
    """
    rows, link, p = folded.rows, est.link, len(est.coef)
    assert isinstance(link, Link)
    root = est.factored.root[:p, :p]
    begin = np.linalg.solve(root, est.coef)
    shared = all(state == est.state for state in states)
    a = eta = score = weight = whole = np.empty((0, 0))
    moves, out = [], np.empty((3, len(states)))
    for k, held in enumerate(folded.held):
        if not k or not shared:
            a = design(rows, est.shape.columns(rows.x, states[k], est.theta), own_level=est.shape.own_level)
            if a.shape[1] != p:
                return fewer(est.shape.key)
            a = a @ root
            eta = a @ begin
            score, weight = _score(link, rows, eta), _slope(link, rows, eta)
            whole = a.T @ (a * weight[:, None])
        inverse = inverse_or_none(whole - a[held].T @ (a[held] * weight[held, None]))
        if inverse is None:
            return rank_lost(est.shape.key)
        move = _moved(link, rows, a, eta, score, inverse, held)
        if move is None:
            return None
        moves.append(move)
        if not shared:
            out[:, k] = _losses(link, rows, eta + a @ move, held)
    if shared:
        out = _losses_together(link, folded, a, eta, np.stack(moves))
    if not np.isfinite(out).all():
        return unsafe(est)
    return HeldOut(out[0], out[1], out[2], None, np.diff(folded.starts))


def _losses(link: Link, rows: Rows, eta: Array, held: slice) -> Array:
    """Losses (3,) of one training set with linear predictors eta (n,)."""
    with np.errstate(all="ignore"):
        mu = link.mean(eta)
        ratio = 1 + rows.root_weight * (rows.y / mu - 1)
    return losses(rows.y[held], mu[held], mu[held] * float(np.median(np.delete(ratio, held))), rows.weights, held)


def _losses_together(link: Link, folded: Folded, a: Array, eta: Array, moves: Array) -> Array:
    """Losses (3, K) of training sets whose linear predictors are eta + a move."""
    rows, held = folded.rows, folded.held
    if not (link.multiplies and link.reading == "ratio") or rows.weights is not None:
        each = [_losses(link, rows, eta + a @ move, part) for part, move in zip(held, moves, strict=True)]
        return np.stack(each, axis=1)
    # under a log link the ratio of y to its mean is a residual on the log scale
    with np.errstate(divide="ignore"):
        logs = LeftOut(np.log(rows.y) - eta, a, moves, folded.starts, np.einsum("ij,ij->i", a, a))
    middles = np.exp(logs.middles).mean(axis=1)
    mean = [link.mean(eta[part] + a[part] @ move) for part, move in zip(held, moves, strict=True)]
    each = [losses(rows.y[part], mu, mu * m, None, part) for part, mu, m in zip(held, mean, middles, strict=True)]
    return np.stack(each, axis=1)


def _moved(link: Link, rows: Rows, a: Array, eta: Array, score: Array, inverse: Array, held: slice) -> Array | None:
    """How far one training set's coefficients of a (n, p) move from the linear predictor eta (n,); None where the steps
    do not become small."""
    move = inverse @ (score @ a - score[held] @ a[held])
    for turn in range(1, STEPS):
        at = eta + a @ move
        if turn % RENEWED == 0:  # far from the fit to all rows its slope is no good guide
            steep = a * _slope(link, rows, at)[:, None]
            renewed = inverse_or_none(a.T @ steep - a[held].T @ steep[held])
            inverse = inverse if renewed is None else renewed
        left = _score(link, rows, at)
        step = inverse @ (left @ a - left[held] @ a[held])
        move = move + step
        if np.abs(step).max() <= SETTLED * np.abs(move).max():
            return np.asarray(move)
    return None


def _score(link: Link, rows: Rows, eta: Array) -> Array:
    """Each row's part of the score along eta (n,)."""
    with np.errstate(all="ignore"):
        mu = link.mean(eta)
        part = link.mean_slope(eta) / link.variance(mu) * (rows.y - mu)
    return part if rows.weights is None else part * rows.weights


def _slope(link: Link, rows: Rows, eta: Array) -> Array:
    """How fast that part falls along eta (n,)."""
    return (_score(link, rows, eta - SLOPE) - _score(link, rows, eta + SLOPE)) / (2 * SLOPE)
