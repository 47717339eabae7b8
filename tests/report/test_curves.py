"""Curves of figures against statsmodels, and against the table's own numbers."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from situations import examined, fan, plateau

from batten.fit.means import averaged_means
from batten.report import curves
from batten.report.curves import beyond, curve_of, places_along, row_band, span_ends

FAN = fan(60)


def averaged(model: object, xs: np.ndarray) -> np.ndarray:
    """Mean prediction with every row's x set to each value."""
    return np.array([model.predict(FAN.frame.assign(mass_kg=x)).mean() for x in xs])  # type: ignore[attr-defined]


def test_the_drawn_mean_is_the_average_prediction_of_statsmodels() -> None:
    model = smf.ols("minutes ~ mass_kg + I(mass_kg**2) + C(alloy)", FAN.frame).fit()
    est = examined("fan", 60, "y ~ poly2 x").comparison.estimates["y ~ poly2 x"]
    xs = np.array([3.0, 17.0, 60.0])
    for band in (False, True):
        np.testing.assert_allclose(curve_of(est, xs, band=band).value, averaged(model, xs), rtol=1e-10)


def test_the_drawn_mean_under_log_y_is_smeared() -> None:
    """Duan 1983: exp of the fitted log times the mean of exp(residual)."""
    model = smf.ols("np.log(minutes) ~ np.log(mass_kg) + C(alloy)", FAN.frame).fit()
    est = examined("fan", 60, "log y ~ log x").comparison.estimates["log y ~ log x"]
    xs = np.array([3.0, 17.0, 60.0])
    logs = [model.predict(FAN.frame.assign(mass_kg=x)) for x in xs]
    wanted = [np.exp(z).mean() * np.exp(model.resid).mean() for z in logs]
    np.testing.assert_allclose(curve_of(est, xs).value, wanted, rtol=1e-10)


def test_the_band_of_a_straight_line_is_the_robust_interval_of_statsmodels() -> None:
    """HC3 (MacKinnon and White 1985) with t quantiles."""
    made = plateau(60)
    model = smf.ols(made.formula, made.frame).fit(cov_type="HC3", use_t=True)
    est = examined("plateau", 60, "y ~ x").comparison.estimates["y ~ x"]
    xs = np.array([1.0, 9.0, 20.0])
    theirs = model.get_prediction(pd.DataFrame({"dose_ml": xs})).summary_frame(alpha=0.1)
    ours = curve_of(est, xs, level=0.9)
    np.testing.assert_allclose(ours.low, theirs["mean_ci_lower"], rtol=1e-8)
    np.testing.assert_allclose(ours.high, theirs["mean_ci_upper"], rtol=1e-8)


def test_few_rows_have_the_jackknife_band_of_the_table_and_many_rows_say_what_they_have_instead() -> None:
    fit = examined("fan", 60, "log y ~ log x")["log y ~ log x"]
    ends = span_ends(fit.estimate, fit.question.span)
    wanted = fit.span_effect()
    assert (ends.difference.low, ends.difference.high) == pytest.approx((wanted.difference.low, wanted.difference.high))
    assert curve_of(fit.estimate, np.array([20.0])).how == "each row left out in turn"
    many = examined("fan", 300, "log y ~ log x")["log y ~ log x"]
    assert curve_of(many.estimate, np.array([20.0])).how == "the influence of each row"


def test_at_many_rows_the_quick_band_is_that_of_the_jackknife() -> None:
    est = examined("fan", 300, "log y ~ log x").comparison.estimates["log y ~ log x"]
    quick = curve_of(est, np.array([8.0, 20.0, 40.0]))
    slow = averaged_means(est, np.array([8.0, 20.0, 40.0]), jackknife=True)
    half = np.log(quick.high / quick.low) / (2 * 1.968)
    # two estimates of one standard error, which differ in the second order of 1 / n
    np.testing.assert_allclose(half, slow.log().error, rtol=0.05)


def test_a_curve_has_a_gap_where_the_remedy_has_no_value() -> None:
    est = examined("fan", 60, "log y ~ log x").comparison.estimates["log y ~ log x"]
    out = curve_of(est, np.array([-1.0, 0.0, 5.0]))
    assert list(np.isnan(out.value)) == [True, True, False]
    assert list(np.isnan(out.low)) == [True, True, False]


def test_every_step_has_a_place_on_both_sides() -> None:
    est = examined("plateau", 60, "y ~ bins5 x").comparison.estimates["y ~ bins5 x"]
    xs = places_along(est)
    for edge in est.shape.cuts(est.state) or ():
        assert edge in xs
        assert np.nextafter(edge, -np.inf) in xs
    steps = curve_of(est, xs, band=False).value
    assert len(np.unique(np.round(steps, 9))) == 5


def test_what_is_drawn_goes_beyond_the_data_but_never_across_zero() -> None:
    ground = beyond(np.array([0.5, 1.0, 9.0, 20.0]))
    assert ground.left == 0.0
    assert ground.right > 20.0
    assert beyond(np.array([-3.0, 4.0])).left < -3.0
    assert beyond(np.array([7.0, 7.0])).right > 7.0


def test_averaging_over_a_sample_of_many_covariate_rows_keeps_the_curve(monkeypatch: pytest.MonkeyPatch) -> None:
    """The bowl's temperature takes hundreds of values; an even sample moves the mean by far less than its band."""
    est = examined("bowl", 300, "log y ~ spline4 x").comparison.estimates["log y ~ spline4 x"]
    xs = np.array([1000.0, 1700.0, 2600.0])
    whole = curve_of(est, xs)
    monkeypatch.setattr(curves, "COVARIATES", 50)
    monkeypatch.setattr(curves, "AVERAGED", 40)
    part = curve_of(est, xs)
    assert (whole.averaged, part.averaged) == (0, 40)
    assert (np.abs(part.value - whole.value) < 0.1 * (whole.high - whole.low)).all()


def test_the_curve_does_not_depend_on_how_many_places_fit_the_memory(monkeypatch: pytest.MonkeyPatch) -> None:
    est = examined("fan", 60, "log y ~ log x").comparison.estimates["log y ~ log x"]
    whole = curve_of(est, places_along(est))
    monkeypatch.setattr(curves, "BLOCK", 200)
    part = curve_of(est, places_along(est))
    np.testing.assert_allclose(part.value, whole.value, rtol=1e-12)
    np.testing.assert_allclose(part.high, whole.high, rtol=1e-12)


def test_at_many_rows_the_band_between_its_places_is_that_of_the_places(monkeypatch: pytest.MonkeyPatch) -> None:
    est = examined("bowl", 300, "log y ~ spline4 x").comparison.estimates["log y ~ spline4 x"]
    xs = places_along(est)
    every = curve_of(est, xs)
    monkeypatch.setattr(curves, "MANY_ROWS", 100)
    some = curve_of(est, xs)
    np.testing.assert_array_equal(some.value, every.value)
    inside = (xs >= est.rows.x.min()) & (xs <= est.rows.x.max())
    # a straight line between places a seventieth of the axis apart misses a smooth width by a few percent
    np.testing.assert_allclose((some.high - some.low)[inside], (every.high - every.low)[inside], rtol=0.1)
    assert not np.array_equal(some.high, every.high)


def test_most_rows_lie_in_the_band_of_new_rows() -> None:
    fit = examined("fan", 300, "log y ~ log x")["log y ~ log x"]
    rows = fit.problem.rows
    band = row_band(fit.estimate, rows.x, level=0.9)
    inside = ((rows.y >= band.low) & (rows.y <= band.high)).mean()
    # 90% up to the chance of 300 rows: three standard errors
    assert abs(inside - 0.9) < 3 * np.sqrt(0.9 * 0.1 / 300)


def test_there_is_no_band_where_one_row_carries_the_correction() -> None:
    made = fan(60)
    frame = made.frame.copy()
    frame.loc[7, "minutes"] = 400_000.0
    exam = type(made)(made.formula, frame, made.focus, made.span, made.units).examine(only=["log y ~ log x"])
    est = exam.comparison.estimates["log y ~ log x"]
    out = curve_of(est, np.array([10.0, 25.0]))
    assert np.isfinite(out.value).all()
    assert np.isnan(out.low).all()
    assert out.how.startswith("no interval for a mean: one row supplies too much")
    assert np.isnan(span_ends(est, (10.0, 25.0)).difference.low)
