"""Slopes of the mean in units of y per unit of x: at given places averaged over covariates, or averaged over the rows.

d/dx of the average of g(eta + e) is the average of eta'(x) g'(eta + e), taken exactly; for log y with smearing this is
S mean(eta' exp(eta)). Undefined for groups. At a break the slope on its left is given.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints
from batten.fit.averaged import Averaged
from batten.fit.estimate import Estimate
from batten.fit.means import BLOCK, Share, by_replicate, pattern_weights, patterns, with_errors
from batten.fit.medians import middle
from batten.fit.own_scale import on_own_scale
from batten.fit.smear import mean_of

__all__ = ["average_slope", "averaged_slopes"]


@dataclass(frozen=True, eq=False)
class _Place:
    """Rows that one slope is averaged over: eta, steep = d eta / dx (u,), and their pulls (u, P) by the parameters."""

    eta: Array
    eta_pull: Array
    steep: Array
    steep_pull: Array


def averaged_slopes(
    est: Estimate,
    xs: Array,
    *,
    of: str = "mean",
    base: Array | None = None,
    modifier: Array | None = None,
    errors: str = "robust",
    jackknife: bool = True,
) -> Averaged:
    """Slope of the mean (or "median") at each x of xs (G,), averaged over covariate rows: the rows' own by default.

    base (u, q), modifier (u, m): covariate rows to average over instead, taken as fixed.
    """
    if base is None or modifier is None:
        base, modifier, count, pattern = patterns(est)
    else:
        count, pattern = np.ones(len(base)), None
    places = [_place(est, np.full(len(base), float(x)), base, modifier) for x in xs]
    return _averaged(est, places, count / count.sum(), pattern, of, errors=errors, jackknife=jackknife)


def average_slope(est: Estimate, *, of: str = "mean", errors: str = "robust", jackknife: bool = True) -> Averaged:
    """Average over the rows of the slope at each row's own x and covariates, (1,)."""
    rows = est.rows
    place = _place(est, rows.x, rows.base, rows.modifier)
    if est.moving and est.shape.cuts(est.state, est.theta) is not None:
        place.steep_pull[:, len(est.coef) : len(est.coef) + est.moving] = _break_pull(est)
    share = np.full(est.n, 1 / est.n)
    return _averaged(est, [place], share, np.arange(est.n), of, errors=errors, jackknife=jackknife)


def _place(est: Estimate, x: Array, base: Array, modifier: Array) -> _Place:
    pull = est.jacobian_at(x, base, modifier)
    eta = pull[:, : len(est.coef)] @ est.coef
    return _Place(eta, pull, est.slopes_at(x, modifier), est.slope_jacobian_at(x, modifier))


def _break_pull(est: Estimate) -> Array:
    """How a moving break changes the average slope (n, q): rows near it pass from one side to the other.

    The jump of the slope times a normal-kernel density of x at the break (Silverman 1986), shared out over the rows.
    """
    rows, x = est.rows, est.rows.x
    spread = float(np.subtract(*np.quantile(x, [0.75, 0.25]))) / 1.349 or float(np.std(x))
    width = 0.9 * min(float(np.std(x)), spread) * est.n ** (-0.2)
    # eta's own slope by theta jumps at its break by minus the change of the slope there
    after, before = (
        est.theta_pull(est.shape.theta_slopes(np.full(est.n, end), est.state, est.theta), rows.modifier)
        for end in (np.inf, -np.inf)
    )
    kernel = np.exp(-0.5 * ((x[:, None] - np.array(est.theta)) / width) ** 2) / (width * np.sqrt(2 * np.pi))
    return np.asarray((after - before) * kernel)


def _averaged(
    est: Estimate,
    places: list[_Place],
    share: Array,
    pattern: Ints | None,
    of: str,
    *,
    errors: str,
    jackknife: bool,
) -> Averaged:
    def values(move: Array, keep: Array | None) -> Array:
        out = np.empty((len(move), len(places)))
        block = max(1, BLOCK // max(est.n, len(share)))
        for start in range(0, len(move), block):
            m = move[start : start + block]
            k = None if keep is None else keep[start : start + block]
            weights = np.broadcast_to(pattern_weights(pattern, share, k), (len(m), len(share)))
            back = _slope_back(est, of, m, k)
            for g, at in enumerate(places):
                slope = back(at.eta + m @ at.eta_pull.T) * (at.steep + m @ at.steep_pull.T)
                out[start : start + block, g] = np.einsum("ru,ru->r", slope, weights)
        return out

    def own_shares(value: Array) -> list[Share]:
        parts: list[Share] = []
        if pattern is not None and len(share) > 1:
            back = _slope_back(est, of, np.zeros((1, places[0].eta_pull.shape[1])), None)
            still = np.column_stack([back(at.eta[None])[0] * at.steep for at in places])
            parts.append(still[pattern] - value)
        if of == "median":
            parts.append(middle(est).influence[:, None] * [_lean(est, at, share) for at in places])
        elif est.link is None and est.scale.closed != "identity":
            parts.append(np.column_stack([_residual_part(est, at, share) for at in places]) - value)
        return parts

    return with_errors(
        est, values, own_shares, parameters=places[0].eta_pull.shape[1], of=of, errors=errors, jackknife=jackknife
    )


def _slope_back(est: Estimate, of: str, move: Array, keep: Array | None) -> Callable[[Array], Array]:
    """d mean / d eta at linear predictors (R, u)."""
    if est.link is not None:
        link = est.link
        if of == "mean":
            return link.mean_slope
        factor = middle(est).moved(move)[:, None]
        return lambda eta: link.mean_slope(eta) * factor
    scale = est.scale
    if scale.closed == "identity":
        return np.ones_like
    own = on_own_scale(est, move)
    length = own.length[:, None]
    if of == "mean":
        residual = own.residual(est.residual - move @ est.residual_jacobian.T)
        return lambda eta: length * mean_of(scale, own.c, own.eta(eta), residual, keep, slope=True)
    shift = middle(est).moved(move)[:, None]
    return lambda eta: length * by_replicate(scale.inverse_slope, own, own.eta(eta + shift))


def _lean(est: Estimate, at: _Place, share: Array) -> float:
    """Change of a median's slope with the middle of the residuals."""
    if est.link is not None:
        return float((share * at.steep) @ est.link.mean_slope(at.eta))
    at_middle, h = at.eta + middle(est).value, 1e-4 * est.sigma
    up, down = (est.scale.inverse_slope(at_middle + d, est.c) for d in (h, -h))
    return float((share * at.steep) @ (up - down) / (2 * h))


def _residual_part(est: Estimate, at: _Place, share: Array) -> Array:
    """Average over covariates c of eta'_c g'(eta_c + e_i), (n,): weights may be negative, so two averages are taken."""
    total = np.zeros(est.n)
    for sign in (1.0, -1.0):
        part = np.maximum(sign * at.steep * share, 0.0)
        if part.any():
            mean = mean_of(est.scale, [est.c], est.residual[None], at.eta[None], (part / part.sum())[None], slope=True)
            total = total + sign * part.sum() * mean[0]
    return total
