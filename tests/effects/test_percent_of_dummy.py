"""Percent readings of a yes/no predictor of a logged response."""

from __future__ import annotations

import numpy as np
import pytest
from data import A_D, A_X, A_Y
from scipy import stats
from scipy.special import hyp0f1

from batten.effects.percent import percent_of_dummy, ratio_of_means


def reading(X, z):
    b = np.linalg.lstsq(X, z, rcond=None)[0]
    df = len(z) - X.shape[1]
    s2 = np.sum((z - X @ b) ** 2) / df
    se = np.sqrt(s2 * np.linalg.inv(X.T @ X)[-1, -1])
    return percent_of_dummy(float(b[-1]), float(se), df=df, critical=float(stats.t.ppf(0.975, df)))


def test_readings_of_the_nearly_straight_set():
    """Halvorsen and Palmquist 1980; Kennedy 1981; van Garderen and Shah 2002; values computed apart."""
    found = reading(np.column_stack([np.ones(12), A_X, A_D]), np.log(A_Y))
    assert found.plain == pytest.approx(36.861585, rel=1e-6)
    assert (found.low, found.high) == pytest.approx((-5.987210, 99.239841), rel=1e-6)
    assert found.kennedy == pytest.approx(34.988627, rel=1e-6)
    assert found.exact == pytest.approx(34.986290, rel=1e-6)
    assert found.std_error_approximate == pytest.approx(22.255862, rel=1e-6)
    assert found.std_error_exact == pytest.approx(22.352713, rel=1e-6)


def test_the_exact_reading_is_unbiased_and_so_is_its_variance():
    """300,000 seeded coefficients and errors at 8 degrees of freedom, true effect 35%: a form that circulates without
    the degrees of freedom misses by several points, the plain one too."""
    rng = np.random.default_rng(0)
    truth, df, true_se, count = 0.35, 8, 0.4, 300_000
    b = np.log1p(truth) + true_se * rng.standard_normal(count)
    v = true_se**2 * rng.chisquare(df, count) / df
    sample = [percent_of_dummy(float(b[i]), float(np.sqrt(v[i])), df=df, critical=2.3).exact for i in range(2000)]
    every = 100 * (np.exp(b) * hyp0f1(df / 2, -df / 4 * v) - 1)
    assert sample == pytest.approx(every[:2000], rel=1e-10)
    assert every.mean() == pytest.approx(35.0, abs=3 * every.std() / np.sqrt(count))
    assert 100 * np.expm1(b).mean() > 40
    variances = [percent_of_dummy(float(b[i]), float(np.sqrt(v[i])), df=df, critical=2.3).std_error_exact ** 2
                 for i in range(20_000)]  # fmt: skip
    assert np.mean(variances) == pytest.approx(every.var(), rel=0.05)


def test_with_uneven_spread_the_ratio_of_means_is_not_that_of_medians():
    """Manning 1998: factors 1.036555 and 1.023225 turn exp(b) 1.368616 into 1.351015; values computed apart."""
    X, z = np.column_stack([np.ones(12), A_X, A_D]), np.log(A_Y)
    b = np.linalg.lstsq(X, z, rcond=None)[0]
    assert np.exp(b[2]) == pytest.approx(1.368616, rel=1e-6)
    assert ratio_of_means(float(b[2]), z - X @ b, A_D) == pytest.approx(1.351015, rel=1e-6)


def test_with_many_rows_the_exact_forms_are_the_approximate_ones():
    found = percent_of_dummy(0.3, 0.25, df=10**7, critical=1.96)
    assert found.exact == pytest.approx(found.kennedy, rel=1e-5)
    assert found.std_error_exact == pytest.approx(found.std_error_approximate, rel=1e-5)


@pytest.mark.parametrize("se", [0.05, 0.3, 1.2])
def test_the_exact_forms_go_on_smoothly_where_the_general_function_stops(se):
    """scipy's 0F1 gives NaN at a thousand rows; the series takes over at 100 and agrees with it there."""
    assert np.isnan(hyp0f1(500, -500 * se**2 / 2))
    near = [percent_of_dummy(0.3, se, df=df, critical=2.0) for df in (99, 100, 101, 102)]
    steps = np.diff([(f.exact, f.std_error_exact) for f in near], axis=0)
    assert steps[1] == pytest.approx((steps[0] + steps[2]) / 2, rel=1e-3)
    assert all(np.isfinite(percent_of_dummy(0.3, se, df=df, critical=2.0).std_error_exact) for df in (1, 997, 10**6))


def test_a_coefficient_without_error_needs_no_correction():
    found = percent_of_dummy(np.log(1.5), 0.0, df=20, critical=2.09)
    assert (found.plain, found.kennedy, found.exact) == pytest.approx((50, 50, 50))
    assert (found.std_error_exact, found.std_error_approximate) == (0, 0)
