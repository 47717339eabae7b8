"""The response with the covariates taken off."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.graphics.regressionplots import ceres_resids, partial_resids
from two_sets import A_X, A_Y, line

from batten.diagnose.partial import conditional_residuals, partial_residuals

D = np.tile([0.0, 1.0], 6)


def test_component_plus_residual_of_the_nearly_straight_set():
    """Ezekiel 1924; values computed apart, there as e + b x; here at the level of y."""
    elsewhere = np.array([6.969924, 3.315298, 9.069924])
    found = partial_residuals(line(A_X, D), A_Y, focal=slice(1, 2))
    slope = np.linalg.lstsq(line(A_X, D), A_Y, rcond=None)[0][1]
    assert found[:3] - A_Y.mean() + slope * A_X.mean() == pytest.approx(elsewhere, rel=1e-6)
    assert found.mean() == pytest.approx(A_Y.mean(), rel=1e-12)


def test_component_plus_residual_is_that_of_statsmodels_up_to_its_level():
    fit = sm.OLS(A_Y, line(A_X, D)).fit()
    theirs = partial_resids(fit, 1)
    found = partial_residuals(line(A_X, D), A_Y, focal=slice(1, 2))
    assert found - found.mean() == pytest.approx(theirs - theirs.mean(), abs=1e-10)


def test_all_columns_of_the_term_count_and_their_centring_does_not():
    """A quadratic written two ways: one column alone would show two different plots."""
    raw, moved = (line(x, x**2, D) for x in (A_X, A_X - 7.5))
    found = [partial_residuals(X, A_Y, focal=np.array([1, 2])) for X in (raw, moved)]
    assert found[0] == pytest.approx(found[1], rel=1e-9)


def test_conditional_residuals_of_the_nearly_straight_set():
    """Cook 1993: covariate log x + 0.1 d, quadratic means; values computed apart, there without centring."""
    c = np.log(A_X) + 0.1 * D
    others = np.column_stack([np.ones(12), c])
    means = np.polyval(np.polyfit(A_X, c, 2), A_X)
    gamma = sm.OLS(A_Y, np.column_stack([others, means])).fit().params[2]
    found = conditional_residuals(others, A_Y, A_X)
    elsewhere = np.array([12.004464, 9.048325, 7.516591])
    assert found[:3] - A_Y.mean() + gamma * means.mean() == pytest.approx(elsewhere, rel=1e-6)


def test_conditional_residuals_are_those_of_statsmodels_given_the_same_means():
    c = np.log(A_X) + 0.1 * D
    means = np.polyval(np.polyfit(A_X, c, 2), A_X)
    fit = sm.OLS(A_Y, np.column_stack([np.ones(12), A_X, c])).fit()
    theirs = ceres_resids(fit, 1, cond_means=means[:, None])
    found = conditional_residuals(np.column_stack([np.ones(12), c]), A_Y, A_X)
    assert found - found.mean() == pytest.approx(theirs - theirs.mean(), abs=1e-9)


def test_conditional_residuals_show_the_true_curve_where_the_plain_ones_bend_falsely():
    """y = |x| + c with c = x^2 and noise, fitted with x as a line: the covariate takes over part of y's own curve, so
    the plain values lie; the conditional ones come at least twice as near to |x|."""
    rng = np.random.default_rng(6)
    x = np.sort(rng.uniform(-1, 1, 300))
    c = x**2 + 0.3 * rng.normal(size=300)
    y = np.abs(x) + c
    truth = np.abs(x) - np.abs(x).mean()
    plain = partial_residuals(line(x, c), y, focal=slice(1, 2)) - y.mean()
    conditional = conditional_residuals(np.column_stack([np.ones(300), c]), y, x) - y.mean()
    assert np.std(conditional - truth) < 0.5 * np.std(plain - truth)


def test_covariates_that_are_such_curves_themselves_bring_no_new_column():
    """A constant and x squared are known exactly given x: nothing is added, and the values stay those of the fit."""
    others = np.column_stack([np.ones(12), A_X**2])
    found = conditional_residuals(others, A_Y, A_X)
    left = A_Y - others @ np.linalg.lstsq(others, A_Y, rcond=None)[0]
    assert found == pytest.approx(left + A_Y.mean(), rel=1e-10)
