"""Percent readings that analysts know, as the span effect gives them for each scale of y and x."""

from __future__ import annotations

import numpy as np
import pytest
from data import A_D, A_X, A_Y, fitted, rows_of

from batten.effects.contrast import span_effect
from batten.effects.slopes import slopes_along

A = rows_of(A_X, A_Y)
WITH_D = rows_of(A_X, A_Y, A_D)
C = rows_of(np.arange(1.0, 11.0), np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14]))


def test_units_of_x_under_log_y():
    """exp(b D) - 1, not b D (Halvorsen and Palmquist 1980): +1 unit 15.480398%, +5 units 105.372064%."""
    model = fitted("log y ~ x", WITH_D)
    for step, percent in ((1, 15.480398), (5, 105.372064)):
        ratio = span_effect(model, (4, 4 + step)).ratio.estimate
        assert 100 * (ratio - 1) == pytest.approx(percent, rel=1e-6)


def test_percents_of_x_under_log_log():
    """1.01^b, 1.1^b and 2^b at b 1.048410: +1.048663%, +10.508713%, times 2.068250."""
    model = fitted("log y ~ log x", A)
    for factor, ratio in ((1.01, 1.01048663), (1.1, 1.10508713), (2, 2.068250)):
        assert span_effect(model, (7, 7 * factor)).ratio.estimate == pytest.approx(ratio, rel=1e-6)


def test_a_doubling_under_log_log_has_an_uneven_interval():
    doubling = span_effect(fitted("log y ~ log x", A), (5, 10), errors="constant").ratio
    assert (doubling.low, doubling.high) == pytest.approx((1.868147, 2.289786), rel=1e-5)


def test_percents_of_x_under_level_log():
    """b log 2 = 9.785949 and b log 1.01 = 0.140480 units of y at b 14.118140."""
    model = fitted("y ~ log x", A)
    assert span_effect(model, (5, 10)).difference.estimate == pytest.approx(9.785949, rel=1e-6)
    assert span_effect(model, (5, 5.05)).difference.estimate == pytest.approx(0.140480, rel=1e-5)


def test_slope_under_asinh():
    """b mean(cosh(eta + e)): at x = 8 the slope of the mean is 2.754797 and the mean 6.795027; computed apart."""
    model = fitted("asinh y ~ x", C)
    slope = slopes_along(model, [8.0])[0].slope.estimate
    assert slope == pytest.approx(2.754797, rel=1e-6)
    assert span_effect(model, (8, 9)).at_a.estimate == pytest.approx(6.795027, rel=1e-6)
