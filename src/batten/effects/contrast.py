"""The span effect: rows at b against rows at a, covariates alike; one estimand for every remedy.

Averages run over the rows' own covariates (or over covariate rows that are handed in). The difference is
mean m(b, C) - mean m(a, C), the ratio mean m(b, C) / mean m(a, C), the slope over the span the difference / (b - a).
Of the median they are "the average of the typical values". Intervals count what the remedy estimated: coefficients,
searched constants, the residuals that bring a transformed response back, and the covariates averaged over.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from batten.effects.value import Effect, effect_of, undefined
from batten.engine.rows import Array
from batten.fit.averaged import Averaged, interval
from batten.fit.carried import no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means, target
from batten.fit.predict import positive_by_nature

__all__ = ["NO_ANSWER", "SpanEffect", "no_interval", "reach_trouble", "same_group", "span_difference", "span_effect"]

NO_ANSWER = "this grouping cannot answer: both ends lie in one group"


@dataclass(frozen=True)
class SpanEffect:
    """Rows at b against rows at a.

    at_a, at_b, difference: units of y. ratio: at_b / at_a. span_slope: units of y per unit of x. of: "mean" or
    "median". note: why nothing can be said, or "".
    """

    a: float
    b: float
    of: str
    level: float
    at_a: Effect
    at_b: Effect
    difference: Effect
    ratio: Effect
    span_slope: Effect
    note: str = ""


def span_effect(
    est: Estimate,
    span: tuple[float, float],
    *,
    of: str = "mean",
    level: float = 0.95,
    errors: str = "robust",
    base: Array | None = None,
    modifier: Array | None = None,
    weights: Array | None = None,
) -> SpanEffect:
    """The span effect from span[0] to span[1], averaged over the rows' own covariates.

    base (u, q), modifier (u, m), weights (u,): covariate rows to average over instead, taken as fixed.
    """
    a, b = span
    note = NO_ANSWER if same_group(est, a, b) else ""
    note = note or reach_trouble(est, np.array(span), of=of, base=base, modifier=modifier)
    if note:
        none = undefined(note)
        return SpanEffect(a, b, of, level, none, none, none, none, none, note)
    ends = averaged_means(est, np.array(span), of=of, base=base, modifier=modifier, errors=errors, weights=weights)
    limits = interval(ends, level, positive=positive_by_nature(est, ends))
    at_a, at_b = effect_of(ends.value, limits, 0), effect_of(ends.value, limits, 1)
    gap = ends.combine(np.array([[-1.0], [1.0]]))
    difference = effect_of(gap.value, interval(gap, level))
    ratio = _ratio(ends, at_a, at_b, of=of, level=level)
    effects = [at_a, at_b, difference, ratio, difference.times(1 / (b - a))]
    why = no_interval(est, difference, of=of)
    if why:
        effects = [effect.without_interval(why) for effect in effects]
    return SpanEffect(a, b, of, level, *effects)  # type: ignore[arg-type]  # five effects in the order of the fields


def no_interval(est: Estimate, effect: Effect, *, of: str) -> str:
    """Why an effect of the mean (or median) has no interval, or ""."""
    if effect.defined and not math.isfinite(effect.high - effect.low):
        return f"no interval: without one of the rows the {of} is not finite"
    return no_mean_interval(est) if of == "mean" else ""


def span_difference(est: Estimate, span: tuple[float, float]) -> float:
    """The difference of means over the span alone, NaN where it cannot be had."""
    if same_group(est, *span) or reach_trouble(est, np.array(span)):
        return math.nan
    a, b = averaged_means(est, np.array(span), root=False).value
    return float(b - a)


def same_group(est: Estimate, a: float, b: float) -> bool:
    """Whether a grouping puts both ends into one group."""
    if not est.shape.steps:
        return False
    columns = est.shape.columns(np.array([a, b]), est.state, est.theta)
    return bool((columns[0] == columns[1]).all())


def reach_trouble(
    est: Estimate, xs: Array, *, of: str = "mean", base: Array | None = None, modifier: Array | None = None
) -> str:
    """Why means (or medians) at xs (G,) cannot be had for these covariate rows, or "".

    The shape may not take an x; fitted values may leave what the scale can undo; a residual may carry one to where the
    inverse is infinite, so that no mean exists.
    """
    eta = target(est, xs, base=base, modifier=modifier).eta
    lost = ~np.isfinite(eta).all(axis=0)
    if lost.any():
        return f"{est.shape.key} cannot be taken at {', '.join(f'{x:.6g}' for x in xs[lost])}"
    if est.link is not None:
        with np.errstate(all="ignore"):
            none = ~np.isfinite(est.link.mean(eta)).all(axis=0)
        places = ", ".join(f"{x:.6g}" for x in xs[none])
        return f"{est.link.key} has no mean at {places}" if places else ""
    low, high = est.scale.limits(est.c)
    beyond = (eta <= low) | (eta >= high)
    if beyond.any():
        return f"fitted values there leave what {est.scale.key} can undo"
    if of == "median":
        return ""
    worst = np.array([eta.min() + est.residual.min(), eta.max() + est.residual.max()])
    with np.errstate(all="ignore"):
        finite = np.isfinite(est.scale.inverse(worst, est.c)).all()
    return "" if finite else f"no mean exists there under {est.scale.key}: some residuals carry y to infinity"


def _ratio(ends: Averaged, at_a: Effect, at_b: Effect, *, of: str, level: float) -> Effect:
    """at_b / at_a with an interval taken on the log scale; undefined where either interval reaches zero."""
    for end in (at_a, at_b):
        if not end.low > 0:
            return undefined(f"no ratio: the interval of a {of} reaches zero")
    logs = ends.log().combine(np.array([[-1.0], [1.0]]))
    found = effect_of(logs.value, interval(logs, level))
    if not np.isfinite([found.low, found.high]).all():
        return undefined(f"no ratio: without one row a {of} is no longer above zero")
    return found.through(math.exp)
