"""Where one further row lies, with covariates as the rows have them."""

from __future__ import annotations

import numpy as np
import pytest

from batten.engine.rows import Array, Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.moved import moved_row_interval
from batten.fit.predict import new_row_interval

RNG = np.random.default_rng(11)
X = np.round(RNG.uniform(1, 9, 50), 2)
G = RNG.integers(0, 2, 50).astype(float)
Y = np.exp(0.4 + 0.3 * X + 0.5 * G + RNG.normal(0, 0.2, 50))


def rows_of(*covariates: Array) -> Rows:
    return Rows(Y, X, np.column_stack([np.ones(50), *covariates]), np.ones((50, 1)))


def fitted(key: str, rows: Rows) -> Estimate:
    done = estimate(rows, parse(key))
    assert isinstance(done, Estimate), done
    return done


@pytest.mark.parametrize("key", ["y ~ poly2 x", "log y ~ x", "loglink y ~ x"])
def test_without_covariates_it_is_the_interval_of_one_new_row(key: str) -> None:
    est = fitted(key, rows_of())
    xs = np.array([2.0, 5.0, 8.0])
    ours = moved_row_interval(est, xs, level=0.9)
    theirs = new_row_interval(est, xs, np.ones((3, 1)), np.ones((3, 1)), level=0.9, errors="robust")
    np.testing.assert_allclose(ours, theirs, rtol=1e-12)


def test_it_is_found_by_leaving_out_every_row_and_moving_it_to_x() -> None:
    """Jackknife+ with each tail by itself (Barber, Candes, Ramdas and Tibshirani 2021), by refitting."""
    rows = rows_of(G)
    est = fitted("log y ~ x", rows)
    moved = []
    for i in range(50):
        part = rows.take(np.arange(50) != i)
        without = fitted("log y ~ x", part)
        own = without.design_at(X[[i]], rows.base[[i]], np.ones((1, 1))) @ without.coef
        there = without.design_at(np.array([4.0]), rows.base[[i]], np.ones((1, 1))) @ without.coef
        moved.append(float(np.exp(there + np.log(Y[i]) - own)[0]))
    ordered = np.sort(moved)
    low, high = moved_row_interval(est, np.array([4.0]), level=0.9)
    # tails of floor(0.05 * 51) = 2 rows
    np.testing.assert_allclose([low[0], high[0]], [ordered[1], ordered[-2]], rtol=1e-9)


def test_a_covariate_held_at_one_value_is_held() -> None:
    est = fitted("log y ~ x", rows_of(G))
    held = np.column_stack([np.ones(50), np.ones(50)]), np.ones((50, 1))
    ours = moved_row_interval(est, np.array([4.0]), level=0.9, profile=held)
    theirs = new_row_interval(est, np.array([4.0]), held[0][:1], np.ones((1, 1)), level=0.9, errors="robust")
    np.testing.assert_allclose(ours, theirs, rtol=1e-12)
    assert ours[0] > moved_row_interval(est, np.array([4.0]), level=0.9)[0]


def test_too_few_rows_for_the_level_give_the_outermost_values() -> None:
    rows = rows_of(G).take(np.arange(12))
    low, high = moved_row_interval(fitted("y ~ x", rows), np.array([4.0]), level=0.99)
    wide = moved_row_interval(fitted("y ~ x", rows), np.array([4.0]), level=0.85)
    assert low[0] <= wide[0][0] < wide[1][0] <= high[0]
