"""Variance weights: weighted fits, their errors, likelihoods and intervals, against refits and general libraries."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import curve_fit, minimize_scalar

from batten.engine.rows import Array, Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means
from batten.fit.predict import predict, total

#: invented for these tests; the values they give were worked out by an independent script
X = np.array([1.0, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20])
Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
W = np.tile([1.0, 1, 2, 2], 3)


def small() -> Rows:
    return Rows(Y, X, np.ones((12, 1)), np.ones((12, 1)), weights=W / W.mean())


def sample(n: int = 80, seed: int = 0) -> Rows:
    rng = np.random.default_rng(seed)
    x, w = rng.uniform(1, 12, n), rng.uniform(0.3, 3, n)
    g = (rng.random(n) < 0.4).astype(float)
    y = 2 + 9 * x / (x + 4) + g + rng.normal(0, 0.6, n) / np.sqrt(w)
    return Rows(y, x, np.column_stack([np.ones(n), g]), np.ones((n, 1)), weights=w / w.mean())


def fitted(rows: Rows, key: str, **held: Any) -> Estimate:
    done = estimate(rows, parse(key), **held)
    assert isinstance(done, Estimate), (key, done)
    return done


def test_a_weighted_line_has_the_published_form_of_likelihood_and_errors() -> None:
    # weighted least squares with Var = s2 / w (Draper and Smith 1998, section 9.2); numbers of an independent script
    est = fitted(small(), "y ~ x")
    np.testing.assert_allclose(est.coef, [-2.969467, 2.341619], rtol=1e-6)
    assert est.sigma**2 * W.mean() == pytest.approx(35.953238, rel=1e-7)
    assert np.sqrt(est.covariance("constant")[1, 1]) == pytest.approx(0.224775, rel=1e-5)
    assert est.log_likelihood == pytest.approx(-35.347206, abs=1e-6)


def test_a_new_row_is_as_wide_as_its_own_weight_says() -> None:
    at = np.array([10.0, 10.0])
    done = predict(
        fitted(small(), "y ~ x"), at, np.ones((2, 1)), np.ones((2, 1)),
        kind="new row", errors="constant", weight=np.array([1.0, 2.0]) / W.mean(),
    )  # fmt: skip
    np.testing.assert_allclose((done.high - done.low) / 2, [13.731012, 9.964633], rtol=1e-6)


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ log x", "sqrt y ~ poly2 x", "y ~ spline4 x", "log y ~ bins4 x"])
def test_linear_remedies_agree_with_weighted_least_squares(key: str) -> None:
    rows = sample()
    est = fitted(rows, key)
    design = est.design_at(rows.x, rows.base, rows.modifier)
    z = est.scale.forward(rows.y, est.c)
    model = sm.WLS(z, design, weights=rows.weights).fit()
    robust = model.get_robustcov_results("HC3")
    np.testing.assert_allclose(est.coef, model.params, rtol=1e-10)
    np.testing.assert_allclose(np.sqrt(np.diagonal(est.covariance("constant"))), model.bse, rtol=1e-10)
    np.testing.assert_allclose(np.sqrt(np.diagonal(est.covariance())), robust.bse, rtol=1e-10)
    jacobian = est.scale.log_jacobian(rows.y, est.c).sum()
    assert est.log_likelihood == pytest.approx(model.llf + jacobian, rel=1e-12)


@pytest.mark.parametrize(
    ("key", "family"),
    [("loglink y ~ x", sm.families.Poisson()), ("loglink-gamma y ~ log x", sm.families.Gamma(sm.families.links.Log()))],
)
@pytest.mark.filterwarnings("ignore::UserWarning")
def test_log_links_agree_with_weighted_glm(key: str, family: Any) -> None:
    rows = sample()
    est = fitted(rows, key)
    design = est.design_at(rows.x, rows.base, rows.modifier)
    model = sm.GLM(rows.y, design, family=family, var_weights=rows.weights).fit(tol=1e-14, maxiter=200)
    np.testing.assert_allclose(est.coef, model.params, rtol=1e-9)
    np.testing.assert_allclose(est.sigma**2, model.pearson_chi2 / model.df_resid, rtol=1e-9)
    # all heteroscedasticity-consistent kinds of GLM are the first-order one
    first = est.moves(leave_out=False)
    np.testing.assert_allclose(np.sqrt((first**2).sum(axis=0)), _sandwich(model), rtol=1e-8)


def _sandwich(model: Any) -> Array:
    score = model.model.score_factor(model.params, scale=1.0)[:, None] * model.model.exog
    bread = np.linalg.inv(-model.model.hessian(model.params, scale=1.0, observed=False))
    return np.asarray(np.sqrt(np.diagonal(bread @ score.T @ score @ bread)))


def test_a_weighted_curve_agrees_with_scipy() -> None:
    rows = sample()
    plain = replace(rows, base=np.ones((rows.count, 1)))
    est = fitted(plain, "y ~ level-hyp x")
    found, cov = curve_fit(
        lambda x, top, half: top * x / (half + x), plain.x, plain.y, p0=(10, 4),
        sigma=1 / np.sqrt(np.asarray(plain.weights)), xtol=1e-14, ftol=1e-14,
    )  # fmt: skip
    np.testing.assert_allclose([*est.coef, *est.theta], found, rtol=1e-7)
    np.testing.assert_allclose(est.covariance("constant"), cov, rtol=1e-5)


def test_the_power_of_y_maximises_the_weighted_likelihood() -> None:
    rows = sample()
    est = fitted(rows, "boxcox y ~ x")
    design = np.column_stack([np.ones(rows.count), rows.base[:, 1], rows.x])

    def loss(power: float) -> float:
        model = sm.WLS((rows.y**power - 1) / power, design, weights=rows.weights).fit()
        return -float(model.llf + (power - 1) * np.log(rows.y).sum())

    best = minimize_scalar(loss, bounds=(0.2, 3), method="bounded", options={"xatol": 1e-10})
    assert est.c[0] == pytest.approx(best.x, abs=1e-6)
    assert est.log_likelihood == pytest.approx(-best.fun, rel=1e-9)


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ poly2 x", "y ~ spline4 x"])
def test_left_out_rows_move_a_weighted_fit_as_refits_do(key: str) -> None:
    rows = sample(40)
    est = fitted(rows, key)
    for i in (0, 17, 39):
        kept = np.delete(np.arange(40), i)
        columns = est.design_at(rows.x, rows.base, rows.modifier)
        again = sm.WLS(est.scale.forward(rows.y, est.c)[kept], columns[kept], weights=np.asarray(rows.weights)[kept])
        np.testing.assert_allclose(est.coef + est.moves()[i], again.fit().params, rtol=1e-9)


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "boxcox y ~ x", "y ~ hinge x", "loglink y ~ x", "log y ~ x^p"])
def test_equal_weights_are_no_weights(key: str) -> None:
    rows = sample()
    with_ones, without = (fitted(replace(rows, weights=w), key) for w in (np.ones(rows.count), None))
    np.testing.assert_allclose(with_ones.coef, without.coef, rtol=1e-9)
    np.testing.assert_allclose(with_ones.covariance(), without.covariance(), rtol=1e-6)
    places = np.array([2.0, 7.0])
    one, two = (averaged_means(est, places) for est in (with_ones, without))
    np.testing.assert_allclose(one.value, two.value, rtol=1e-9)
    np.testing.assert_allclose(one.error, two.error, rtol=1e-6)


def test_the_mean_brought_back_from_logs_smears_the_residuals_of_a_row_of_average_weight() -> None:
    # with variance weights the smearing residuals are e_j sqrt(w_j) / sqrt(w_0) (Duan 1983, for uneven variances)
    rows = sample()
    est = fitted(rows, "log y ~ x")
    design = est.design_at(rows.x, rows.base, rows.modifier)
    e = np.log(rows.y) - design @ est.coef
    new = np.array([1.0, 0.0, 5.0])
    expected = np.exp(new @ est.coef + e * np.sqrt(np.asarray(rows.weights))).mean()
    got = predict(est, np.array([5.0]), np.array([[1.0, 0.0]]), np.ones((1, 1))).estimate[0]
    assert got == pytest.approx(expected, rel=1e-12)


def test_a_total_counts_each_rows_own_variance_and_amount() -> None:
    est = fitted(small(), "y ~ x")
    ones, amount, weight = np.ones((2, 1)), np.array([3.0, 2.0]), np.array([0.5, 4.0])
    t = total(est, np.array([4.0, 9.0]), ones, ones, amount=amount, weight=weight)
    mean = est.coef[0] + est.coef[1] * np.array([4.0, 9.0])
    assert t.estimate == pytest.approx(amount @ mean, rel=1e-12)
    assert t.row_error == pytest.approx(est.sigma * np.sqrt((amount**2 / weight).sum()), rel=1e-12)
    pull = amount @ np.array([[1.0, 4.0], [1.0, 9.0]])
    assert t.shared_error == pytest.approx(np.sqrt(pull @ est.covariance() @ pull), rel=1e-10)
