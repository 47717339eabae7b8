"""At many rows held-out scores come from sums over all rows; they equal brute-force refits of every training set."""

from __future__ import annotations

import numpy as np
import pytest

from batten.compare.heldout import HeldOut, held_out
from batten.engine.folds import Splits, deal
from batten.engine.rows import Rows
from batten.engine.threads import MANY_ROWS
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import means_at_rows

N = MANY_ROWS + 4_001


def rows(*, weighted: bool = False) -> Rows:
    """Multiplicative errors, three groups, x over two decades."""
    rng = np.random.default_rng(4)
    x, g = rng.lognormal(2.5, 0.6, N), rng.integers(0, 3, N)
    y = np.exp(0.5 + 0.8 * np.log(x) + 0.1 * g + rng.normal(0, 0.25, N))
    base = np.column_stack([np.ones(N), g == 1, g == 2]).astype(float)
    weights = rng.gamma(8.0, 1 / 8, N) if weighted else None
    return Rows(y, x, base, np.ones((N, 1)), weights=None if weights is None else weights / weights.mean())


def fitted(data: Rows, key: str) -> Estimate:
    done = estimate(data, parse(key))
    assert isinstance(done, Estimate), (key, done)
    return done


def refitted(data: Rows, key: str, splits: Splits) -> np.ndarray:
    """Squared error of the mean, absolute error of the median (2, S), errors those of a row of average weight."""
    out = []
    for train, test in splits.sets:
        est = fitted(data.take(train), key)
        x, base, modifier, root = data.x[test], data.base[test], data.modifier[test], data.root_weight[test]
        # few places, since every mean of a scale without a closed form goes through all training rows
        some = np.arange(0, len(test), 1 if est.link is not None or est.scale.closed else 40)
        mean = means_at_rows(est, x[some], base[some], modifier[some], root=False).value
        median = means_at_rows(est, x, base, modifier, of="median", root=False).value
        squared = (root[some] * (data.y[test][some] - mean)) ** 2
        out.append((squared.mean(), (root * np.abs(data.y[test] - median)).mean()))
    return np.array(out).T


CLOSED = ["y ~ x", "y ~ poly3 x", "log y ~ x", "log y ~ x^2", "sqrt y ~ x", "y ~ spline4 x", "log y ~ bins5 x"]
LINKS = ["loglink y ~ log x", "loglink y ~ x", "loglink-gamma y ~ x", "loglink-gaussian y ~ x", "loglink y ~ spline4 x"]
SEARCHED = ["y ~ x^p", "log y ~ x^p", "log y ~ fp1 x", "y ~ exponential x", "y ~ level-hyp x", "y ~ s-curve x"]


@pytest.mark.parametrize("key", CLOSED + LINKS + SEARCHED)
def test_scores_equal_refits_of_every_training_set(key: str) -> None:
    data = rows()
    splits = deal(data, folds=4, repeats=1, seed=1)
    (got,) = held_out([fitted(data, key)], splits)
    assert isinstance(got, HeldOut)
    squared, absolute = refitted(data, key, splits)
    np.testing.assert_allclose(np.sqrt(got.squared), np.sqrt(squared), rtol=1e-7)
    np.testing.assert_allclose(got.absolute, absolute, rtol=1e-7)


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "sqrt y ~ log x"])
def test_weighted_rows_score_as_their_refits(key: str) -> None:
    data = rows(weighted=True)
    splits = deal(data, folds=4, repeats=1, seed=1)
    (got,) = held_out([fitted(data, key)], splits)
    assert isinstance(got, HeldOut)
    squared, absolute = refitted(data, key, splits)
    np.testing.assert_allclose(np.sqrt(got.squared), np.sqrt(squared), rtol=1e-7)
    np.testing.assert_allclose(got.absolute, absolute, rtol=1e-7)


@pytest.mark.parametrize("key", ["boxcox y ~ x", "boxcox y ~ x^2", "cbrt y ~ log x", "boxcox(0.3) y ~ x"])
def test_scales_without_a_closed_mean_score_as_fits_to_every_training_set(
    key: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    data = rows()
    splits = deal(data, folds=4, repeats=1, seed=1)
    est = fitted(data, key)
    (got,) = held_out([est], splits)
    monkeypatch.setattr("batten.compare.heldout.MANY_ROWS", N)
    monkeypatch.setattr("batten.fit.smear.POOLED", N)  # means over the residuals themselves
    (want,) = held_out([est], splits)
    assert isinstance(got, HeldOut)
    assert isinstance(want, HeldOut)
    np.testing.assert_allclose(np.sqrt(got.squared), np.sqrt(want.squared), rtol=1e-7)
    np.testing.assert_allclose(got.absolute, want.absolute, rtol=1e-7)
    assert got.log_score is not None
    assert want.log_score is not None
    np.testing.assert_allclose(got.log_score, want.log_score, rtol=1e-7)


def test_powers_chosen_from_a_list_score_as_fits_to_every_training_set(monkeypatch: pytest.MonkeyPatch) -> None:
    data = rows()
    splits = deal(data, folds=4, repeats=1, seed=1)
    est = fitted(data, "log y ~ fp1 x")
    (got,) = held_out([est], splits)
    monkeypatch.setattr("batten.compare.heldout.MANY_ROWS", N)
    (want,) = held_out([est], splits)
    assert isinstance(got, HeldOut)
    assert isinstance(want, HeldOut)
    assert got.log_score is not None
    assert want.log_score is not None
    np.testing.assert_allclose(got.squared, want.squared, rtol=1e-7)
    np.testing.assert_allclose(got.log_score, want.log_score, rtol=1e-9)


def test_a_break_between_the_corners_of_its_profile_moves_held_out_errors_by_little() -> None:
    """The profile of a break has a corner at every row, and several minima beside each other; smoothed over, a break
    moves by a part of its standard error, and a fold's error by far less than the gaps that are compared."""
    rng = np.random.default_rng(2)
    x = rng.uniform(0, 10, N)
    data = Rows(20 + x - 1.5 * np.maximum(x - 6, 0) + rng.normal(0, 1, N), x, np.ones((N, 1)), np.ones((N, 1)))
    splits = deal(data, folds=5, repeats=1, seed=1)
    (got,) = held_out([fitted(data, "y ~ hinge x")], splits)
    assert isinstance(got, HeldOut)
    squared, absolute = refitted(data, "y ~ hinge x", splits)
    np.testing.assert_allclose(np.sqrt(got.squared), np.sqrt(squared), rtol=5e-5)
    np.testing.assert_allclose(got.absolute, absolute, rtol=5e-5)


def test_repeats_are_scored_one_after_another() -> None:
    data = rows()
    splits = deal(data, folds=4, repeats=2, seed=1)
    est = fitted(data, "log y ~ x")
    (both,) = held_out([est], splits)
    (second,) = held_out([est], Splits(splits.fold[1:], splits.k))
    assert isinstance(both, HeldOut)
    assert isinstance(second, HeldOut)
    np.testing.assert_array_equal(both.squared[4:], second.squared)
    assert len(both.rows) == 8
