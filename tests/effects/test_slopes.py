"""Slopes of the mean, against closed forms, refits and finite differences."""

from __future__ import annotations

import numpy as np
import pytest
from data import A_D, A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy.stats import t as student

from batten.effects.slopes import NO_SLOPE, average, breaks, slopes_along
from batten.fit.means import averaged_means

A, B = rows_of(A_X, A_Y, A_D), rows_of(B_X, B_Y)


def test_the_average_slope_of_log_y_is_b_times_smearing_times_the_mean_of_exp_eta():
    """b S mean(e^eta) (Duan 1983); b mean(y) = 2.494797 is not it."""
    X = np.column_stack([np.ones(12), A_D, A_X])
    b = np.linalg.lstsq(X, np.log(A_Y), rcond=None)[0]
    expected = b[2] * np.exp(np.log(A_Y) - X @ b).mean() * np.exp(X @ b).mean()
    found = average(fitted("log y ~ x", A))
    assert found.estimate == pytest.approx(expected, rel=1e-12)
    assert found.estimate == pytest.approx(2.692910, abs=5e-7)


def test_the_average_slope_of_a_poisson_log_link_is_b_times_the_mean_of_y():
    """With a constant and a canonical link the fitted values have the mean of y."""
    est = fitted("loglink y ~ x", A)
    assert average(est).estimate == pytest.approx(est.coef[2] * A_Y.mean(), rel=1e-8)


@pytest.mark.parametrize(
    ("key", "expected"),
    [
        ("y ~ hinge x", lambda e: e.coef[1] + e.coef[2] * np.mean(e.theta[0] < B_X)),
        ("y ~ poly2 x", lambda e: e.coef[1] + 2 * e.coef[2] * (B_X - e.state[0]).mean()),
        ("y ~ log x", lambda e: e.coef[1] * (1 / B_X).mean()),
    ],
)
def test_average_slopes_of_plain_y_have_closed_forms(key, expected):
    est = fitted(key, B)
    assert average(est).estimate == pytest.approx(expected(est), rel=1e-12)


def test_the_jackknife_error_of_an_average_slope_equals_refits():
    left = [average(fitted("log y ~ x", A.take(np.arange(12) != i))).estimate for i in range(12)]
    error = np.sqrt(11 / 12 * np.sum((np.array(left) - np.mean(left)) ** 2))
    found = average(fitted("log y ~ x", A))
    assert found.high - found.estimate == pytest.approx(student.ppf(0.975, 9) * error, rel=1e-10)


def test_the_quadratics_slope_and_error_at_a_place():
    """B at x = 4: b1 + 2 b2 x with its OLS standard error, computed apart."""
    X = np.column_stack([np.ones(16), B_X, B_X**2])
    b, rss = np.linalg.lstsq(X, B_Y, rcond=None)[:2]
    V = rss[0] / 13 * np.linalg.inv(X.T @ X)
    line = np.array([0, 1, 8.0])
    (at,) = slopes_along(fitted("y ~ poly2 x", B), [4.0], errors="constant")
    assert at.slope.estimate == pytest.approx(line @ b, rel=1e-9)
    assert at.slope.estimate == pytest.approx(-0.571301, abs=5e-7)
    assert (at.slope.high - at.slope.estimate) / student.ppf(0.975, 13) == pytest.approx(
        np.sqrt(line @ V @ line), rel=1e-7
    )


def test_a_hinge_has_two_slopes_at_its_break_and_one_elsewhere():
    """Left -0.961111, right 1.258491 (change 2.219602): nonlinear least squares, computed apart."""
    est = fitted("y ~ hinge x", B)
    (place,) = breaks(est)
    found = slopes_along(est, [3.0, place])
    assert [s.side for s in found] == ["", "left", "right"]
    assert found[0].slope.estimate == pytest.approx(found[1].slope.estimate, rel=1e-12)
    np.testing.assert_allclose([s.slope.estimate for s in found[1:]], [-0.961111, 1.258491], atol=2e-6)


@pytest.mark.parametrize("of", ["mean", "median"])
@pytest.mark.parametrize(
    "key",
    ["log y ~ log x", "sqrt y ~ x", "boxcox y ~ x", "y ~ x^p", "log y ~ spline4 x", "loglink y ~ log x", "y ~ fp1 x"],
)
def test_slopes_are_the_derivative_of_the_averaged_curve(key, of):
    est = fitted(key, A)
    h = 1e-4
    (at,) = slopes_along(est, [7.0], of=of)
    around = averaged_means(est, np.array([7 - h, 7 + h]), of=of).value
    # central differences of step 1e-4 hold some nine digits here
    assert at.slope.estimate == pytest.approx((around[1] - around[0]) / (2 * h), rel=1e-7)


def test_groups_have_no_slope():
    est = fitted("y ~ bins3 x", A)
    assert average(est).note == NO_SLOPE
    assert [s.slope.note for s in slopes_along(est, [3.0, 9.0])] == [NO_SLOPE, NO_SLOPE]
    assert breaks(est) == ()


def test_a_place_the_shape_cannot_take_is_named_and_the_others_answer():
    found = slopes_along(fitted("y ~ log x", A), [-2.0, 4.0])
    assert found[0].slope.note == "log x cannot be taken at -2"
    assert found[1].slope.defined
