"""Profiles of a shape's searched constants under a link: by the deviance, scaled by the Pearson spread.

The set where (D - D_min) / phi <= F, on 1 and the residual degrees of freedom (McCullagh and Nelder 1989, chapter 9, on
quasi-likelihoods).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from scipy.stats import f as fisher

from batten.engine.irls import Mean, iterate
from batten.engine.mean_search import search_mean
from batten.engine.rows import Array
from batten.engine.search import Searched
from batten.fit.estimate import Estimate
from batten.fit.searched import searched_model

__all__ = ["allowed_loss", "deviance_loss", "listed_losses"]

Without = Callable[[Searched, int, float], Searched]


def allowed_loss(est: Estimate, level: float) -> float:
    """How much scaled deviance, halved, may be lost inside the set."""
    return float(fisher.ppf(level, 1, est.df_residual)) / 2


def deviance_loss(est: Estimate, which: int, without: Without) -> Callable[[float, Estimate], float]:
    """Half the scaled deviance lost when constant `which` is held at a value, the others free; on the rows of `part`.

    without: the search with one constant held.
    """
    best: dict[int, float] = {}

    def deviance(part: Estimate, value: float | None) -> float:
        model, shape = _models(part)
        if value is None:
            return _at(part, model, shape, np.array(part.theta))
        if len(part.theta) == 1:
            return _at(part, model, shape, np.array([value]))
        start = np.delete(np.array(part.theta), which)
        rest = without(shape, which, value)
        start = np.clip(start, rest.lower, rest.upper)
        return search_mean(model, rest, part.rows.y, prior=part.rows.weights, eta=_eta(part), start=start).deviance

    def loss(value: float, part: Estimate) -> float:
        if part.n not in best:
            best[part.n] = deviance(part, None)
        return (deviance(part, value) - best[part.n]) / (2 * est.sigma**2)

    return loss


def listed_losses(est: Estimate, candidates: Array) -> Array:
    """The same for every candidate (K, q) of a finite set, (K,)."""
    model, shape = _models(est)
    found = np.array([_at(est, model, shape, theta) for theta in candidates])
    return np.asarray((found - found.min()) / (2 * est.sigma**2))


def _models(est: Estimate) -> tuple[Mean, Searched]:
    link = est.link
    assert link is not None
    plain = replace(est.rows, weights=None)
    return (
        Mean(link.mean, link.mean_slope, link.variance, link.deviance),
        searched_model(plain, est.shape, est.state),
    )


def _eta(est: Estimate) -> Array:
    """Linear predictor to start from, on the rows of this part."""
    rows = est.rows
    return est.design_at(rows.x, rows.base, rows.modifier) @ est.coef


def _at(est: Estimate, model: Mean, shape: Searched, theta: Array) -> float:
    """Lowest deviance at theta."""
    y, weights = est.rows.y, est.rows.weights
    x = np.hstack([shape.fixed, shape.columns(theta)])
    done = iterate(model, x, y, eta=_eta(est), prior=weights)
    each = model.deviance(y, done.mu)
    total = float(each.sum() if weights is None else weights @ each)
    return total if np.isfinite(total) else np.inf
