"""Curves for figures: a fit's means along the focal predictor, with the band of the estimate.

The numbers come from `averaged_means` and are the table's own, at places chosen for the eye. Up to JACKKNIFE_ROWS
rows the band leaves out each row in turn, as the table does; beyond, it uses each row's influence, which is as good
there and takes milliseconds. `Curve.how` says which.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from batten.effects.contrast import same_group
from batten.effects.value import Effect, effect_of, undefined
from batten.engine.rows import Array, Ints
from batten.fit.averaged import Averaged, interval
from batten.fit.carried import no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means, jackknifed, patterns
from batten.fit.moved import moved_row_interval
from batten.fit.predict import positive_by_nature

__all__ = ["Curve", "Ground", "SpanEnds", "beyond", "curve_of", "places_along", "row_band", "span_ends"]

#: the jackknife of a whole curve stays under a tenth of a second up to here
JACKKNIFE_ROWS = 150
#: rows beyond which the band is computed at fewer places
MANY_ROWS = 20_000
#: different covariate rows averaged over, beyond which an even sample of AVERAGED of them serves
COVARIATES, AVERAGED = 3_000, 1_000
#: numbers held at once
BLOCK = 4_000_000
#: places of a curve, and how far it goes beyond the data, as a share of their range
EVEN, BY_ROWS, MARGIN = 56, 20, 0.06

Covariates = tuple[Array, Array] | None


@dataclass(frozen=True, eq=False)
class Ground:
    """Where the rows are along the focal predictor: ends of the data, of their central 90%, and of what is drawn."""

    low: float
    high: float
    middle_low: float
    middle_high: float
    left: float
    right: float


@dataclass(frozen=True, eq=False)
class Curve:
    """value, low, high (G,) at x (G,), units of y; NaN where the fit has none there.

    how: how the band was made, or why there is none, "" where none was asked for. averaged: covariate rows averaged
    over where that is not all, else 0.
    """

    x: Array
    value: Array
    low: Array
    high: Array
    how: str
    averaged: int = 0


@dataclass(frozen=True)
class SpanEnds:
    """The means at both ends of the span and their difference, units of y."""

    a: float
    b: float
    at_a: Effect
    at_b: Effect
    difference: Effect


def beyond(x: Array) -> Ground:
    """The ground of predictor values x (n,). What is drawn goes a little beyond them, never across zero."""
    low, high = float(x.min()), float(x.max())
    middle = np.quantile(x, [0.05, 0.95])
    pad = MARGIN * ((high - low) or abs(low) or 1.0)
    left = max(0.0, low - pad) if low >= 0 else low - pad
    return Ground(low, high, float(middle[0]), float(middle[1]), left, high + pad)


def places_along(est: Estimate) -> Array:
    """Where the curve is asked for: even steps, more where the rows are, and both sides of every step or corner."""
    x, ground = est.rows.x, beyond(est.rows.x)
    even = np.linspace(ground.left, ground.right, EVEN)
    crowd = np.quantile(x, np.linspace(0, 1, BY_ROWS))
    cuts = np.asarray([c for c in est.shape.cuts(est.state, est.theta) or () if ground.left < c < ground.right])
    if est.shape.steps:
        cuts = np.concatenate([cuts, np.nextafter(cuts, -np.inf)])
    return np.unique(np.concatenate([even, crowd, cuts]))


def curve_of(
    est: Estimate, xs: Array, *, of: str = "mean", level: float = 0.95, errors: str = "robust", band: bool = True,
    profile: Covariates = None,
) -> Curve:  # fmt: skip
    """Means (or medians) at xs (G,), averaged over the rows' covariates or over the profile's."""
    covariates, sampled = _covariates(est, profile)
    if not band and of == "mean" and est.link is None and est.scale.closed == "identity" and profile is None:
        # the mean of y itself is linear in the covariates: their average row gives the average curve
        covariates, sampled = (est.rows.base.mean(axis=0)[None], est.rows.modifier.mean(axis=0)[None]), 0
    trouble = no_mean_interval(est) if band and of == "mean" else ""
    jackknife = est.n <= JACKKNIFE_ROWS
    nothing = np.full(len(xs), np.nan)
    out = Curve(xs, nothing.copy(), nothing.copy(), nothing.copy(), "", sampled)
    asked = np.flatnonzero(_reachable(est, xs, covariates))
    for some in _blocks(est, asked, covariates):
        out.value[some] = _averaged(est, xs[some], of, errors, covariates, root=False).value
    if band and not trouble:
        at = _band_places(est, asked)
        for some in _blocks(est, at, covariates):
            averaged = _averaged(est, xs[some], of, errors, covariates, jackknife=jackknife)
            ends = interval(averaged, level, positive=positive_by_nature(est, averaged))
            out.low[some], out.high[some] = ends
        for end in (out.low, out.high) if len(at) else ():
            end[asked] = out.value[asked] + np.interp(xs[asked], xs[at], end[at] - out.value[at])
    return replace(out, how=trouble or _how(est, of, errors, jackknife)) if band else out


def row_band(
    est: Estimate, xs: Array, *, level: float = 0.95, errors: str = "robust", profile: Covariates = None
) -> Curve:
    """Where one further row lies, covariates as in the rows (or the profile), at each of xs (G,)."""
    covariates, sampled = _covariates(est, profile)
    nothing = np.full(len(xs), np.nan)
    out = Curve(xs, nothing.copy(), nothing.copy(), nothing.copy(), "", sampled)
    asked = np.flatnonzero(_reachable(est, xs, covariates))
    if len(asked):
        ends = moved_row_interval(est, xs[asked], level=level, errors=errors, profile=profile)
        out.low[asked], out.high[asked] = ends
    return out


def span_ends(
    est: Estimate, span: tuple[float, float], *, level: float = 0.95, errors: str = "robust", profile: Covariates = None
) -> SpanEnds:
    """What a figure shows at the span: the table's own estimates, with intervals made as the curve's band is."""
    covariates, _ = _covariates(est, profile)
    xs, none = np.asarray(span, dtype=float), undefined("")
    if same_group(est, *span) or not _reachable(est, xs, covariates).all():
        return SpanEnds(*span, none, none, none)
    trouble = no_mean_interval(est)
    both = _averaged(est, xs, "mean", errors, covariates, jackknife=est.n <= JACKKNIFE_ROWS)
    if trouble:
        a, b = (Effect(float(v), np.nan, np.nan, trouble) for v in both.value)
        return SpanEnds(*span, a, b, Effect(b.estimate - a.estimate, np.nan, np.nan, trouble))
    limits = interval(both, level, positive=positive_by_nature(est, both))
    gap = both.combine(np.array([[-1.0], [1.0]]))
    difference = effect_of(gap.value, interval(gap, level))
    return SpanEnds(*span, effect_of(both.value, limits, 0), effect_of(both.value, limits, 1), difference)


def _band_places(est: Estimate, asked: Ints) -> Ints:
    """Where the band is computed; with many rows at every fourth place only, its width drawn straight between."""
    if est.n <= MANY_ROWS or est.shape.steps or len(asked) < 9:
        return asked
    return np.unique(np.append(asked[::4], asked[-1]))


def _averaged(
    est: Estimate, xs: Array, of: str, errors: str, covariates: Covariates, *, root: bool = True,
    jackknife: bool = False,
) -> Averaged:  # fmt: skip
    base, modifier = covariates or (None, None)
    # the median of a few rows, or a deletion that leaves the scale, may give no number: drawn as a gap
    with np.errstate(all="ignore"):
        return averaged_means(
            est, xs, of=of, errors=errors, base=base, modifier=modifier, jackknife=jackknife, root=root
        )


def _covariates(est: Estimate, profile: Covariates) -> tuple[Covariates, int]:
    """What to average over, and its number of rows where that is a sample."""
    rows = est.rows
    base, modifier = profile or (rows.base, rows.modifier)
    if len(base) <= COVARIATES or (profile is None and len(patterns(est)[0]) <= COVARIATES):
        return profile, 0
    # an even sample along the fitted values keeps the average of anything that depends on them
    order = np.argsort(est.design_at(np.full(len(base), float(np.median(rows.x))), base, modifier) @ est.coef)
    even = order[np.linspace(0, len(order) - 1, AVERAGED).astype(np.intp)]
    return (base[even], modifier[even]), AVERAGED


def _blocks(est: Estimate, asked: Ints, covariates: Covariates) -> list[Ints]:
    """The asked places in parts that fit the memory."""
    rows = len(covariates[0]) if covariates else min(est.n, COVARIATES)
    most = max(1, BLOCK // (est.n + rows * (len(est.coef) + 2)))
    return np.array_split(asked, -(-len(asked) // most)) if len(asked) else []


def _reachable(est: Estimate, xs: Array, covariates: Covariates) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Where the shape takes x and the scale can undo the fitted values of all covariate rows."""
    with np.errstate(all="ignore"):
        taken = np.array(np.isfinite(est.shape.columns(xs, est.state, est.theta)).all(axis=1), ndmin=1)
    if est.link is not None or not np.isfinite(est.scale.limits(est.c)).any():
        return taken
    base, modifier = covariates or (est.rows.base, est.rows.modifier)
    low, high = est.scale.limits(est.c)
    for i in np.flatnonzero(taken):
        eta = est.design_at(np.full(len(base), xs[i]), base, modifier) @ est.coef
        with np.errstate(all="ignore"):
            worst = est.scale.inverse(np.array([eta.min() + est.residual.min(), eta.max() + est.residual.max()]), est.c)
        taken[i] = eta.min() > low and eta.max() < high and np.isfinite(worst).all()
    return taken


def _how(est: Estimate, of: str, errors: str, jackknife: bool) -> str:
    if errors == "constant":
        return "errors of equal spread"
    return "each row left out in turn" if jackknife and jackknifed(est, of) else "the influence of each row"
