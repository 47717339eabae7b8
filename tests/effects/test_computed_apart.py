"""Textbook readings of small sets, computed apart by an independent script; each names the published method."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest
from data import A_D, A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy import stats

from batten.effects.contrast import span_effect
from batten.effects.covariances import covariance
from batten.effects.slopes import average, slopes_along
from batten.engine.rows import Array
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means
from batten.fit.slopes import average_slope

A, B, WITH_D = rows_of(A_X, A_Y), rows_of(B_X, B_Y), rows_of(A_X, A_Y, A_D)
C = rows_of(np.arange(1.0, 11), np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14]))


class FirstOrder(Estimate):
    """The same fit, its rows' influence to first order: errors of the HC0 kind (White 1980), not HC3."""

    def moves(self, *, leave_out: bool = True) -> Array:
        return super().moves(leave_out=False)


def first_order(est: Estimate) -> Estimate:
    return FirstOrder(**{f.name: getattr(est, f.name) for f in fields(est)})


def test_residuals_of_a_left_out_block():
    """(I - H_KK)^-1 e_K (Allen 1974 for one row): log y ~ x, every fourth row left out together."""
    est = fitted("log y ~ x", replace(A, cluster=np.arange(12) % 4))
    assert est.left_out_residual[:4] == pytest.approx([-0.763041, -0.077427, -0.174802, 0.332974], rel=1e-5)


def test_a_logged_response_with_a_covariate():
    """Halvorsen and Palmquist 1980; smearing factor (Duan 1983)."""
    est = fitted("log y ~ x", WITH_D)
    assert est.coef[[0, 2, 1]] == pytest.approx([1.049101, 0.143931, 0.313800], rel=1e-5)
    assert np.exp(est.residual).mean() == pytest.approx(1.029890, rel=1e-6)


def test_influence_of_rows_on_a_smeared_difference_and_an_average_slope():
    """Duan 1983 with the rows' first-order influence (Hampel 1974): coefficients, smearing and averages all move."""
    est = first_order(fitted("log y ~ x", WITH_D))
    at_zero = np.array([[1.0, 0.0]]), np.ones((1, 1))
    ends = averaged_means(est, np.array([5.0, 10.0]), base=at_zero[0], modifier=at_zero[1], jackknife=False)
    gap = ends.combine(np.array([[-1.0], [1.0]]))
    assert gap.value[0] == pytest.approx(6.363214, rel=1e-6)
    assert gap.error[0] == pytest.approx(0.787878, rel=1e-5)
    slope = average_slope(est, jackknife=False)
    assert slope.value[0] == pytest.approx(2.692910, rel=1e-6)
    assert slope.error[0] == pytest.approx(0.509009, rel=1e-5)
    growth = np.exp(est.eta)  # with x taken as fixed the rows' own share in the average falls away
    fixed = slope.root[:, 0] * 12 - est.coef[2] * np.exp(est.residual).mean() * (growth - growth.mean())
    assert np.sqrt(fixed @ fixed) / 12 == pytest.approx(0.445118, rel=1e-5)
    single = averaged_means(first_order(fitted("log y ~ x", A)), np.array([10.0]), jackknife=False)
    assert single.error[0] == pytest.approx(1.165355, rel=1e-5)
    assert single.root[:3, 0] * 12 == pytest.approx([-4.399169, -1.657585, -2.387964], rel=1e-5)


def test_the_ratio_of_a_logged_response_is_exact_and_uneven():
    ratio = span_effect(fitted("log y ~ x", WITH_D), (5.0, 10.0), errors="constant").ratio
    assert (ratio.estimate, ratio.low, ratio.high) == pytest.approx((2.053721, 1.760801, 2.395369), rel=1e-6)


def test_the_average_slope_of_a_log_link():
    """With a constant it is b times the mean of y (Santos Silva and Tenreyro 2006)."""
    est = fitted("loglink y ~ x", WITH_D)
    assert est.coef[2] == pytest.approx(0.120472, rel=1e-5)
    assert average(est).estimate == pytest.approx(2.088181, rel=1e-6)


@pytest.mark.parametrize(
    ("key", "slope"), [("y ~ hinge x", 0.148690), ("y ~ spline(1, 4, 7, 11) x", 0.093271), ("y ~ poly2 x", 0.073481)]
)
def test_average_slopes_of_curves_with_a_bottom(key, slope):
    assert average(fitted(key, B)).estimate == pytest.approx(slope, rel=1e-5)


def test_the_elasticity_of_a_straight_line_at_its_means():
    """b xbar / ybar, for the line runs through both."""
    est, middle = fitted("y ~ x", A), A_X.mean()
    slope = slopes_along(est, [middle])[0].slope.estimate
    assert slope * middle / span_effect(est, (middle, 20.0)).at_a.estimate == pytest.approx(1.154142, rel=1e-6)


def test_the_slope_under_asinh_at_a_value_of_y():
    """b sqrt(y^2 + 1) (Bellemare and Wichman 2020), y the fitted value without residuals."""
    est = fitted("asinh y ~ x", C)
    at = est.scale.inverse_slope(est.design_at(np.array([8.0]), np.ones((1, 1)), np.ones((1, 1))) @ est.coef, est.c)
    assert est.coef[1] * at[0] == pytest.approx(2.571293, rel=1e-6)
    # the slope of the median moves on by the median residual, in the same form
    median = span_effect(est, (8.0, 9.0), of="median").at_a.estimate
    found = slopes_along(est, [8.0], of="median")[0].slope.estimate
    assert found == pytest.approx(est.coef[1] * np.hypot(median, 1), rel=1e-10)


def test_the_power_of_y_is_that_given_the_predictors():
    """Box and Cox 1964: 0.450577 given x; from y alone it would be 0.092794."""
    assert fitted("boxcox y ~ x", A).c[0] == pytest.approx(0.450577, rel=1e-5)
    assert stats.boxcox(A_Y)[1] == pytest.approx(0.092794, rel=1e-4)  # the other program's search


def test_degrees_of_a_polynomial_one_after_another():
    """A cubic that adds nothing may be followed by a fourth degree that does."""
    fits = [fitted(f"y ~ {right}", B) for right in ("x", "poly2 x", "poly3 x", "poly4 x")]
    rss = [float(e.residual @ e.residual) for e in fits]
    assert rss == pytest.approx([48.109084, 4.046521, 4.018953, 0.994172], rel=1e-6)
    f = [(rss[k] - rss[k + 1]) / (rss[k + 1] / fits[k + 1].df_residual) for k in range(3)]
    assert f == pytest.approx([141.556968, 0.082316, 33.467645], rel=1e-5)


def test_a_spline_with_given_knots():
    """Stone and Koo 1985; Harrell 2015: truncated cubes over the squared range of the knots."""
    est = fitted("y ~ spline(1, 4, 7, 11) x", B)
    assert est.coef == pytest.approx([10.373052, -1.325208, 2.291174, -1.781566], rel=1e-6)
    assert est.residual @ est.residual == pytest.approx(2.662970, rel=1e-6)


def test_elasticities_per_group_and_the_gap_between_the_groups():
    """log y ~ log x * d: coefficients, the error of the second elasticity, and y there over the first at x = 10."""
    rows = replace(WITH_D, modifier=np.column_stack([np.ones(12), A_D]))
    est = fitted("log y ~ log x", rows)
    assert est.coef == pytest.approx([0.566864, -0.080308, 0.950347, 0.183060], abs=6e-7)
    line = np.array([0.0, 0, 1, 1])
    assert np.sqrt(line @ covariance(est, "constant") @ line) == pytest.approx(0.067438, abs=6e-7)
    ends = [
        averaged_means(est, np.array([10.0]), base=np.array([[1.0, d]]), modifier=np.array([[1.0, d]])).value[0]
        for d in (0.0, 1.0)
    ]
    assert 100 * (ends[1] / ends[0] - 1) == pytest.approx(40.663690, rel=1e-6)
