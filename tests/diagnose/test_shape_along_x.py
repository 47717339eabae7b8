"""Harvey-Collier and rainbow: order-free versions against general libraries and exact identities."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.stats.diagnostic import linear_harvey_collier, linear_rainbow, recursive_olsresiduals
from two_sets import A_X, A_Y, B_X, B_Y, line, residuals, shuffled

from batten.diagnose.tests_along_x import harvey_collier, rainbow, recursive_residuals
from batten.families.shapes.spline import Spline


def test_harvey_collier_of_the_nearly_straight_set():
    """Harvey and Collier 1977; values computed apart."""
    found = harvey_collier(line(A_X), A_Y, along=A_X)
    assert len(found.residuals) == 10
    assert np.sum(found.residuals**2) == pytest.approx(207.729351, rel=1e-8)
    assert (found.statistic, found.df) == (pytest.approx(0.957424, rel=1e-5), 9)
    assert found.p == pytest.approx(0.363364, rel=1e-5)


def test_recursive_residuals_are_those_of_statsmodels():
    X = line(A_X, np.sqrt(A_X))
    theirs = recursive_olsresiduals(sm.OLS(A_Y, X).fit(), skip=3, alpha=0.95)[4]
    # their recursion updates an inverse and keeps fewer digits
    assert recursive_residuals(X, A_Y) == pytest.approx(theirs[3:], rel=1e-8)


def test_harvey_collier_agrees_with_statsmodels_at_three_columns():
    """Theirs skips three rows whatever the number of columns is, so it is right for three only."""
    X = line(A_X, np.sqrt(A_X))
    t, p = linear_harvey_collier(sm.OLS(A_Y, X).fit())
    found = harvey_collier(X, A_Y, along=A_X)
    assert (found.statistic, found.p) == pytest.approx((t, p), rel=1e-7)


def test_recursive_residuals_by_refitting_every_prefix():
    X = line(A_X, np.sqrt(A_X), A_X % 3)
    for r, found in zip(range(4, 12), recursive_residuals(X, A_Y), strict=True):
        b = np.linalg.lstsq(X[:r], A_Y[:r], rcond=None)[0]
        scale = np.sqrt(1 + X[r] @ np.linalg.solve(X[:r].T @ X[:r], X[r]))
        assert found == pytest.approx((A_Y[r] - X[r] @ b) / scale, rel=1e-9)


@pytest.mark.parametrize(("n", "degree"), [(200, 1), (2000, 2), (2000, 3), (300, 5)])
def test_there_are_n_less_p_recursive_residuals_and_their_squares_sum_to_the_rss(n, degree):
    rng = np.random.default_rng(n + degree)
    x = np.sort(rng.uniform(0, 10, n))
    X = np.vander(x - 5, degree + 1, increasing=True)
    z = x + rng.normal(size=n)
    found = recursive_residuals(X, z)
    assert len(found) == n - degree - 1
    assert np.sum(found**2) == pytest.approx(np.sum(residuals(X, z) ** 2), rel=1e-10)


def test_a_category_that_begins_late_takes_one_row_to_learn():
    """Five columns with dummies: the first rows are no full-rank start, yet exactly p rows have no residual."""
    rng = np.random.default_rng(5)
    x = np.sort(rng.uniform(0, 10, 60))
    late, few = (x > 7).astype(float), (np.arange(60) % 7 == 3).astype(float)
    X, z = line(x, late, few, few * x), rng.normal(size=60)
    found = recursive_residuals(X, z)
    assert len(found) == 55
    assert np.sum(found**2) == pytest.approx(np.sum(residuals(X, z) ** 2), rel=1e-12)
    assert harvey_collier(X, z, along=x).df == 54


def test_columns_that_begin_almost_at_rest_do_not_break_the_recursion():
    """A spline's bends are near nought over the first rows, so later rows reach a million times beyond them."""
    rng = np.random.default_rng(0)
    x = np.sort(rng.uniform(1, 9, 120))
    spline = Spline(5)
    X, z = line(x, *spline.columns(x, spline.learn(x))[:, 1:].T), np.exp(0.3 * x) + rng.normal(0, 0.2, 120)
    found = recursive_residuals(X, z)
    Q = np.linalg.qr(X / np.linalg.norm(X, axis=0))[0]
    e = z - Q @ (Q.T @ z)
    assert len(found) == 120 - 5
    assert found @ found == pytest.approx(e @ e, rel=1e-6)  # the first of them carry the rounding of tiny columns


def test_harvey_collier_sorts_by_the_focal_predictor_itself():
    rows = shuffled(12, 1)
    assert harvey_collier(line(A_X[rows]), A_Y[rows], along=A_X[rows]).p == pytest.approx(
        harvey_collier(line(A_X), A_Y, along=A_X).p, rel=1e-10
    )


def test_which_repeat_is_stored_first_does_not_matter():
    rows = shuffled(16, 2)
    there, here = (harvey_collier(line(x), y, along=x) for x, y in ((B_X[rows], B_Y[rows]), (B_X, B_Y)))
    assert here.df == 13
    assert there.statistic == pytest.approx(here.statistic, rel=1e-10)


def test_with_repeats_p_is_still_uniform_under_a_straight_line():
    """Kolmogorov-Smirnov on 200 seeded samples with every x stored three times and a category."""
    rng = np.random.default_rng(8)
    x, g = np.repeat(np.arange(8.0), 3), np.tile([0.0, 1.0, 1.0], 8)
    p = [harvey_collier(line(x, g), 2 + x + rng.normal(size=24), along=x).p for _ in range(200)]
    assert stats.kstest(p, "uniform").pvalue > 0.01


def test_a_curve_that_bends_upward_has_a_positive_mean_recursive_residual():
    up = harvey_collier(line(A_X), A_X**2, along=A_X)
    down = harvey_collier(line(A_X), -(A_X**2), along=A_X)
    assert up.mean > 0 > down.mean
    assert up.p == pytest.approx(down.p, rel=1e-9)


def test_weights_whiten_the_recursion():
    w = np.tile([1.0, 4.0, 0.5], 4)
    whole = harvey_collier(line(A_X), A_Y, along=A_X, weights=w)
    by_hand = recursive_residuals(line(A_X) * np.sqrt(w)[:, None], A_Y * np.sqrt(w))
    assert whole.residuals == pytest.approx(by_hand, rel=1e-10)


def test_no_harvey_collier_without_two_recursive_residuals_or_without_error():
    assert harvey_collier(line(A_X[:3]), A_Y[:3], along=A_X[:3]) is None
    assert harvey_collier(line(A_X), 1 + 2 * A_X, along=A_X) is None


def test_rainbow_of_the_nearly_straight_set():
    """Utts 1982; value computed apart. Central rows: x from 4 to 12."""
    found = rainbow(line(A_X), A_Y)
    assert (found.df, found.rows) == ((6, 4), 6)
    assert found.statistic == pytest.approx(4.896942, rel=1e-6)
    assert found.p == pytest.approx(0.073004, rel=1e-5)


def test_rainbow_agrees_with_statsmodels_where_stored_order_is_the_order_of_x():
    theirs = linear_rainbow(sm.OLS(A_Y, line(A_X)).fit())
    assert (rainbow(line(A_X), A_Y).statistic, rainbow(line(A_X), A_Y).p) == pytest.approx(theirs, rel=1e-10)


def test_rainbow_does_not_follow_the_stored_order():
    """The general library's default answers 0.07 or 0.21 for one set of data, by the order of its rows."""
    for seed in range(5):
        rows = shuffled(12, seed)
        assert rainbow(line(A_X[rows]), A_Y[rows]).p == pytest.approx(0.0730045, rel=1e-6)


def test_rows_tied_at_the_edge_of_the_middle_belong_to_it():
    """Twelve rows at six places: leverage ties in pairs and by symmetry; any order gives the same centre."""
    x = np.repeat([-3.0, -2, -1, 1, 2, 3], 2)
    y = x**2 + np.sin(np.arange(12))
    found = rainbow(line(x), y)
    assert found.rows == 8
    rows = shuffled(12, 4)
    assert rainbow(line(x[rows]), y[rows]).p == pytest.approx(found.p, rel=1e-10)


def test_rainbow_sizes_are_residual_sds_in_units_of_the_response():
    found = rainbow(line(A_X), A_Y)
    assert found.sd_all == pytest.approx(np.sqrt(np.sum(residuals(line(A_X), A_Y) ** 2) / 10), rel=1e-12)
    middle = slice(3, 9)
    left = residuals(line(A_X[middle]), A_Y[middle])
    assert found.sd_centre == pytest.approx(np.sqrt(left @ left / 4), rel=1e-12)


def test_no_rainbow_without_a_middle():
    assert rainbow(line(A_X[:4]), A_Y[:4]) is None
    assert rainbow(line(np.array([0.0, 0, 0, 1, 1, 1])), A_Y[:6]) is None
