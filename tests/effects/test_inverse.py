"""The question asked backwards: where is the mean y, and which x cannot be told from that?"""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from data import A_D, A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy.stats import t as student

from batten.effects.inverse import x_for
from batten.effects.lookup import lookup, round_places
from batten.fit.averaged import interval
from batten.fit.means import averaged_means

A, B = rows_of(A_X, A_Y, A_D), rows_of(B_X, B_Y)


def test_a_straight_line_inverts_to_the_band_of_statsmodels():
    """Ends of the set are where the line's interval for the mean passes y (inverse estimation; Fieller 1954)."""
    theirs = sm.OLS(A_Y, sm.add_constant(A_X)).fit()
    found = x_for(fitted("y ~ x", rows_of(A_X, A_Y)), 20, errors="constant", unit="kg", y_unit="min")
    assert found.estimates[0] == pytest.approx((20 - theirs.params[0]) / theirs.params[1], rel=1e-9)
    ((low, high),) = found.pieces
    for x, column in ((low, "mean_ci_upper"), (high, "mean_ci_lower")):
        table = theirs.get_prediction(np.array([[1.0, x]])).summary_frame(alpha=0.05)
        assert table[column].iloc[0] == pytest.approx(20, rel=1e-7)
    assert found.reading.startswith("a mean of 20 min is reached at ")


@pytest.mark.parametrize("of", ["mean", "median"])
@pytest.mark.parametrize("key", ["log y ~ log x", "sqrt y ~ spline4 x", "loglink y ~ x"])
def test_ends_of_the_set_are_where_the_averaged_band_passes_y(key, of):
    est = fitted(key, A)
    found = x_for(est, 15, of=of)
    assert found.reached
    for piece, (low, high) in zip(found.pieces, found.pieces, strict=True):
        ends = averaged_means(est, np.array(piece), of=of)
        band = interval(ends, 0.95, positive=True)
        assert (band[1][0], band[0][1]) == pytest.approx((15, 15), rel=1e-6)
        assert low < found.estimates[0] < high


def test_a_curve_that_turns_gives_two_places_and_two_pieces():
    found = x_for(fitted("y ~ poly2 x", B), 7, unit="kg", y_unit="min")
    assert len(found.estimates) == len(found.pieces) == 2
    b = np.polyfit(B_X, B_Y, 2)
    np.testing.assert_allclose(found.estimates, np.sort(np.roots(b - [0, 0, 7])), rtol=1e-8)
    ((low, high),) = found.surely_below
    assert found.pieces[0][1] == pytest.approx(low, rel=1e-6)
    assert found.pieces[1][0] == pytest.approx(high, rel=1e-6)


def test_a_value_out_of_reach_is_not_reached_and_the_range_of_the_curve_is_told():
    found = x_for(fitted("y ~ poly2 x", B), 3, unit="kg", y_unit="min")
    assert (found.reached, found.pieces) == (False, ())
    assert found.reading == "a mean of 3 min is not reached: from 1 to 11 kg the mean runs from 5.3 to 11.0 min"


def test_a_value_just_beyond_the_curve_keeps_what_cannot_be_excluded():
    found = x_for(fitted("y ~ poly2 x", B), 5, unit="kg", y_unit="min")
    assert not found.reached
    assert len(found.pieces) == 1
    assert found.reading == (
        "the curve does not reach a mean of 5 min from 1 to 11 kg, but 4.3 to 6.6 kg cannot be excluded"
    )


def test_a_set_that_runs_to_the_end_of_the_data_says_so():
    found = x_for(fitted("log y ~ x", A), 60, unit="kg", y_unit="min")
    assert found.pieces[0][1] == 20
    assert found.reading.endswith("kg to the end of the data)")


def test_groups_answer_with_whole_groups():
    found = x_for(fitted("y ~ bins(9) x", A), 20, unit="kg", y_unit="min")
    assert "is passed where groups change, at 9 kg" in found.reading
    est = fitted("y ~ bins(9) x", A)
    low = averaged_means(est, np.array([3.0])).value[0]
    inside = x_for(est, float(low))
    assert inside.pieces == ((1.0, np.nextafter(9, 0)),)


def test_covariates_can_be_fixed():
    est = fitted("log y ~ x", A)
    one = x_for(est, 15, base=np.array([[1.0, 0.0]]), modifier=np.ones((1, 1))).estimates[0]
    two = x_for(est, 15, base=np.array([[1.0, 1.0]]), modifier=np.ones((1, 1))).estimates[0]
    # the shift between the groups over the slope
    assert one - two == pytest.approx(est.coef[1] / est.coef[2], rel=1e-8)


def test_sets_cover_the_true_place_at_about_the_stated_rate():
    rng, covered, x = np.random.default_rng(4), 0, np.linspace(1, 10, 40)
    for _ in range(200):
        y = np.exp(0.3 + 0.2 * x + rng.normal(0, 0.3, 40))
        pieces = x_for(fitted("log y ~ x", rows_of(x, y)), float(np.exp(0.3 + 0.2 * 5)), of="median").pieces
        covered += any(low <= 5 <= high for low, high in pieces)
    # binomial error of 200 runs is 1.5 points; the median's interval is a little wide or narrow at n = 40
    assert 0.90 <= covered / 200 <= 0.99


def test_a_lookup_table_lists_round_places_with_mean_median_and_a_new_row():
    est = fitted("log y ~ x", rows_of(A_X, A_Y))
    table = lookup(est, errors="constant")
    assert [r.x for r in table] == [2, 4, 6, 8, 10, 12, 14, 16, 18, 20]
    row = table[4]
    e = est.residual
    assert row.mean == pytest.approx(np.exp(est.coef @ [1, 10]) * np.exp(e).mean(), rel=1e-12)
    assert row.median == pytest.approx(np.exp(est.coef @ [1, 10] + np.median(e)), rel=1e-12)
    theirs = sm.OLS(np.log(A_Y), sm.add_constant(A_X)).fit().get_prediction(np.array([[1.0, 10.0]]))
    band = np.exp(theirs.summary_frame(alpha=0.05)[["obs_ci_lower", "obs_ci_upper"]].to_numpy()[0])
    np.testing.assert_allclose([row.low, row.high], band, rtol=1e-9)


def test_a_lookup_row_the_shape_cannot_take_is_empty_with_words():
    first, second = lookup(fitted("y ~ log x", A), (-1.0, 4.0))
    assert np.isnan([first.mean, first.median, first.low, first.high]).all()
    assert first.note == "log x cannot be taken at -1"
    assert np.isfinite([second.mean, second.low]).all()


@pytest.mark.parametrize(
    ("low", "high", "first", "step"), [(4.2, 61, 10, 10), (0.0012, 0.0098, 0.002, 0.001), (1890, 2020, 1900, 20)]
)
def test_places_are_round_and_inside(low, high, first, step):
    places = np.array(round_places(low, high))
    assert places[0] == first
    np.testing.assert_allclose(np.diff(places), step, rtol=1e-9)
    assert low <= places[0] <= places[-1] <= high
    assert 4 <= len(places) <= 11


def test_the_band_uses_the_t_quantile_of_the_residual_degrees_of_freedom():
    est = fitted("y ~ x", rows_of(A_X, A_Y))
    narrow, wide = (x_for(est, 20, level=level, errors="constant").pieces[0] for level in (0.8, 0.99))
    assert wide[0] < narrow[0] < narrow[1] < wide[1]
    found = averaged_means(est, np.array(narrow), errors="constant")
    reach = student.ppf(0.9, 10) * found.error
    np.testing.assert_allclose(np.abs(found.value - 20), reach, rtol=1e-7)


@pytest.mark.parametrize("key", ["log y ~ x", "y ~ spline4 x", "sqrt y ~ x"])
def test_many_covariate_rows_are_pooled_without_moving_the_answer(key):
    rng = np.random.default_rng(7)
    x, c, d = rng.uniform(1, 20, 4000), rng.normal(size=4000), rng.integers(0, 3, 4000).astype(float)
    rows = rows_of(x, np.exp(0.1 * x + 0.3 * c + 0.1 * d + rng.normal(0, 0.3, 4000)), c, d)
    est = fitted(key, rows)
    found = x_for(est, 3)
    ends = averaged_means(est, np.array([*found.estimates, *found.pieces[0]]), jackknife=False)
    band = interval(ends, 0.95, positive=key != "y ~ spline4 x")
    # the widest classes hold the most extreme covariates
    assert ends.value[0] == pytest.approx(3, rel=5e-5)
    # the covariates' own share in the error is taken as independent of the rest
    assert (band[1][1], band[0][2]) == pytest.approx((3, 3), rel=2e-3)
