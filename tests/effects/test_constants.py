"""Learned constants: published definitions of their sets, checked apart; pieces and open ends named."""

from __future__ import annotations

import numpy as np
import pytest
from data import A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy import stats
from scipy.optimize import minimize_scalar

from batten.effects.constants import learned_constants
from batten.effects.profile import profile_of_power, profile_of_shape
from batten.effects.rounding import roundest, roundings

A, B = rows_of(A_X, A_Y), rows_of(B_X, B_Y)
MM_Y = np.array([2.6, 4.1, 5.4, 6.2, 6.5, 7.2, 7.9, 8.3, 8.6, 8.7, 9.1, 9.2])
MM = rows_of(A_X, MM_Y)


def test_the_box_cox_power_and_its_interval_are_those_of_the_profile_likelihood():
    """Box and Cox 1964: l >= max - 1.920729, from -n/2 log RSS + (L - 1) sum log y, computed apart."""
    X = np.column_stack([np.ones(12), A_X])

    def level(lam):
        z = (A_Y**lam - 1) / lam
        rss = np.linalg.lstsq(X, z, rcond=None)[1][0]
        return -6 * np.log(rss / 12) + (lam - 1) * np.log(A_Y).sum()

    best = minimize_scalar(lambda v: -level(v), bounds=(0.1, 1), method="bounded", options={"xatol": 1e-10})
    (constant,) = learned_constants(fitted("boxcox y ~ x", A), y="minutes")
    assert constant.name == "power of minutes"
    assert constant.estimate == pytest.approx(best.x, abs=1e-6)
    np.testing.assert_allclose(
        [constant.estimate, constant.low, constant.high], [0.450577, 0.171211, 0.711478], atol=1e-6
    )
    for end in (constant.low, constant.high):
        assert -best.fun - level(end) == pytest.approx(stats.chi2.ppf(0.95, 1) / 2, abs=1e-8)


def test_the_break_and_its_profile_set():
    """RSS <= RSS_min (1 + F / (n - 4)) (Hudson 1966); standard error from nonlinear least squares (Muggeo 2003)."""
    est = fitted("y ~ hinge x", B)
    (constant,) = learned_constants(est, x="kg")
    assert constant.name == "break in kg"
    np.testing.assert_allclose([constant.estimate, constant.low, constant.high], [5.895514, 5.610, 6.267], atol=1.1e-3)
    assert constant.estimate == pytest.approx(5.895514, abs=5e-7)

    def rss(place):
        X = np.column_stack([np.ones(16), B_X, np.maximum(B_X - place, 0)])
        return np.linalg.lstsq(X, B_Y, rcond=None)[1][0]

    limit = rss(constant.estimate) * (1 + stats.f.ppf(0.95, 1, 12) / 12)
    for end in (constant.low, constant.high):
        assert rss(end) == pytest.approx(limit, rel=1e-9)
    assert np.sqrt(est.covariance("constant")[3, 3]) == pytest.approx(0.132240, abs=5e-7)


def test_the_power_of_x_and_its_profile_set():
    (constant, unit) = learned_constants(fitted("y ~ x^p", A), x="kg")
    np.testing.assert_allclose(
        [constant.estimate, constant.low, constant.high], [1.499068, 0.775263, 2.640686], atol=1e-6
    )
    assert (unit.kind, unit.estimate) == ("fixed", 10.0)
    assert np.isnan(unit.low)
    assert "no interval" in unit.note


def test_a_saturating_curves_two_constants_have_profile_sets():
    """K by its profile; the ceiling's set computed apart by fixing it and searching K (Bates and Watts 1988)."""
    est = fitted("y ~ level-hyp x", MM)
    k, ceiling = learned_constants(est, x="kg")
    np.testing.assert_allclose([k.estimate, k.low, k.high], [2.991834, 2.748925, 3.253054], atol=1e-6)
    assert ceiling.estimate == pytest.approx(10.647612, abs=5e-7)

    def rss_with(v):
        return minimize_scalar(
            lambda t: np.sum((MM_Y - v * A_X / (t + A_X)) ** 2),
            bounds=(0.5, 10),
            method="bounded",
            options={"xatol": 1e-12},
        ).fun

    limit = rss_with(ceiling.estimate) * (1 + stats.f.ppf(0.95, 1, 10) / 10)
    for end in (ceiling.low, ceiling.high):
        # a bounded search on a flat minimum gives some eight digits of the RSS
        assert rss_with(end) == pytest.approx(limit, rel=1e-7)


def test_where_the_data_stay_straight_the_curves_constants_are_not_identified():
    straight = rows_of(A_X, 0.4 * A_X + np.array([0.3, -0.3, 0.1, -0.1] * 3))
    k, ceiling = learned_constants(fitted("y ~ level-hyp x", straight, theta=(40.0,)), x="kg")
    assert k.high == np.inf
    assert k.note == "no upper end: not identified by these data"
    assert (ceiling.low, ceiling.high) == (-np.inf, np.inf)
    assert ceiling.note.startswith("not identified by these data")


def test_a_flat_profile_names_no_value():
    noise = rows_of(A_X, 5 + np.array([0.3, -0.3, 0.1, -0.2, 0.15, 0.05] * 2))
    est = fitted("y ~ x^p", noise, theta=(1.0,))
    constant = learned_constants(est, x="kg")[0]
    assert not constant.named
    assert constant.note == "not identified by these data: every value searched fits about as well"
    assert roundings(est, constant, (5, 10)) == ()


def test_two_breaks_keep_their_order_and_say_where_a_set_runs_to_the_end():
    first, second = learned_constants(fitted("y ~ hinge2 x", B), x="kg")
    assert first.estimate < second.estimate
    assert first.low == -np.inf
    assert first.note.startswith("no lower end: the set runs to the end of the data")
    assert second.high == np.inf


def test_a_set_in_pieces_is_shown_in_pieces():
    """Two humps of equal size: a break at either fits about as well, one between does not."""
    x = np.arange(1, 41, dtype=float)
    y = np.interp(x, [1, 10, 20, 30, 40], [0, 9, 9, 9, 18]) + 0.8 * np.sin(np.arange(40) * 2.4)
    constant = learned_constants(fitted("y ~ hinge x", rows_of(x, y)), x="kg")[0]
    assert len(constant.pieces) == 2
    assert "the set comes in 2 pieces" in constant.note
    (_, a), (b, _) = constant.pieces
    assert a < b


@pytest.mark.parametrize("key", ["boxcox y ~ x", "y ~ hinge x", "y ~ x^p"])
def test_sets_do_not_depend_on_row_order_and_follow_the_units(key):
    order = np.random.default_rng(1).permutation(12)
    one = learned_constants(fitted(key, A))[0]
    mixed = learned_constants(fitted(key, A.take(order)))[0]
    # ends are roots of a profile whose sums run in another order
    assert (one.low, one.high) == pytest.approx((mixed.low, mixed.high), rel=1e-7)
    scaled = learned_constants(fitted(key, rows_of(A_X * 1000, A_Y * 60)))[0]
    by = 1000 if key == "y ~ hinge x" else 1
    # the constant itself is found by iteration
    assert (scaled.low, scaled.high) == pytest.approx((one.low * by, one.high * by), rel=1e-5)


def test_a_wider_level_widens_the_set():
    est = fitted("boxcox y ~ x", A)
    narrow, wide = (profile_of_power(est, level=level).pieces[0] for level in (0.8, 0.99))
    assert wide[0] < narrow[0] < narrow[1] < wide[1]


def test_at_many_rows_the_ends_are_found_on_all_of_them():
    rng = np.random.default_rng(2)
    x = rng.uniform(1, 20, 60_000)
    rows = rows_of(x, np.exp(0.1 * x + rng.normal(0, 0.3, len(x))))
    est = fitted("boxcox y ~ x", rows)
    profile = profile_of_power(est)
    error = np.sqrt(est.covariance("constant")[2, 2])
    ((low, high),) = profile.pieces
    # at this n the likelihood is quadratic, so the set is 1.96 standard errors to each side
    np.testing.assert_allclose([est.c[0] - low, high - est.c[0]], 1.96 * error, rtol=0.03)


def test_a_choice_from_a_list_names_the_powers_that_fit_about_as_well():
    constant = learned_constants(fitted("y ~ fp1 x", A), x="kg")[0]
    assert constant.estimate == 2
    assert constant.note == "1 and 2 fit about as well; only these values were tried"


def test_a_perfect_fit_names_the_one_power_that_gives_it():
    (power, *_) = learned_constants(fitted("y ~ fp1 x", rows_of(A_X, 2 + 3 * A_X)))
    assert power.estimate == 1
    assert power.pieces == ((1.0, 1.0),)


def test_knots_edges_and_centres_are_facts_without_interval():
    knots = learned_constants(fitted("y ~ spline4 x", A), x="kg")
    assert [k.name for k in knots] == ["knot 1", "knot 2", "knot 3", "knot 4"]
    assert all(np.isnan(k.low) for k in knots)
    (edge,) = learned_constants(fitted("y ~ bins(9) x", A), x="kg")
    assert (edge.name, edge.estimate) == ("edge 1", 9.0)
    assert learned_constants(fitted("log y ~ x", A)) == ()


def test_rounding_the_power_of_y_shows_its_price():
    """0.5 costs 0.07 in log-likelihood, the log 4.15 and is ruled out (profile of Box and Cox 1964, computed apart)."""
    est = fitted("boxcox y ~ x", A)
    found = {r.words: r for r in roundings(est, learned_constants(est)[0], (5, 10))}
    root, log = found["the square root of y"], found["the log of y"]
    assert (root.inside, root.advised) == (True, True)
    assert root.loss == pytest.approx(27.600553 - 27.526523, abs=2e-6)
    assert (log.inside, log.advised) == (False, False)
    assert log.loss == pytest.approx(31.678099 - 27.526523, abs=2e-6)
    assert sum(r.advised for r in found.values()) == 1
    sqrt = fitted("sqrt y ~ x", A)
    from batten.effects.contrast import span_effect

    assert root.difference == pytest.approx(span_effect(sqrt, (5, 10)).difference.estimate, rel=1e-9)


def test_rounding_advice_does_not_change_with_the_units_of_y():
    prices = []
    for unit in (1, 60):
        est = fitted("boxcox y ~ x", rows_of(A_X, A_Y * unit))
        prices.append(
            [(r.words, round(r.loss, 5), r.advised) for r in roundings(est, learned_constants(est)[0], (5, 10))]
        )
    assert prices[0] == prices[1]


def test_a_break_is_rounded_to_the_roundest_place_in_its_set():
    est = fitted("y ~ hinge x", B)
    (found,) = roundings(est, learned_constants(est)[0], (3, 9))
    assert (found.value, found.advised) == (6.0, True)
    assert 0 < found.loss < profile_of_shape(est).allowed


@pytest.mark.parametrize(
    ("low", "high", "near", "expected"),
    [(5.61, 6.27, 5.9, 6.0), (0.0021, 0.0034, 0.0028, 0.003), (1890, 1931, 1904, 1900), (-3.2, -2.6, -2.9, -3.0)],
)
def test_the_roundest_number_has_few_digits_and_stays_inside(low, high, near, expected):
    assert roundest(low, high, near=near) == pytest.approx(expected, rel=1e-12)
    assert roundest(low, np.inf, near=near) is None
