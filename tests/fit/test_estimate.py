"""Fits against an independent computation, a general-purpose library and published likelihood formulas."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from check_data import AD, AX, AY, BX, BY, CX, CY, DX, DY, rows_of

from batten.errors import Refusal
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.frame.read import read
from batten.frame.samples import sample


def fit(y: np.ndarray, x: np.ndarray, key: str, *covariates: np.ndarray) -> Estimate:
    done = estimate(rows_of(y, x, *covariates), parse(key))
    assert isinstance(done, Estimate), done
    return done


@pytest.mark.parametrize(
    ("key", "log_likelihood", "aicc"),
    [
        ("y ~ x", -34.135239, 77.270477),
        ("log y ~ x", -31.678099, 72.356197),
        ("sqrt y ~ x", -27.600553, 64.201107),
        ("log y ~ log x", -26.174925, 61.349851),
        ("boxcox y ~ x", -27.526523, 68.767332),
        ("loglink-gaussian y ~ x", -33.893609, 76.787218),
        ("loglink-gamma y ~ x", -31.488537, 71.977074),
    ],
)
def test_likelihoods_stand_in_units_of_y(key: str, log_likelihood: float, aicc: float) -> None:
    """Jacobian of the transformation counted (Box and Cox 1964); independent computation, six decimals."""
    done = fit(AY, AX, key)
    assert done.log_likelihood == pytest.approx(log_likelihood, abs=2e-6)
    assert done.aicc == pytest.approx(aicc, abs=4e-6)


def test_a_pseudo_likelihood_has_no_aicc() -> None:
    assert np.isnan(fit(CY, CX, "loglink y ~ x").aicc)


def test_poisson_pseudo_likelihood_agrees_with_statsmodels_and_its_hc3_with_the_closed_form() -> None:
    done = fit(CY, CX, "loglink y ~ x")
    want = sm.GLM(CY, sm.add_constant(CX), family=sm.families.Poisson()).fit(tol=1e-14)
    np.testing.assert_allclose(done.coef, want.params, rtol=1e-10)
    # independent computation: slope 0.438565, HC3-type error 0.065003 (statsmodels' GLM prints HC0 under that name)
    assert done.coef[1] == pytest.approx(0.438565, abs=1e-6)
    assert np.sqrt(done.covariance()[1, 1]) == pytest.approx(0.065003, abs=1e-6)


def test_a_share_link_agrees_with_a_fractional_logit() -> None:
    done = fit(DY, DX, "share y ~ x")
    np.testing.assert_allclose(done.coef, [-2.912374, 0.413695], atol=1e-6)


@pytest.mark.parametrize(
    "key", ["y ~ x", "log y ~ x", "sqrt y ~ sqrt x", "y ~ poly3 x", "log y ~ spline3 x", "y ~ bins3 x"]
)
def test_coefficients_and_both_error_kinds_agree_with_statsmodels(key: str) -> None:
    rng = np.random.default_rng(5)
    x = rng.uniform(1, 9, 120)
    c = rng.normal(size=120)
    y = np.exp(0.3 * np.sqrt(x) + 0.1 * c + rng.normal(0, 0.2, 120))
    done = fit(y, x, key, c)
    design = done.design_at(x, done.rows.base, done.rows.modifier)
    plain = sm.OLS(done.z, design).fit()
    robust = sm.OLS(done.z, design).fit(cov_type="HC3")
    np.testing.assert_allclose(done.coef, plain.params, rtol=1e-10, atol=1e-12)
    np.testing.assert_allclose(done.residual, plain.resid, rtol=1e-9, atol=1e-12)
    np.testing.assert_allclose(np.sqrt(np.diagonal(done.covariance("constant"))), plain.bse, rtol=1e-10)
    np.testing.assert_allclose(np.sqrt(np.diagonal(done.covariance("robust"))), robust.bse, rtol=1e-10)


def test_hinge_break_slopes_and_errors() -> None:
    """Break 5.895514 with NLS error 0.132240, slopes -0.961111 and 1.258491, RSS 1.008532 (independent computation)."""
    done = fit(BY, BX, "y ~ hinge x")
    assert done.theta[0] == pytest.approx(5.895514, abs=2e-6)
    assert float(done.residual @ done.residual) == pytest.approx(1.008532, abs=1e-6)
    left = done.coef[1]
    assert (left, left + done.coef[2]) == (pytest.approx(-0.961111, abs=1e-6), pytest.approx(1.258491, abs=1e-6))
    assert np.sqrt(done.covariance("constant")[-1, -1]) == pytest.approx(0.132240, abs=1e-6)


def test_hyperbola_constants_and_errors() -> None:
    """y = Vm x / (K + x): Vm 10.647612 (0.116980), K 2.991834 (0.114235), RSS 0.159410 (independent computation)."""
    y = np.array([2.6, 4.1, 5.4, 6.2, 6.5, 7.2, 7.9, 8.3, 8.6, 8.7, 9.1, 9.2])
    done = fit(y, AX, "y ~ level-hyp x")
    np.testing.assert_allclose([*done.coef, *done.theta], [10.647612, 2.991834], atol=1e-6)
    np.testing.assert_allclose(np.sqrt(np.diagonal(done.covariance("constant"))), [0.116980, 0.114235], atol=1e-6)
    assert float(done.residual @ done.residual) == pytest.approx(0.159410, abs=1e-6)


def test_enzyme_velocity_meets_the_published_constants() -> None:
    """Puromycin, treated: Vm 212.7 (6.947), K 0.06412 (0.008281), s 10.93; Bates and Watts 1988, sections 2.1-2.3."""
    conc = np.repeat([0.02, 0.06, 0.11, 0.22, 0.56, 1.10], 2)
    rate = np.array([76, 47, 97, 107, 123, 139, 159, 152, 191, 201, 207, 200.0])
    done = fit(rate, conc, "y ~ level-hyp x")
    assert done.coef[0] == pytest.approx(212.68374314253487, rel=1e-9)
    assert done.theta[0] == pytest.approx(0.06412128168156518, rel=1e-8)
    np.testing.assert_allclose(np.sqrt(np.diagonal(done.covariance("constant"))), [6.947, 0.008281], rtol=1e-3)
    assert done.sigma == pytest.approx(10.93, abs=0.005)


def test_lambda_is_learned_given_the_predictors() -> None:
    done = fit(AY, AX, "boxcox y ~ x")
    assert done.c[0] == pytest.approx(0.450577, abs=1e-6)


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "y ~ poly2 x", "sqrt y ~ log x"])
def test_moves_equal_refits_without_the_row(key: str) -> None:
    done = fit(AY, AX, key, AD)
    moves = done.moves()
    for i in range(len(AY)):
        rest = np.arange(len(AY)) != i
        again = fit(AY[rest], AX[rest], key, AD[rest])
        np.testing.assert_allclose(done.coef + moves[i], again.coef, rtol=1e-10, atol=1e-12)


@pytest.mark.parametrize("key", ["boxcox y ~ x", "y ~ x^p", "y ~ level-hyp x"])
def test_moves_of_searched_constants_are_the_derivative_of_a_weighted_fit(key: str) -> None:
    """The one-step move without leverage is minus the derivative by the row's weight: doubled rows show it."""
    rng = np.random.default_rng(2)
    x = np.sort(rng.uniform(1, 10, 400))
    y = 3 + 8 * x / (x + 4) + rng.normal(0, 0.3, 400)
    done = fit(y, x, key)
    moves = done.moves(leave_out=False)
    for i in (10, 200, 390):
        twice = np.append(np.arange(400), i)
        again = fit(y[twice], x[twice], key)
        # Gauss-Newton leaves the residual curvature out of the derivative, which is under a tenth of it here
        got = np.array([*again.theta, *again.c]) - np.array([*done.theta, *done.c])
        assert got[0] == pytest.approx(-moves[i, -1], rel=0.1, abs=1e-7)


def test_reciprocal_with_fitted_values_across_zero_is_refused_in_words() -> None:
    """1/y on x has two fitted values at or below zero on these rows: unsafe to bring back."""
    done = estimate(rows_of(AY, AX), parse("1/y ~ x"))
    assert isinstance(done, Refusal)
    assert "2 of 12" in done.seen


def test_reciprocal_of_both_is_allowed() -> None:
    assert isinstance(estimate(rows_of(AY, AX), parse("1/y ~ 1/x")), Estimate)


def test_aliased_columns_are_refused_in_words() -> None:
    done = estimate(rows_of(AY, AX, AX**2), parse("y ~ poly2 x"))
    assert isinstance(done, Refusal)
    assert "combinations of the rest" in done.seen


@pytest.mark.parametrize("key", ["y ~ level-exp x", "y ~ x^p", "log y ~ x^p", "y ~ power x", "y ~ exponential x"])
def test_searched_constants_settle_where_the_model_is_strongly_curved(key: str) -> None:
    # a bowl, which none of these follows: large residuals make Gauss-Newton steps swing or creep
    rows = read("energy ~ flow", sample("pumps")).rows
    est = estimate(rows, parse(key))
    assert isinstance(est, Estimate)
    step = est.factored.q.T @ est.residual / est.sigma
    # what is left of the step, in standard errors
    np.testing.assert_allclose(step, 0.0, atol=1e-6)


@pytest.mark.parametrize("key", ["y ~ s-curve x", "y ~ gompertz x"])
def test_a_curve_that_runs_away_is_refused(key: str) -> None:
    refusal = estimate(read("energy ~ flow", sample("pumps")).rows, parse(key))
    assert isinstance(refusal, Refusal)
    assert refusal.wrong.startswith("These rows do not settle the constant")


def test_the_reciprocal_plot_is_a_remedy_of_its_own() -> None:
    """1/y on 1/x gives Vm 10.841757 and K 3.173362 for the curve Vm x / (K + x): other weights of the rows, so other
    numbers than the curve's own least squares (Lineweaver and Burk 1934; independent computation)."""
    y = np.array([2.6, 4.1, 5.4, 6.2, 6.5, 7.2, 7.9, 8.3, 8.6, 8.7, 9.1, 9.2])
    est = fit(y, AX, "1/y ~ 1/x")
    np.testing.assert_allclose([1 / est.coef[0], est.coef[1] / est.coef[0]], [10.841757, 3.173362], rtol=1e-6)
