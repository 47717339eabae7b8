"""Means and medians brought back from a transformed scale.

The mean at a linear predictor eta is the average of g(eta + e_j) over the residuals (Duan 1983). It is taken in closed
form for the scales that have one, exactly pair by pair while that is cheap, and otherwise through a Chebyshev
interpolant in eta whose error is checked against exact averages.

Replicates: every array has a leading axis R (one displayed fit, deletions of a row, training sets, resamples). `keep`
(R, n) holds the weight of each residual in each replicate, or None where all count once.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np
from numpy.polynomial import chebyshev
from scipy.fft import dct

from batten.engine.rows import Array
from batten.families.base import Constants, Scale

__all__ = ["keep_weights", "mean_factor", "mean_of", "median_residual", "row_means", "shares_of_residuals"]

Undo = Callable[[Array], Array]

#: pairs (eta, residual) evaluated exactly before interpolation takes over
EXACT_PAIRS = 60_000
#: places of an interval at which interpolants are held against exact averages
_PROBES = np.array([0.013, 0.29, 0.57, 0.93, 0.994])
#: residuals are pooled into this many narrow classes when there are more of them
POOLED = 4096


def keep_weights(keep: Array | None, count: int) -> Array | None:
    """Weights of the residuals normalised to sum to one in each replicate (R, n), or None."""
    return None if keep is None else keep / keep.sum(axis=1, keepdims=True)


def _average(values: Array, weights: Array | None) -> Array:
    """Average over the last axis, (R, n) -> (R,)."""
    return np.asarray(values.mean(axis=-1) if weights is None else np.einsum("rn,rn->r", values, weights))


def mean_factor(residual: Array, keep: Array | None = None) -> Array:
    """Smearing factor of the log scale, mean(exp(e)), (R, n) -> (R,)."""
    return _average(np.exp(residual), keep_weights(keep, residual.shape[-1]))


def median_residual(residual: Array, keep: Array | None = None) -> Array:
    """Median residual of each replicate (R,); keep must hold zeros and ones."""
    if keep is None:
        return np.asarray(np.median(residual, axis=-1))
    return np.array([np.median(e[k > 0]) for e, k in zip(residual, keep, strict=True)])


def mean_of(
    scale: Scale,
    c: list[Constants],
    eta: Array,
    residual: Array,
    keep: Array | None = None,
    *,
    slope: bool = False,
) -> Array:
    """Mean response in units of y at each linear predictor.

    eta (R, k), residual (R, n), c one tuple of constants per replicate -> (R, k). Identity needs no correction.
    slope=True averages g' instead: the slope of the mean with respect to eta.
    """
    if scale.closed == "identity":
        return np.ones_like(eta) if slope else eta
    weights = keep_weights(keep, residual.shape[-1])
    if scale.closed == "exp":
        return np.asarray(np.exp(eta) * _average(np.exp(residual), weights)[:, None])
    if scale.closed == "square":
        return _squares(eta, residual, weights, slope=slope)
    out = np.empty_like(eta)
    for r in range(len(eta)):
        undo = partial(scale.inverse_slope if slope else scale.inverse, c=c[r])
        out[r] = _general(undo, eta[r], residual[r], None if weights is None else weights[r])
    return out


def _squares(eta: Array, residual: Array, weights: Array | None, *, slope: bool) -> Array:
    """Average of max(eta + e, 0)^2 over the residuals, or of its slope 2 max(eta + e, 0), exactly."""
    first, second = _average(residual, weights), _average(residual**2, weights)
    if eta.size and (eta.min(axis=1) + residual.min(axis=1)).min() >= 0:
        return np.asarray(2 * (eta + first[:, None]) if slope else eta**2 + 2 * eta * first[:, None] + second[:, None])
    out = np.empty_like(eta)
    for r, e in enumerate(residual):
        order = np.argsort(e)
        share = np.full(len(e), 1 / len(e)) if weights is None else weights[r][order]
        # sums over the residuals above -eta: those that keep eta + e positive
        above = [np.append(np.cumsum((share * e[order] ** p)[::-1])[::-1], 0.0) for p in range(3)]
        zero, one, two = (sums[np.searchsorted(e[order], -eta[r])] for sums in above)
        out[r] = 2 * (eta[r] * zero + one) if slope else eta[r] ** 2 * zero + 2 * eta[r] * one + two
    return out


def _general(undo: Undo, eta: Array, residual: Array, weights: Array | None) -> Array:
    if weights is not None:
        used = weights > 0
        residual, weights = residual[used], weights[used]
    if eta.size * residual.size <= EXACT_PAIRS:
        return row_means(undo, eta, residual, weights)
    if residual.size > 2 * POOLED:
        residual, weights = _pool(residual, weights)
    low, high = float(eta.min()), float(eta.max())
    if not high > low:
        return np.full_like(eta, row_means(undo, eta[:1], residual, weights)[0])
    unit = (2 * eta - (low + high)) / (high - low)
    probe = low + (high - low) * _PROBES
    exact = row_means(undo, probe, residual, weights)
    for degree in (16, 32, 64, 128):
        nodes = np.cos(np.pi * (np.arange(degree + 1) + 0.5) / (degree + 1))
        at_nodes = row_means(undo, low + (nodes + 1) * (high - low) / 2, residual, weights)
        fitted = dct(at_nodes, type=2) / (degree + 1)
        fitted[0] /= 2
        error = np.abs(chebyshev.chebval((2 * probe - (low + high)) / (high - low), fitted) - exact)
        if (error <= 1e-10 * np.abs(exact).max()).all():
            break
    return np.asarray(chebyshev.chebval(unit, fitted))


def shares_of_residuals(undo: Undo, residual: Array, eta: Array, share: Array) -> tuple[Array, Array]:
    """Average of g(eta_c + e_i) over covariate rows c with weights `share` (u,), for every residual and place.

    eta (u, G) -> features (n, K) and loads (K, G) whose product is that average: Chebyshev polynomials of the residual,
    of a degree that holds the averages to ten digits (to the degree tried last where a boundary makes a corner).
    """
    low, high = float(residual.min()), float(residual.max())
    span = (high - low) or 1.0
    probe = low + span * _PROBES
    shifted = _shifted(undo, eta, share, low, high)

    def exactly(places: Array) -> Array:
        return np.stack([row_means(undo, places, column, share) for column in eta.T], axis=1)

    at, exact = shifted or exactly, exactly(probe)
    for degree in (8, 16, 32, 64):
        nodes = np.cos(np.pi * (np.arange(degree + 1) + 0.5) / (degree + 1))
        loads = dct(at(low + (nodes + 1) * span / 2), type=2, axis=0) / (degree + 1)
        loads[0] /= 2
        error = np.abs(chebyshev.chebvander((probe - low) * 2 / span - 1, degree) @ loads - exact)
        if (error <= 1e-10 * np.abs(exact).max()).all():
            break
    return np.asarray(chebyshev.chebvander((residual - low) * 2 / span - 1, degree), dtype=np.float64), loads


def _shifted(undo: Undo, eta: Array, share: Array, low: float, high: float) -> Undo | None:
    """Averages over covariate rows at (places, G) where every place only shifts the linear predictors of the first.

    Without an interaction they are one function of the shift, which is interpolated once (closely enough for what
    follows where a boundary makes a corner); None where there is one.
    """
    first, shift = eta[:, 0], eta[0] - eta[0, 0]
    if np.abs(eta - first[:, None] - shift).max() > 1e-12 * np.abs(eta).max():
        return None
    start = low + float(shift.min())
    span = high + float(shift.max()) - start
    if not span > 0:
        return None
    exact = row_means(undo, start + span * _PROBES, first, share)
    for degree in (32, 64, 128, 256):
        nodes = np.cos(np.pi * (np.arange(degree + 1) + 0.5) / (degree + 1))
        fitted = dct(row_means(undo, start + (nodes + 1) * span / 2, first, share), type=2) / (degree + 1)
        fitted[0] /= 2
        error = np.abs(chebyshev.chebval(2 * _PROBES - 1, fitted) - exact)
        if (error <= 1e-11 * np.abs(exact).max()).all():
            break
    return lambda places: np.asarray(chebyshev.chebval((places[:, None] + shift - start) * 2 / span - 1, fitted))


def row_means(undo: Undo, eta: Array, residual: Array, weights: Array | None = None) -> Array:
    """Exact averages of g(eta_i + e_j) over j for each i: (k,), (n,) -> (k,), blocked over i."""
    out = np.empty_like(eta)
    block = max(1, 2_000_000 // max(1, residual.size))
    for start in range(0, eta.size, block):
        g = undo(eta[start : start + block, None] + residual)
        out[start : start + block] = g.mean(axis=1) if weights is None else g @ weights
    return out


def _pool(residual: Array, weights: Array | None) -> tuple[Array, Array]:
    """Residuals pooled into narrow classes of equal width, each at its own mean; weights sum to one.

    With 4096 classes over some ten SDs the second-order error is under 1e-7 of the curvature of g.
    """
    low, high = float(residual.min()), float(residual.max())
    place = np.minimum(((residual - low) * (POOLED / (high - low))).astype(np.intp), POOLED - 1)
    share = np.full(residual.size, 1.0 / residual.size) if weights is None else weights
    total: Array = np.bincount(place, share, POOLED).astype(np.float64)
    full = total > 0
    centre = np.bincount(place, share * residual, POOLED)[full] / total[full]
    return centre, total[full]
