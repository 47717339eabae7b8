"""The span effect of each remedy: one estimand, with the interval that belongs to it."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from data import A_D, A_X, A_Y, fitted, rows_of
from scipy.stats import t as student

from batten.effects.contrast import NO_ANSWER, span_effect

A = rows_of(A_X, A_Y, A_D)


@pytest.mark.parametrize(("errors", "cov"), [("constant", "nonrobust"), ("robust", "HC3")])
def test_the_straight_lines_difference_is_its_slope_times_the_span_with_the_same_interval(errors, cov):
    model = sm.OLS(A_Y, np.column_stack([np.ones(12), A_D, A_X]))
    theirs = model.fit() if cov == "nonrobust" else model.fit(cov_type=cov, use_t=True)
    found = span_effect(fitted("y ~ x", A), (5, 10), errors=errors)
    low, high = theirs.conf_int()[2]
    got = found.difference
    np.testing.assert_allclose([got.estimate, got.low, got.high], [5 * theirs.params[2], 5 * low, 5 * high], rtol=1e-10)
    assert found.span_slope.estimate == pytest.approx(theirs.params[2], rel=1e-12)


def test_under_log_y_the_ratio_of_means_is_exact_and_asymmetric():
    """exp(b (b - a)) and its ends: smearing cancels in a ratio (Duan 1983; Halvorsen and Palmquist 1980)."""
    theirs = sm.OLS(np.log(A_Y), np.column_stack([np.ones(12), A_D, A_X])).fit()
    ends = 5 * theirs.conf_int()[2]
    found = span_effect(fitted("log y ~ x", A), (5, 10), errors="constant").ratio
    np.testing.assert_allclose(
        [found.estimate, found.low, found.high], np.exp([5 * theirs.params[2], *ends]), rtol=1e-8
    )
    assert found.high - found.estimate > found.estimate - found.low


def test_under_log_y_the_difference_uses_the_smearing_factor_and_the_rows_given():
    """Computed apart: S (e^eta(10) - e^eta(5)) at d = 0, S = mean(e^e) (Duan 1983)."""
    reference = np.array([[1.0, 0.0]]), np.ones((1, 1))
    found = span_effect(fitted("log y ~ x", A), (5, 10), base=reference[0], modifier=reference[1])
    assert found.difference.estimate == pytest.approx(6.363214, abs=5e-7)
    assert found.ratio.estimate == pytest.approx(2.053721, abs=5e-7)


def test_averages_run_over_the_rows_own_covariates():
    z = np.log(A_Y)
    X = np.column_stack([np.ones(12), A_D, A_X])
    b = np.linalg.lstsq(X, z, rcond=None)[0]
    smear = np.exp(z - X @ b).mean()
    at = [np.mean(np.exp(b[0] + b[1] * A_D + b[2] * x)) * smear for x in (5, 10)]
    found = span_effect(fitted("log y ~ x", A), (5, 10))
    np.testing.assert_allclose([found.at_a.estimate, found.at_b.estimate], at, rtol=1e-12)
    assert found.difference.estimate == pytest.approx(at[1] - at[0], rel=1e-12)


def test_the_median_of_log_y_leaves_the_smearing_factor_out():
    z = np.log(A_Y)
    X = np.column_stack([np.ones(12), A_D, A_X])
    e = z - X @ np.linalg.lstsq(X, z, rcond=None)[0]
    est = fitted("log y ~ x", A)
    mean, median = (span_effect(est, (5, 10), of=of) for of in ("mean", "median"))
    factor = np.exp(np.median(e)) / np.exp(e).mean()
    assert median.difference.estimate == pytest.approx(mean.difference.estimate * factor, rel=1e-12)


def test_both_ends_in_one_group_give_no_number_but_words():
    est = fitted("y ~ bins(11, 16) x", A)
    found = span_effect(est, (4, 10))
    assert found.note == NO_ANSWER
    assert not found.difference.defined
    assert found.ratio.note == NO_ANSWER
    assert span_effect(est, (4, 12)).difference.defined


def test_no_ratio_where_an_interval_reaches_zero():
    found = span_effect(fitted("y ~ x", rows_of(A_X, A_Y - 12)), (5, 10))
    assert found.difference.defined
    assert not found.ratio.defined
    assert found.ratio.note == "no ratio: the interval of a mean reaches zero"


def test_a_span_the_shape_cannot_take_is_named():
    found = span_effect(fitted("y ~ log x", A), (-1, 10))
    assert found.note == "log x cannot be taken at -1"


def test_turning_the_span_round_changes_the_sign_and_keeps_the_slope():
    est = fitted("log y ~ log x", A)
    up, down = span_effect(est, (5, 10)), span_effect(est, (10, 5))
    np.testing.assert_allclose(
        [down.difference.estimate, down.difference.low, down.difference.high],
        [-up.difference.estimate, -up.difference.high, -up.difference.low], rtol=1e-12,
    )  # fmt: skip
    assert down.span_slope.low == pytest.approx(up.span_slope.low, rel=1e-12)


def test_the_jackknife_interval_of_a_difference_equals_leaving_rows_out_by_refitting():
    est = fitted("log y ~ x", A)
    found = span_effect(est, (5, 10)).difference
    left = []
    for i in range(12):
        keep = np.arange(12) != i
        left.append(span_effect(fitted("log y ~ x", A.take(keep)), (5, 10)).difference.estimate)
    error = np.sqrt(11 / 12 * np.sum((np.array(left) - np.mean(left)) ** 2))
    half = student.ppf(0.975, 9) * error
    assert found.high - found.estimate == pytest.approx(half, rel=1e-10)


@pytest.mark.parametrize("errors", ["robust", "constant"])
def test_intervals_of_the_mean_difference_cover_a_simulated_truth(errors):
    """log y = 0.3 + 0.2 x + N(0, 0.4^2): the difference of means is exact by the log-normal mean."""
    rng, covered = np.random.default_rng(12), 0
    truth = (np.exp(0.3 + 0.2 * 8) - np.exp(0.3 + 0.2 * 3)) * np.exp(0.08)
    for _ in range(200):
        x = rng.uniform(1, 10, 50)
        found = span_effect(fitted("log y ~ x", rows_of(x, np.exp(0.3 + 0.2 * x + rng.normal(0, 0.4, 50)))), (3, 8),
                            errors=errors).difference  # fmt: skip
        covered += int(found.low <= truth <= found.high)
    # binomial error of 200 runs is 1.5 points; the jackknife runs a little under at n = 50
    assert 0.90 <= covered / 200 <= 0.99


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ log x", "sqrt y ~ poly2 x", "loglink y ~ x", "log y ~ spline4 x"])
def test_the_effect_follows_the_units_and_ignores_the_order_of_rows(key):
    one = span_effect(fitted(key, A), (5, 10))
    order = np.random.default_rng(0).permutation(12)
    mixed = span_effect(fitted(key, A.take(order)), (5, 10))
    scaled = span_effect(fitted(key, rows_of(A_X * 1000, A_Y * 60, A_D)), (5000, 10_000))
    for name in ("estimate", "low", "high"):
        base = getattr(one.difference, name)
        # sums run in another order; links iterate
        assert getattr(mixed.difference, name) == pytest.approx(base, rel=1e-8)
        assert getattr(scaled.difference, name) == pytest.approx(60 * base, rel=1e-7)
        assert getattr(scaled.ratio, name) == pytest.approx(getattr(one.ratio, name), rel=1e-7)
        assert getattr(scaled.span_slope, name) == pytest.approx(0.06 * getattr(one.span_slope, name), rel=1e-7)
