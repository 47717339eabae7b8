"""Weights learned from a spread that changes with the mean (Harvey 1976), against the likelihood maximised by scipy."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import minimize
from scipy.stats import t

from batten.compare.heldout import HeldOut, held_out
from batten.effects.constants import learned_constants
from batten.engine.folds import deal
from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.predict import predict, total


def sample(n: int = 120, seed: int = 0, *, sign: float = 1.0) -> Rows:
    rng = np.random.default_rng(seed)
    x = rng.uniform(1, 12, n)
    g = (rng.random(n) < 0.4).astype(float)
    mean = 2 + 1.5 * x + g
    y = mean * (1 + 0.15 * np.clip(rng.normal(0, 1, n), -3, 3))
    return Rows(sign * y if sign > 0 else y - 9, x, np.column_stack([np.ones(n), g]), np.ones((n, 1)))


def fitted(rows: Rows, key: str) -> Estimate:
    done = estimate(rows, parse(key))
    assert isinstance(done, Estimate), (key, done)
    return done


def likelihood(power: float, design: Array, y: Array, u: Array, given: Array) -> float:
    """Gaussian log-likelihood of y at a power of the spread, coefficients and common SD at their best."""
    weights = given * np.exp(-2 * power * u)
    return float(sm.WLS(y, design, weights=weights).fit().llf)


@pytest.mark.parametrize("shape", ["x", "poly2 x", "spline4 x", "bins4 x"])
@pytest.mark.parametrize("weighted", [False, True])
@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_the_power_maximises_the_likelihood(shape: str, weighted: bool, sign: float) -> None:
    key = f"weighted y ~ {shape}"
    rows = sample(sign=sign)
    given = np.random.default_rng(4).uniform(0.5, 2, rows.count) if weighted else np.ones(rows.count)
    given = given / given.mean()
    est = fitted(replace(rows, weights=given if weighted else None), key)
    design = est.design_at(rows.x, rows.base, rows.modifier)
    f = sm.WLS(rows.y, design, weights=given).fit().fittedvalues
    # u: log of the fitted value, at least a twentieth of the middle response; with y of both signs, f in SDs of y
    u = np.log(np.maximum(f, 0.05 * np.median(rows.y))) if sign > 0 else f / np.std(rows.y)
    found = minimize(lambda p: -likelihood(p[0], design, rows.y, u, given), [0.5], tol=1e-12)
    assert est.spread is not None
    assert est.spread.power == pytest.approx(found.x[0], abs=2e-5)
    assert est.log_likelihood == pytest.approx(-found.fun, abs=1e-8)
    model = sm.WLS(rows.y, design, weights=given * np.exp(-2 * est.spread.power * u)).fit()
    np.testing.assert_allclose(est.coef, model.params, rtol=1e-9)
    np.testing.assert_allclose(
        np.sqrt(np.diagonal(est.covariance())), model.get_robustcov_results("HC3").bse, rtol=1e-8
    )
    assert est.parameters == design.shape[1] + 2


def test_an_even_spread_is_found_even() -> None:
    rng = np.random.default_rng(7)
    x = rng.uniform(1, 12, 4000)
    rows = Rows(5 + x + rng.normal(0, 0.5, 4000), x, np.ones((4000, 1)), np.ones((4000, 1)))
    (constant,) = learned_constants(fitted(rows, "weighted y ~ x"), y="loss")
    assert constant.name == "power of the spread of loss along its mean"
    assert constant.low < 0 < constant.high
    # the information of 2n squared deviations of log f about one power (Harvey 1976)
    width = 2 * 1.96 / np.sqrt(2 * 4000 * np.var(np.log(5 + x)))
    assert constant.high - constant.low == pytest.approx(width, rel=0.05)


@pytest.mark.parametrize("key", ["weighted y ~ x", "weighted y ~ spline4 x"])
def test_held_out_errors_learn_the_spread_again(key: str) -> None:
    rows = sample()
    given = np.random.default_rng(4).uniform(0.5, 2, rows.count)
    rows = replace(rows, weights=given / given.mean())
    splits = deal(rows, folds=5, repeats=2, seed=3)
    (got,) = held_out([fitted(rows, key)], splits)
    assert isinstance(got, HeldOut)
    for s, (train, test) in enumerate(splits.sets):
        est, some = fitted(rows.take(train), key), rows.take(test)
        assert est.spread is not None
        design = est.design_at(some.x, some.base, some.modifier)
        gap, weights = some.y - design @ est.coef, np.asarray(some.weights)
        assert got.squared[s] == pytest.approx((weights * gap**2).mean(), rel=1e-7)
        median = predict(est, some.x, some.base, some.modifier, of="median").estimate
        assert got.absolute[s] == pytest.approx((np.sqrt(weights) * np.abs(some.y - median)).mean(), rel=1e-7)
        root = est.spread.root(design) * np.sqrt(weights)
        v = np.einsum("ij,jk,ik->i", design, est.factored.inverse_cross, design)
        scale = est.sigma * np.sqrt(1 / root**2 + v)
        assert got.log_score is not None
        expected = t.logpdf(gap / scale, est.df_residual) - np.log(scale)
        assert got.log_score[s] == pytest.approx(expected.mean(), rel=1e-7)


def test_intervals_for_a_new_row_widen_where_the_spread_is_wide() -> None:
    est = fitted(sample(2500), "weighted y ~ x")
    at = np.array([2.0, 11.0])
    base, ones = np.tile([1.0, 0.0], (2, 1)), np.ones((2, 1))
    for errors in ("robust", "constant"):
        done = predict(est, at, base, ones, kind="new row", errors=errors)
        # the spread is in proportion to the mean, and so are the intervals, up to the fit's own error
        np.testing.assert_allclose((done.high - done.low) / done.estimate, 2 * 1.96 * 0.15, rtol=0.08)
    sums = total(est, at, base, ones)
    spreads = est.sigma / est.further_root(est.design_at(at, base, ones))
    assert sums.row_error == pytest.approx(np.sqrt((spreads**2).sum()), rel=1e-12)


def test_a_unit_of_y_does_not_move_the_power() -> None:
    rows = sample()
    one, two = fitted(rows, "weighted y ~ x"), fitted(replace(rows, y=250 * rows.y), "weighted y ~ x")
    assert one.spread is not None
    assert two.spread is not None
    assert one.spread.power == pytest.approx(two.spread.power, abs=1e-8)
    np.testing.assert_allclose(250 * one.coef, two.coef, rtol=1e-8)


@pytest.mark.parametrize("key", ["weighted log y ~ x", "weighted loglink y ~ x", "weighted y ~ hinge x"])
def test_what_weights_do_not_go_with_is_refused_in_words(key: str) -> None:
    refusal = estimate(sample(), parse(key))
    assert isinstance(refusal, Refusal)
    assert "go with y itself" in refusal.wrong


def test_rows_almost_on_the_line_settle_nothing() -> None:
    x = np.arange(1.0, 31)
    y = 3 + x
    y[-4:] += [2, -2, 2, -2]
    refusal = estimate(Rows(y, x, np.ones((30, 1)), np.ones((30, 1))), parse("weighted y ~ x"))
    assert isinstance(refusal, Refusal)
    assert refusal.wrong == "The change of spread cannot be learned from these rows."
