"""Links against published fits and other libraries."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from scipy.special import digamma

from batten.families import parse
from batten.families.base import Array, Link
from batten.families.links.loglink import gamma_shape

A_X = np.array([1.0, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20])
A_Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
C_Y = np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14])
D_Y = np.array([0.08, 0.12, 0.15, 0.22, 0.31, 0.38, 0.52, 0.55, 0.68, 0.81])
TEN = np.arange(1.0, 11.0)


def link(word: str) -> Link:
    found = parse(f"{word} ~ x").left
    assert isinstance(found, Link)
    return found


def scored(of: Link, x: Array, y: Array) -> tuple[Array, Array]:
    """Coefficients of a line under the link by Fisher scoring, and the fitted means."""
    design = np.column_stack([np.ones_like(x), x])
    eta = of.start(y)
    for _ in range(100):
        mu, slope = of.mean(eta), of.mean_slope(eta)
        root = slope / np.sqrt(of.variance(mu))
        coef = np.linalg.lstsq(design * root[:, None], (eta + (y - mu) / slope) * root, rcond=None)[0]
        eta = design @ coef
    return coef, of.mean(eta)


def test_the_log_link_meets_the_published_counts() -> None:
    """AIDS deaths, Whyte and others (1987); Dobson, Introduction to Generalized Linear Models, exercise 4.1."""
    x = np.arange(1.0, 15)
    y = np.array([0.0, 1, 2, 3, 1, 4, 9, 18, 23, 31, 20, 25, 37, 45])
    coef, mu = scored(link("loglink y"), x, y)
    np.testing.assert_allclose(coef, [0.3396, 0.2565], atol=5e-5)
    assert link("loglink y").deviance(y, mu).sum() == pytest.approx(29.65, abs=5e-3)
    coef, mu = scored(link("loglink y"), np.log(x), y)
    np.testing.assert_allclose(coef, [-1.944, 2.1748], atol=5e-4)
    assert link("loglink y").deviance(y, mu).sum() == pytest.approx(17.09, abs=5e-3)


def test_the_gamma_log_link_agrees_with_the_reference_fit() -> None:
    """Clotting times, lot 1; McCullagh and Nelder (1989), p. 300; log link computed, R agrees."""
    u = np.array([5.0, 10, 15, 20, 30, 40, 60, 80, 100])
    y = np.array([118.0, 58, 42, 35, 27, 25, 21, 19, 18])
    coef, mu = scored(link("loglink-gamma y"), np.log(u), y)
    np.testing.assert_allclose(coef, [5.50323022751595, -0.601917671742359], rtol=1e-10)
    assert link("loglink-gamma y").deviance(y, mu).sum() == pytest.approx(0.16260829449733072, rel=1e-10)


def test_every_link_agrees_with_statsmodels() -> None:
    sm = pytest.importorskip("statsmodels.api")
    log = sm.families.links.Log()
    cases = [
        ("loglink y", sm.families.Poisson(log), TEN, C_Y),
        ("loglink-gamma y", sm.families.Gamma(log), A_X, A_Y),
        ("loglink-gaussian y", sm.families.Gaussian(log), A_X, A_Y),
        ("share y", sm.families.Binomial(), TEN, D_Y),
    ]
    for word, family, x, y in cases:
        theirs = sm.GLM(y, sm.add_constant(x), family=family).fit(tol=1e-14, maxiter=200)
        coef, mu = scored(link(word), x, y)
        np.testing.assert_allclose(coef, theirs.params, rtol=1e-8)  # the other program's stopping rule
        assert link(word).deviance(y, mu).sum() == pytest.approx(theirs.deviance, rel=1e-9)


def test_likelihoods_use_the_maximised_dispersion_and_pseudo_likelihoods_have_none() -> None:
    """Gamma: shape v solves log v - digamma(v) = D / 2n; values by an independent script, Gamma's by scipy too."""
    _, mu = scored(link("loglink-gamma y"), A_X, A_Y)
    got = link("loglink-gamma y").log_likelihood(A_Y, mu)
    assert got == pytest.approx(-31.488537, rel=1e-7)
    v = gamma_shape(link("loglink-gamma y").deviance(A_Y, mu).mean())
    assert v == pytest.approx(12.469760, rel=1e-6)
    assert got == pytest.approx(scipy.stats.gamma.logpdf(A_Y, v, scale=mu / v).sum(), rel=1e-12)
    assert scipy.stats.gamma.logpdf(A_Y, v * 1.01, scale=mu / v / 1.01).sum() < got
    _, mu = scored(link("loglink-gaussian y"), A_X, A_Y)
    sigma = np.sqrt(np.mean((A_Y - mu) ** 2))
    gaussian = link("loglink-gaussian y").log_likelihood(A_Y, mu)
    assert gaussian == pytest.approx(-33.893609, rel=1e-7)
    assert gaussian == pytest.approx(scipy.stats.norm.logpdf(A_Y, mu, sigma).sum(), rel=1e-12)
    assert link("loglink y").log_likelihood(C_Y, C_Y + 1) is None
    assert link("share y").log_likelihood(D_Y, D_Y) is None


@pytest.mark.parametrize("mean_deviance", [1e-9, 1e-3, 0.5, 5.0, 300.0])
def test_the_gamma_shape_solves_its_equation(mean_deviance: float) -> None:
    v = gamma_shape(mean_deviance)
    # log v - digamma(v) cancels to about 1/(2v): digits are lost where the fit is nearly perfect
    assert np.log(v) - digamma(v) == pytest.approx(mean_deviance / 2, rel=1e-6 if v > 1e6 else 1e-11)


def test_the_log_links_slope_does_not_depend_on_the_units_of_y() -> None:
    """Santos Silva and Tenreyro (2006); with zeros present, log(1 + y) would move with the units."""
    for factor in (1.0, 100.0):
        coef, _ = scored(link("loglink y"), TEN, factor * C_Y)
        assert coef[1] == pytest.approx(0.438565, rel=1e-5)


def test_the_share_link_on_fractions() -> None:
    """Papke and Wooldridge (1996); values by an independent script."""
    coef, _ = scored(link("share y"), TEN, D_Y)
    np.testing.assert_allclose(coef, [-2.912374, 0.413695], rtol=1e-5)


@pytest.mark.parametrize(
    ("word", "y", "wrong", "seen", "instead"),
    [
        ("loglink y", [-1.0, 2.0], "A log link needs a response of zero or more.",
         "1 of 2 values are negative (lowest -1).", "yeojohnson y, or a shape of the predictor (y ~ spline4 x)."),
        ("loglink y", [0.0, 0.0], "A log link needs a response with a mean above zero.",
         "The mean of 2 values is 0.", "A shape of the predictor (y ~ spline4 x) leaves the response alone."),
        ("loglink-gamma y", [0.0, 2.0], "A log link needs a response above zero.",
         "1 of 2 values are zero or negative (lowest 0).", "loglink y keeps zeros."),
        ("loglink-gaussian y", [-3.0, 2.0], "A log link needs a response with a mean above zero.",
         "The mean of 2 values is -0.5.", "A shape of the predictor (y ~ spline4 x) leaves the response alone."),
        ("share y", [0.2, 40.0], "A share link needs a response from 0 to 1.",
         "1 of 2 values lie outside (they run from 0.2 to 40).",
         "Divide percentages by 100; logit(0, 100) y takes bounds; loglink y needs no upper end."),
        ("share y", [1.0, 1.0], "A share link needs a response that is not 0 throughout or 1 throughout.",
         "All 2 values are 1.", "Another response: this one does not vary."),
    ],
)  # fmt: skip
def test_a_link_refuses_with_counts(word: str, y: list[float], wrong: str, seen: str, instead: str) -> None:
    refusal = link(word).refuse(np.array(y))
    assert refusal is not None
    assert (refusal.wrong, refusal.seen, refusal.instead) == (wrong, seen, instead)


def test_zeros_are_welcome_under_a_log_link_and_ends_under_a_share_link() -> None:
    assert link("loglink y").refuse(C_Y) is None
    assert link("share y").refuse(np.array([0.0, 0.3, 1.0])) is None
    assert link("loglink-gaussian y").refuse(np.array([-1.0, 5.0])) is None
