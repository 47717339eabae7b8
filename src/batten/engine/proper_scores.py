"""Proper scores of predicted distributions: smaller is better, and honesty pays (Gneiting and Raftery 2007).

All in the units of the response, row by row, broadcasting; they stay finite where a density would be zero or infinite.
"""

from __future__ import annotations

import numpy as np
from scipy.special import ndtr

from batten.engine.rows import Array

__all__ = ["crps_lognormal", "crps_normal", "interval_score"]


def crps_normal(y: Array, mean: Array, sd: Array) -> Array:
    """Continuous ranked probability score of Normal(mean, sd): sd [w (2 Phi(w) - 1) + 2 phi(w) - 1 / sqrt(pi)]."""
    w = (np.asarray(y) - mean) / sd
    density = np.exp(-(w**2) / 2) / np.sqrt(2 * np.pi)
    return np.asarray(sd * (w * (2 * ndtr(w) - 1) + 2 * density - 1 / np.sqrt(np.pi)))


def crps_lognormal(y: Array, mean_log: Array, sd_log: Array) -> Array:
    """Continuous ranked probability score of exp(Normal(mean_log, sd_log)); y at or below zero is allowed.

    y (2 Phi(w) - 1) - 2 exp(m + s^2 / 2) [Phi(w - s) + Phi(s / sqrt 2) - 1], w = (log y - m) / s.
    """
    y = np.asarray(y, dtype=np.float64)
    with np.errstate(divide="ignore"):
        w = (np.log(np.maximum(y, 0.0)) - mean_log) / sd_log
    mean = np.exp(mean_log + np.square(sd_log) / 2)
    return np.asarray(y * (2 * ndtr(w) - 1) - 2 * mean * (ndtr(w - sd_log) + ndtr(sd_log / np.sqrt(2)) - 1))


def interval_score(y: Array, low: Array, high: Array, *, level: float = 0.95) -> Array:
    """Width plus 2 / (1 - level) times the distance of y outside the interval."""
    y = np.asarray(y)
    miss = np.maximum(low - y, 0) + np.maximum(y - high, 0)
    return np.asarray(high - low + 2 / (1 - level) * miss)
