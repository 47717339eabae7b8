"""Retransformed means, medians and their uncertainty against independent computations."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from check_data import AD, AX, AY, DX, DY, rows_of

from batten.families import parse
from batten.fit.averaged import interval
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means
from batten.fit.predict import new_row_interval, predict, total
from batten.fit.slopes import average_slope
from batten.fit.smear import mean_of, row_means

ONE = np.ones((1, 1))
TEN = np.array([10.0])


def fit(y: np.ndarray, x: np.ndarray, key: str, *covariates: np.ndarray) -> Estimate:
    done = estimate(rows_of(y, x, *covariates), parse(key))
    assert isinstance(done, Estimate)
    return done


@pytest.mark.parametrize(
    ("key", "mean"), [("log y ~ x", 14.741279), ("sqrt y ~ x", 17.442107), ("1/y ~ 1/x", 17.494110), ("y ~ x", 19.6867)]
)
def test_the_mean_is_the_average_over_residuals(key: str, mean: float) -> None:
    """Smearing (Duan 1983); independent computation. The last value is the line's own prediction."""
    done = fit(AY, AX, key)
    got = averaged_means(done, TEN).value[0]
    want = mean if key != "y ~ x" else done.coef @ [1, 10]
    assert got == pytest.approx(want, abs=1e-6)


def test_logit_mean_agrees_with_the_average() -> None:
    got = averaged_means(fit(DY, DX, "logit(0,1) y ~ x"), np.array([5.0])).value[0]
    assert got == pytest.approx(0.303952, abs=1e-6)


def test_jackknife_and_influence_errors_of_a_smeared_mean() -> None:
    """At x = 10: jackknife 1.386630 (log scale 0.093626), HC3-type influence 1.197474 (independent computation)."""
    done = fit(AY, AX, "log y ~ x")
    left_out = averaged_means(done, TEN)
    assert left_out.error[0] == pytest.approx(1.386630, abs=1e-6)
    assert left_out.log().error[0] == pytest.approx(0.093626, abs=1e-6)
    assert averaged_means(done, TEN, jackknife=False).error[0] == pytest.approx(1.197474, abs=1e-6)


@pytest.mark.parametrize("key", ["log y ~ x", "sqrt y ~ log x", "log y ~ poly2 x"])
def test_left_out_values_equal_brute_force_refits(key: str) -> None:
    done = fit(AY, AX, key, AD)
    got = averaged_means(done, np.array([4.0, 11.0])).left_out
    assert got is not None
    for i in range(len(AY)):
        rest = np.arange(len(AY)) != i
        again = fit(AY[rest], AX[rest], key, AD[rest])
        np.testing.assert_allclose(got[i], averaged_means(again, np.array([4.0, 11.0])).value, rtol=1e-9)


@pytest.mark.parametrize("key", ["log y ~ x", "sqrt y ~ x", "boxcox y ~ x", "loglink y ~ x", "y ~ x"])
def test_influence_equals_the_numerical_derivative_in_a_repeated_row(key: str) -> None:
    """Among 600 rows, one further copy of a row moves the mean by its influence over n, to first order."""
    rng = np.random.default_rng(8)
    x = rng.uniform(1, 6, 600)
    g = rng.integers(0, 2, 600).astype(float)
    y = np.exp(0.4 * x + 0.2 * g + rng.normal(0, 0.3, 600))
    done = fit(y, x, key, g)
    places = np.array([3.0])
    here = averaged_means(done, places, jackknife=False)
    for i in (5, 100, 599):
        twice = np.append(np.arange(600), i)
        again = averaged_means(fit(y[twice], x[twice], key, g[twice]), places, jackknife=False).value
        # HC3-type roots carry 1/(1-h) on the coefficient part; h is about 0.005 here, so the remainder stays under 3%
        assert again[0] - here.value[0] == pytest.approx(here.root[i, 0], rel=0.03, abs=2e-5 * abs(here.value[0]))


def test_average_slope_of_a_log_fit() -> None:
    """b S mean(exp(eta)) = 2.692910 with covariate d (independent computation)."""
    assert average_slope(fit(AY, AX, "log y ~ x", AD)).value[0] == pytest.approx(2.692910, abs=1e-6)


def test_average_slope_of_a_share_link() -> None:
    assert average_slope(fit(DY, DX, "share y ~ x")).value[0] == pytest.approx(0.074553, abs=1e-6)


def test_new_row_interval_under_constant_errors_is_the_mapped_t_interval() -> None:
    """At x = 10, 95%: 6.739073 to 29.727091 (independent computation)."""
    low, high = new_row_interval(fit(AY, AX, "log y ~ x"), TEN, ONE, ONE, level=0.95, errors="constant")
    np.testing.assert_allclose([low[0], high[0]], [6.739073, 29.727091], atol=1e-6)


def test_new_row_interval_of_a_line_agrees_with_statsmodels() -> None:
    done = fit(AY, AX, "y ~ x")
    want = sm.OLS(AY, sm.add_constant(AX)).fit().get_prediction([[1.0, 10.0]]).summary_frame()
    low, high = new_row_interval(done, TEN, ONE, ONE, level=0.95, errors="constant")
    np.testing.assert_allclose([low[0], high[0]], want[["obs_ci_lower", "obs_ci_upper"]].iloc[0], rtol=1e-10)


def test_robust_new_row_interval_covers_skewed_errors_as_promised() -> None:
    """Signed jackknife+ promises 1 - 2 alpha at least and is usually near 1 - alpha (Barber and others 2021)."""
    rng = np.random.default_rng(0)
    hits = 0
    for _ in range(150):
        x = rng.uniform(1, 5, 61)
        y = np.exp(0.5 * x + rng.gamma(2, 0.3, 61))
        done = fit(y[:60], x[:60], "log y ~ x")
        low, high = new_row_interval(done, x[60:], ONE, ONE, level=0.9, errors="robust")
        hits += int(low[0] <= y[60] <= high[0])
    assert 0.84 <= hits / 150 <= 0.97  # 0.9 with a Monte Carlo error of 0.025


def test_interval_of_a_positive_mean_stays_positive() -> None:
    low, high = interval(averaged_means(fit(AY, AX, "log y ~ x"), np.array([1.0])), 0.999, positive=True)
    assert 0 < low[0] < high[0]


def test_total_counts_shared_and_row_error() -> None:
    done = fit(AY, AX, "y ~ x")
    x = np.array([4.0, 9.0, 15.0])
    got = total(done, x, np.ones((3, 1)), np.ones((3, 1)), errors="constant")
    design = sm.add_constant(x)
    v = sm.OLS(AY, sm.add_constant(AX)).fit().cov_params()
    shared = float(design.sum(axis=0) @ v @ design.sum(axis=0))
    assert got.shared_error == pytest.approx(np.sqrt(shared), rel=1e-9)
    assert got.row_error == pytest.approx(np.sqrt(3) * done.sigma, rel=1e-12)


def test_total_of_the_rows_meets_the_total_of_y_within_its_interval() -> None:
    done = fit(AY, AX, "log y ~ log x")
    got = total(done, AX, np.ones((12, 1)), np.ones((12, 1)))
    assert got.low < AY.sum() < got.high


def test_interpolated_means_agree_with_exact_averages() -> None:
    rng = np.random.default_rng(0)
    eta, e = rng.uniform(1, 6, 700), rng.normal(0, 0.3, 3000)
    for key, c in (("boxcox y", (0.3,)), ("1/y", (1.0,)), ("sqrt y", ())):
        scale = parse(f"{key} ~ x").left
        got = mean_of(scale, [c], eta[None], e[None])[0]  # type: ignore[arg-type]
        want = row_means(lambda z, s=scale, k=c: s.inverse(z, k), eta, e)  # type: ignore[union-attr]
        np.testing.assert_allclose(got, want, rtol=1e-8)


def test_predictions_outside_what_a_scale_can_undo_are_missing_with_words() -> None:
    done = fit(AY[::-1].copy(), AX, "sqrt y ~ x")
    got = predict(done, np.array([5.0, 60.0]), np.ones((2, 1)), np.ones((2, 1)), kind="estimate")
    assert np.isfinite(got.estimate[0])
    assert np.isnan(got.estimate[1])
    assert got.note[1] == "outside what sqrt y can undo"


def test_left_out_values_of_an_estimated_power_follow_refits_that_estimate_it_again() -> None:
    """One step in (coefficients, power): close to refits, not equal; the standard error within a tenth of theirs."""
    rng = np.random.default_rng(4)
    x = rng.uniform(1, 9, 60)
    y = (2 + 1.5 * x + rng.normal(0, 1.0, 60)) ** 2 * 40
    done = fit(y, x, "boxcox y ~ x")
    places = np.array([3.0, 7.0])
    got = averaged_means(done, places)
    assert got.left_out is not None
    brute = []
    for i in range(60):
        rest = np.arange(60) != i
        brute.append(averaged_means(fit(y[rest], x[rest], "boxcox y ~ x"), places).value)
    want = np.sqrt(59 / 60 * ((np.array(brute) - np.mean(brute, axis=0)) ** 2).sum(axis=0))
    np.testing.assert_allclose(got.error, want, rtol=0.1)
    influence = averaged_means(done, places, jackknife=False)
    np.testing.assert_allclose(influence.error, want, rtol=0.15)
