"""Shapes with searched constants under a log link, against the deviance minimised by scipy and by refits."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import curve_fit, minimize_scalar
from scipy.stats import f as fisher

from batten.compare.heldout import HeldOut, held_out
from batten.effects.constants import learned_constants
from batten.engine.folds import deal
from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate


def sample(n: int = 120, seed: int = 1) -> Rows:
    rng = np.random.default_rng(seed)
    x, g = rng.uniform(0.5, 12, n), (rng.random(n) < 0.4).astype(float)
    mean = np.exp(0.4 + 0.35 * np.minimum(x, 6) + 0.05 * np.maximum(x - 6, 0) + 0.2 * g)
    return Rows(rng.gamma(8, mean / 8), x, np.column_stack([np.ones(n), g]), np.ones((n, 1)))


def fitted(rows: Rows, key: str) -> Estimate:
    done = estimate(rows, parse(key))
    assert isinstance(done, Estimate), (key, done)
    return done


def deviance(rows: Rows, columns: Array, family: sm.families.Family) -> float:
    design = np.column_stack([rows.base, columns])
    weights = np.ones(rows.count) if rows.weights is None else rows.weights
    return float(sm.GLM(rows.y, design, family=family, var_weights=weights).fit(tol=1e-12).deviance)


POISSON, GAMMA = sm.families.Poisson(), sm.families.Gamma(sm.families.links.Log())


@pytest.mark.parametrize(("key", "family"), [("loglink y ~ hinge x", POISSON), ("loglink-gamma y ~ hinge x", GAMMA)])
@pytest.mark.parametrize("weighted", [False, True])
@pytest.mark.filterwarnings("ignore")
def test_the_break_is_where_the_deviance_is_lowest(key: str, family: sm.families.Family, weighted: bool) -> None:
    rows = sample()
    w = np.random.default_rng(2).uniform(0.5, 2, rows.count)
    rows = replace(rows, weights=w / w.mean() if weighted else None)
    est = fitted(rows, key)

    def at(place: float) -> float:
        return deviance(rows, np.column_stack([rows.x, np.maximum(rows.x - place, 0)]), family)

    grid = np.linspace(2, 10, 81)
    near = grid[int(np.argmin([at(v) for v in grid]))]
    found = minimize_scalar(at, bounds=(near - 0.2, near + 0.2), method="bounded", options={"xatol": 1e-9})
    assert est.theta[0] == pytest.approx(found.x, abs=1e-5)
    (constant,) = (c for c in learned_constants(est) if c.profile is not None)
    limit = found.fun + est.sigma**2 * fisher.ppf(0.95, 1, est.df_residual)
    assert at(constant.low) == pytest.approx(limit, rel=1e-6)
    assert at(constant.high) == pytest.approx(limit, rel=1e-6)


def test_a_gaussian_log_link_on_a_power_is_a_nonlinear_fit() -> None:
    rows = replace(sample(), base=np.ones((120, 1)))
    est = fitted(rows, "loglink-gaussian y ~ x^p")
    scale = est.state[-1] if est.state else 1.0

    def curve(x: Array, a: float, b: float, p: float) -> Array:
        return np.exp(a + b * ((x / scale) ** p - 1) / p)

    found, cov = curve_fit(curve, rows.x, rows.y, p0=[*est.coef, *est.theta], xtol=1e-15, ftol=1e-15, gtol=1e-15)
    np.testing.assert_allclose([*est.coef, *est.theta], found, rtol=1e-5)
    # scipy's covariance comes from a numeric Jacobian
    np.testing.assert_allclose(np.sqrt(np.diagonal(est.covariance("constant"))), np.sqrt(np.diagonal(cov)), rtol=1e-4)
    assert est.df_residual == rows.count - 3


@pytest.mark.filterwarnings("ignore")
@pytest.mark.parametrize("key", ["loglink y ~ fp1 x", "loglink y ~ fp2 x"])
def test_powers_from_a_list_are_those_of_lowest_deviance(key: str) -> None:
    rows = sample()
    est = fitted(rows, key)
    candidates = est.shape.candidates(rows.x, est.state)
    found = [deviance(rows, est.shape.columns(rows.x, est.state, tuple(theta)), POISSON) for theta in candidates]
    assert est.theta == tuple(candidates[int(np.argmin(found))])


@pytest.mark.parametrize("key", ["loglink y ~ hinge x", "loglink-gamma y ~ x^p", "loglink y ~ fp1 x"])
def test_constants_are_searched_again_in_every_training_set(key: str) -> None:
    rows = sample()
    splits = deal(rows, folds=5, repeats=1, seed=4)
    (got,) = held_out([fitted(rows, key)], splits)
    assert isinstance(got, HeldOut)
    for s, (train, test) in enumerate(splits.sets):
        est = fitted(rows.take(train), key)
        some = rows.take(test)
        mu = np.exp(est.design_at(some.x, some.base, some.modifier) @ est.coef)
        assert got.squared[s] == pytest.approx(((some.y - mu) ** 2).mean(), rel=1e-6)


def test_leaving_a_row_out_moves_the_fit_nearly_as_a_refit_does() -> None:
    rows = sample(400)
    est = fitted(rows, "loglink y ~ x^p")
    moves = est.moves()
    parts = []
    for i in range(0, 400, 40):
        again = fitted(rows.take(np.delete(np.arange(400), i)), "loglink y ~ x^p")
        parts.append(np.array([*again.coef, *again.theta]) - np.array([*est.coef, *est.theta]) - moves[i])
    # one step stands for the refit: what is left is small beside what moves
    assert np.abs(parts).max(axis=0) == pytest.approx(np.zeros(4), abs=float(np.abs(moves).max()) * 0.1)


def test_a_break_that_no_row_settles_is_refused_in_words() -> None:
    # only the last two rows leave the line: the deviance falls all the way to the end of what can be searched
    x = np.linspace(1, 9, 60)
    y = np.exp(0.1 * x)
    y[-2:] *= 3
    refusal = estimate(Rows(y, x, np.ones((60, 1)), np.ones((60, 1))), parse("loglink y ~ hinge x"))
    assert isinstance(refusal, Refusal)
    assert refusal.wrong == "These rows do not settle the constant of hinge x."


def test_two_breaks_are_found_where_the_mean_has_them() -> None:
    rng = np.random.default_rng(6)
    x = rng.uniform(0, 60, 300)
    mean = np.exp(1 + 0.08 * np.minimum(x, 25) - 0.05 * np.clip(x - 25, 0, 17) + 0.06 * np.maximum(x - 42, 0))
    rows = Rows(rng.gamma(40, mean / 40), x, np.ones((300, 1)), np.ones((300, 1)))
    est = fitted(rows, "loglink y ~ hinge2 x")
    np.testing.assert_allclose(est.theta, [25, 42], atol=1.5)
