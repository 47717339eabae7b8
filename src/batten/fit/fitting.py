"""Fitting one remedy to one analysis sample, or the reason why it cannot be."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from batten.engine.irls import Mean, iterate
from batten.engine.linear import Factored, design, factor, solve
from batten.engine.mean_search import search_mean
from batten.engine.penalised import Roughness, joined, smooth
from batten.engine.power import best_power
from batten.engine.rows import Array, Rows
from batten.engine.search import search
from batten.engine.threads import MANY_ROWS
from batten.errors import Refusal
from batten.families.base import Constants, Link, Scale
from batten.families.remedy import Remedy
from batten.fit.estimate import Estimate, Kept
from batten.fit.guard import (
    aliased,
    domain_trouble,
    edge,
    meets_constant,
    no_error_left,
    not_offered,
    not_settled,
    too_few,
)  # fmt: skip
from batten.fit.searched import scale_power, searched_model, weighted_design
from batten.fit.smoothing import roughness_rows
from batten.fit.spread import learn

__all__ = ["Designs", "estimate"]

#: (shape's key, theta) -> design and its QR, on one set of rows
Designs = dict[tuple[str, Constants], tuple[Array, Factored]]


def estimate(
    rows: Rows,
    remedy: Remedy,
    *,
    theta: Constants | None = None,
    c: Constants | None = None,
    designs: Designs | None = None,
) -> Estimate | Refusal:
    """Fit a remedy; a remedy that cannot be used on these rows comes back as a Refusal.

    designs: designs and their factors on these rows, shared by the remedies of one shape; filled along the way.
    theta, c: constants set by hand (a profile, a dragged lambda); learned from the rows when None.
    """
    refusal = not_offered(remedy) or remedy.left.refuse(rows.y) or remedy.shape.refuse(rows.x) or too_few(rows, remedy)
    if refusal:
        return refusal
    state = remedy.shape.learn(rows.x, constant=meets_constant(rows, remedy.shape))
    if isinstance(remedy.left, Link):
        return _fit_link(rows, remedy, state, theta)
    if remedy.weighted:
        return _fit_weighted(rows, remedy, state)
    return _fit_scale(rows, remedy, state, theta, c, {} if designs is None else designs)


def _fit_weighted(rows: Rows, remedy: Remedy, state: Constants) -> Estimate | Refusal:
    """Weights learned from the spread, then weighted least squares."""
    x = weighted_design(rows, remedy.shape, state, ())
    linear = factor(x)
    if linear.aliased:
        return aliased(remedy, linear.aliased, x.shape[1])
    found = learn(rows, linear)
    if isinstance(found, Refusal):
        return found
    weighted, spread = found
    est = _fit_scale(weighted, remedy, state, None, None, {})
    return est if isinstance(est, Refusal) else replace(est, spread=spread, parameters=est.parameters + 1)


def _fit_scale(
    rows: Rows,
    remedy: Remedy,
    state: Constants,
    theta: Constants | None,
    c: Constants | None,
    designs: Designs,
) -> Estimate | Refusal:
    scale, shape = remedy.left, remedy.shape
    assert isinstance(scale, Scale)
    by_hand = (theta is not None and bool(shape.searched)) or (c is not None and bool(scale.searched))
    constants = _constants(rows, remedy, state, theta, c)
    if isinstance(constants, Refusal):
        return constants
    t, c = constants
    penalty = roughness_rows(rows, shape, state)
    if (shape.key, t) not in designs:
        x = weighted_design(rows, shape, state, t)
        if not np.isfinite(x).all():
            return Refusal("The predictor's columns are not all finite.", f"{shape.key} on these rows.", "Rescale x.")
        designs[shape.key, t] = x, factor(x) if penalty is None else joined(x, penalty)
    x, linear = designs[shape.key, t]
    if linear.aliased:
        return aliased(remedy, linear.aliased, x.shape[1])
    z = rows.weigh(scale.forward(rows.y, c))
    roughness: Roughness | None = None
    used: float = x.shape[1]
    if penalty is None:
        coef, residual = solve(linear, x, z)
    else:
        found = smooth(x, linear, z, penalty)
        coef, residual, linear, roughness = found.coef, found.residual, found.factored, found.roughness
        used = roughness.edf
    df = rows.count - used - (0 if shape.finite else len(t))
    eta = (z - residual) / rows.root_weight
    trouble = domain_trouble(scale, c, eta, residual) or no_error_left(remedy, rows.count, df)
    if trouble:
        return trouble
    rss = float(residual @ residual)
    est = Estimate(
        remedy=remedy, rows=rows, state=state, theta=t, c=c, coef=coef, kept=Kept(z, eta, residual),
        factored=linear, df_residual=df, sigma=float(np.sqrt(rss / df)),
        log_likelihood=_likelihood(rss, rows.count, scale.log_jacobian(rows.y, c) + np.log(rows.root_weight)),
        parameters=used + 1 + len(t) + (1 if scale.searched else 0), roughness=roughness,
        notes=("constant set by hand; not ranked",) if by_hand else (),
    )  # fmt: skip
    if not est.moving:
        return est
    full = est.jacobian_at(rows.x, rows.base, rows.modifier)
    effective = factor(rows.weigh(full[:, :-1] if scale.searched else full))
    return not_settled(shape) if effective.aliased else replace(est, factored=effective)


def _constants(
    rows: Rows, remedy: Remedy, state: Constants, theta: Constants | None, c: Constants | None
) -> tuple[Constants, Constants] | Refusal:
    """The searched constants (theta, c); where both are searched, each in turn until neither moves."""
    scale, shape = remedy.left, remedy.shape
    assert isinstance(scale, Scale)
    search_t, search_c = bool(shape.searched) and theta is None, bool(scale.searched) and c is None
    t: Constants = theta or ()
    if c is None:
        c = (1.0,) if scale.searched else scale.learn(rows.y)
    model = searched_model(rows, shape, state) if search_t else None
    for turn in range(40 if search_t and search_c else 1):
        before = (*t, *c)
        if model is not None:
            found = search(
                model, rows.weigh(scale.forward(rows.y, c)), start=np.array(t) if turn else None,
                precision=1e-13 if rows.count <= MANY_ROWS else 1e-10,
            )  # fmt: skip
            if not found.settled:
                return not_settled(shape)
            t = tuple(float(v) for v in found.theta)
        if search_c:
            x = weighted_design(rows, shape, state, t)
            power = scale_power(scale, rows)
            lam, inside = best_power(power, rows.y, factor(x).q, start=c[0] if turn else None)
            if not inside:
                return edge(scale, lam)
            c = (lam,)
        if turn and max(abs(new - old) for new, old in zip((*t, *c), before, strict=True)) < 1e-9:
            break
    return t, c


def _likelihood(rss: float, n: int, log_jacobian: Array) -> float | None:
    """Gaussian log-likelihood plus the log-Jacobian of sqrt(w) T, in units of y (Box and Cox 1964). None for RSS 0."""
    if rss <= 0:
        return None
    return float(-0.5 * n * (np.log(2 * np.pi * rss / n) + 1) + log_jacobian.sum())


def _fit_link(rows: Rows, remedy: Remedy, state: Constants, theta: Constants | None) -> Estimate | Refusal:
    link, shape = remedy.left, remedy.shape
    assert isinstance(link, Link)
    model = Mean(link.mean, link.mean_slope, link.variance, link.deviance)
    t = theta or ()
    if shape.searched and theta is None:
        plain = searched_model(replace(rows, weights=None), shape, state)
        found = search_mean(model, plain, rows.y, prior=rows.weights, eta=link.start(rows.y))
        if not found.settled:
            return not_settled(shape)
        t = tuple(float(v) for v in found.theta)
    x = design(rows, shape.columns(rows.x, state, t), own_level=shape.own_level)
    repeated = factor(x).aliased
    if repeated:
        return aliased(remedy, repeated, x.shape[1])
    done = iterate(model, x, rows.y, eta=link.start(rows.y), prior=rows.weights)
    if not done.settled or not np.isfinite(done.mu).all():
        return Refusal(
            "The fit of this mean model does not settle.",
            "A coefficient runs away: some pattern of the predictors may hold only zeros, or fits perfectly.",
            "A scale of y (log y, sqrt y) or fewer columns.",
        )
    df = rows.count - x.shape[1] - (0 if shape.finite else len(t))
    residual = rows.y - done.mu
    likelihood = link.log_likelihood(rows.y, done.mu) if rows.weights is None else None
    pearson = float((rows.weigh(residual) ** 2 / link.variance(done.mu)).sum())
    est = Estimate(
        remedy=remedy, rows=rows, state=state, theta=t, c=(), coef=done.coef,
        kept=Kept(rows.y, done.eta, residual), factored=factor(x * np.sqrt(done.weight)[:, None]), df_residual=df,
        sigma=float(np.sqrt(pearson / df)), log_likelihood=likelihood,
        parameters=x.shape[1] + 1 + len(t),
        notes=("constant set by hand; not ranked",) if theta and shape.searched else (),
    )  # fmt: skip
    if not est.moving:
        return est
    effective = factor(est.jacobian_at(rows.x, rows.base, rows.modifier) * np.sqrt(done.weight)[:, None])
    return not_settled(shape) if effective.aliased else replace(est, factored=effective)
