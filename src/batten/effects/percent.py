"""Percent readings of a yes/no predictor when the response is logged.

The ends of an interval always transform exactly: 100 (exp(end) - 1). These corrections concern the point only; they are
small beside the interval, so show one only where the standard error exceeds 0.2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import hyp0f1

from batten.engine.rows import Array

__all__ = ["PercentOfDummy", "percent_of_dummy", "ratio_of_means"]


@dataclass(frozen=True)
class PercentOfDummy:
    """Percent difference in the median (and mean, under equal spread) of the response between the two groups.

    plain: 100 (exp b - 1). kennedy: 100 (exp(b - v / 2) - 1). exact: the unbiased estimate. low, high: ends of the
    interval of b, transformed. std_error_exact: unbiased; std_error_approximate: its large-sample form. All in percent.
    """

    plain: float
    low: float
    high: float
    kennedy: float
    exact: float
    std_error_exact: float
    std_error_approximate: float


def percent_of_dummy(b: float, std_error: float, *, df: float, critical: float) -> PercentOfDummy:
    """Readings of a coefficient b of a log response with its standard error on df = n - p degrees of freedom.

    Plain: Halvorsen and Palmquist 1980; Kennedy 1981; exact with its variance: van Garderen and Shah 2002, with
    m = df / 2, v = SE^2: 100 (exp(b) 0F1(m; -(m / 2) v) - 1), variance 100^2 exp(2 b) times
    0F1(m; -(m / 2) v)^2 - 0F1(m; -2 m v). critical: t quantile of the interval. The exact forms take the errors to be
    normal with equal spread.
    """
    m, v, growth = df / 2, std_error**2, float(np.exp(b))
    shrink = _bessel_like(m, -v / 2)
    variance = shrink**2 - _bessel_like(m, -2 * v)
    return PercentOfDummy(
        plain=100 * float(np.expm1(b)),
        low=100 * float(np.expm1(b - critical * std_error)),
        high=100 * float(np.expm1(b + critical * std_error)),
        kennedy=100 * float(np.expm1(b - v / 2)),
        exact=100 * (growth * shrink - 1),
        std_error_exact=100 * growth * float(np.sqrt(max(variance, 0.0))),
        std_error_approximate=100 * growth * float(np.sqrt(np.exp(-v) - np.exp(-2 * v))),
    )


def ratio_of_means(b: float, e: Array, group: Array) -> float:
    """Ratio of the two groups' means of the response, where the spread differs between them (Manning 1998).

    exp(b) S1 / S0 with each group's own smearing factor, the mean of exp(e) over its residuals e (n,); exp(b) alone is
    the ratio of medians. group (n,): 0 or 1.
    """
    grown = np.exp(e)
    return float(np.exp(b) * grown[group == 1].mean() / grown[group == 0].mean())


def _bessel_like(m: float, t: float) -> float:
    """0F1(m; m t), which tends to exp(t) as m grows; t <= 0.

    scipy's function turns to NaN from some hundreds of degrees of freedom, so large m sums the series; beyond t = -20,
    where its terms would cancel, the value is below 1e-8 and the limit serves.
    """
    if m <= 50:
        return float(hyp0f1(m, m * t))
    if t < -20:
        return float(np.exp(t))
    total = term = 1.0
    k = 0
    while abs(term) > 1e-17:
        term *= t * m / ((m + k) * (k + 1))
        total += term
        k += 1
    return total
