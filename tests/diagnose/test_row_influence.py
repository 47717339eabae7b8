"""Which rows decide: closed forms against leaving rows out and refitting."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats
from two_sets import A_X, A_Y, B_X, B_Y, line, residuals

from batten.diagnose.influence import dfbeta, gaps_without, loo_log_scores, power_pull, preference
from batten.engine.power import Power, best_power


def scores(X, z, log_jacobian):
    e = residuals(X, z)
    df = len(z) - X.shape[1]
    h = np.sum(np.linalg.qr(X)[0] ** 2, axis=1)
    return loo_log_scores(e, h, s2=e @ e / df, df=df, log_jacobian=log_jacobian)


LOG = scores(line(A_X), np.log(A_Y), -np.log(A_Y))
LEVEL = scores(line(A_X), A_Y, np.zeros(12))


def test_log_scores_of_level_and_log():
    """Proper scores in units of y (Gneiting and Raftery 2007); totals computed apart and by brute force."""
    assert LOG.sum() == pytest.approx(-35.253287, rel=1e-6)
    assert LEVEL.sum() == pytest.approx(-39.650862, rel=1e-6)


def test_log_scores_are_those_of_refits_without_the_row():
    for i in range(12):
        rest = np.arange(12) != i
        fit = sm.OLS(np.log(A_Y[rest]), line(A_X)[rest]).fit()
        row = line(A_X)[i]
        spread = np.sqrt(fit.scale + row @ fit.cov_params() @ row)
        density = stats.t.logpdf((np.log(A_Y[i]) - row @ fit.params) / spread, fit.df_resid) - np.log(spread)
        assert LOG[i] == pytest.approx(density - np.log(A_Y[i]), rel=1e-10)


def test_preference_for_the_log_hangs_on_the_last_row():
    """Total 4.397575, without row 12 1.847713; mean 0.366465, paired standard error 0.303635."""
    found = preference(LOG, LEVEL)
    assert found.total == pytest.approx(4.397575, rel=1e-6)
    assert (found.row, found.without) == (11, pytest.approx(1.847713, rel=1e-6))
    assert found.mean == pytest.approx(0.366465, rel=1e-5)
    assert found.std_error == pytest.approx(0.303635, rel=1e-5)


def test_preference_seen_from_the_other_remedy_names_the_same_row():
    found = preference(LEVEL, LOG)
    assert (found.total, found.row) == (pytest.approx(-4.397575, rel=1e-6), 11)
    assert found.without == pytest.approx(-1.847713, rel=1e-6)


def test_a_row_without_a_score_is_left_out_of_the_preference():
    gap = np.array([0.5, np.nan, 0.2, -0.1])
    found = preference(gap, np.zeros(4))
    assert (found.total, found.row) == (pytest.approx(0.6), 0)
    assert found.mean == pytest.approx(0.2)
    assert preference(np.array([1.0, np.nan]), np.zeros(2)) is None


def test_constructed_variable_of_the_nearly_straight_set():
    """Atkinson 1973, 1985; values computed apart."""
    found = power_pull(line(A_X), A_Y)
    assert found.coefficient == pytest.approx(0.500141, rel=1e-6)
    assert found.t == pytest.approx(4.982164, rel=1e-6)
    assert found.power == pytest.approx(0.499859, rel=1e-6)


def test_constructed_variable_is_a_column_added_to_the_design():
    w = A_Y * (np.log(A_Y / stats.gmean(A_Y)) - 1)
    theirs = sm.OLS(A_Y, line(A_X, w)).fit()
    found = power_pull(line(A_X), A_Y)
    assert (found.coefficient, found.t) == pytest.approx((theirs.params[2], theirs.tvalues[2]), rel=1e-9)
    assert np.polyfit(found.constructed, found.response, 1)[0] == pytest.approx(found.coefficient, rel=1e-9)


def test_quick_power_without_each_row_is_the_refit_with_the_same_constructed_variable():
    w = A_Y * (np.log(A_Y / stats.gmean(A_Y)) - 1)
    found = power_pull(line(A_X), A_Y)
    for i in range(12):
        rest = np.arange(12) != i
        b = np.linalg.lstsq(line(A_X, w)[rest], A_Y[rest], rcond=None)[0]
        assert found.without[i] == pytest.approx(1 - b[2], rel=1e-9)


#: lambda of y on x by profile likelihood without each row (Box and Cox 1964), computed apart
LAMBDA_WITHOUT = np.array(
    [0.386399, 0.469884, 0.459034, 0.447067, 0.467927, 0.421491, 0.443180, 0.401945, 0.476241, 0.443579, 0.513223,
     0.560313]
)  # fmt: skip


def test_lambda_without_each_row_by_the_engine():
    power = Power(lambda y, lam: (y**lam - 1) / lam, lambda y, lam: (lam - 1) * np.log(y), -3.0, 3.0)
    for i in range(12):
        rest = np.arange(12) != i
        found, inside = best_power(power, A_Y[rest], np.linalg.qr(line(A_X)[rest])[0], start=0.45)
        assert inside
        assert found == pytest.approx(LAMBDA_WITHOUT[i], rel=1e-5)


def test_rows_that_pull_the_quick_power_pull_the_likelihood_too():
    """The quick form is one step from lambda 1, so only the order is compared, and the two rows that pull most."""
    quick = power_pull(line(A_X), A_Y).without
    assert stats.spearmanr(quick, LAMBDA_WITHOUT).statistic > 0.6
    assert set(np.argsort(quick)[-2:]) == set(np.argsort(LAMBDA_WITHOUT)[-2:]) == {10, 11}


def test_constructed_variable_needs_responses_above_zero():
    assert power_pull(line(A_X), A_Y - 3) is None
    assert power_pull(line(A_X), np.full(12, 4.0)) is None


def test_bend_without_each_row():
    """Quadratic coefficient over deletions: 0.182769 to 0.213808, and each by refitting."""
    X = line(B_X, B_X**2)
    b = np.linalg.lstsq(X, B_Y, rcond=None)[0]
    without = b[2] - dfbeta(X, residuals(X, B_Y), [2])[:, 0]
    assert (without.min(), without.max()) == (pytest.approx(0.182769, rel=1e-5), pytest.approx(0.213808, rel=1e-5))
    for i in range(16):
        rest = np.arange(16) != i
        assert without[i] == pytest.approx(np.linalg.lstsq(X[rest], B_Y[rest], rcond=None)[0][2], rel=1e-9)


def test_dfbeta_is_that_of_statsmodels_in_any_units():
    X = line(A_X, 1e4 * A_X**2)
    theirs = sm.OLS(A_Y, X).fit().get_influence().dfbeta
    assert dfbeta(X, residuals(X, A_Y), [2, 0]) == pytest.approx(theirs[:, [2, 0]], rel=1e-7)


def test_a_row_that_owns_a_parameter_has_no_fit_without_it():
    own = (np.arange(12) == 3).astype(float)
    X = line(A_X, own)
    changes = dfbeta(X, residuals(X, A_Y), [1])[:, 0]
    assert np.flatnonzero(np.isnan(changes)).tolist() == [3]
    found = scores(X, A_Y, np.zeros(12))
    assert np.flatnonzero(np.isnan(found)).tolist() == [3]
    assert np.flatnonzero(np.isnan(power_pull(X, A_Y).without)).tolist() == [3]


def test_the_gap_between_two_fits_without_each_row_is_that_of_refits():
    X0, extra = line(B_X), (B_X**2)[:, None]
    found = gaps_without(X0, extra, B_Y)
    for i in range(len(B_Y)):
        keep = np.arange(len(B_Y)) != i
        fits = [X @ np.linalg.lstsq(X[keep], B_Y[keep], rcond=None)[0] for X in (np.hstack([X0, extra]), X0)]
        assert found[i] == pytest.approx(np.abs(fits[0] - fits[1]).max(), rel=1e-9)


def test_no_gap_without_a_row_that_owns_a_parameter():
    own = (np.arange(12) == 3).astype(float)
    found = gaps_without(line(A_X, own), (A_X**2)[:, None], A_Y)
    assert np.isnan(found[3])
    assert np.isfinite(np.delete(found, 3)).all()
