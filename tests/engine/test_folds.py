"""Folds ignore what should not matter and keep together what belongs together."""

from __future__ import annotations

import numpy as np

from batten.engine.folds import deal, default_repeats
from batten.engine.rows import Rows


def rows_of(x: np.ndarray, y: np.ndarray, **more: object) -> Rows:
    return Rows(y, x, np.ones((len(x), 1)), np.ones((len(x), 1)), **more)  # type: ignore[arg-type]


def test_row_order_does_not_move_any_row_to_another_fold() -> None:
    rng = np.random.default_rng(1)
    x, y = rng.normal(size=57), rng.normal(size=57)
    order = rng.permutation(57)
    plain = deal(rows_of(x, y), folds=5, repeats=3, seed=4).fold
    np.testing.assert_array_equal(plain[:, order], deal(rows_of(x[order], y[order]), folds=5, repeats=3, seed=4).fold)


def test_an_increasing_change_of_unit_moves_nothing() -> None:
    rng = np.random.default_rng(1)
    x, y = rng.lognormal(size=40), rng.lognormal(size=40)
    plain = deal(rows_of(x, y), folds=10, repeats=1, seed=0).fold
    np.testing.assert_array_equal(plain, deal(rows_of(np.log(x) * 7, y**3), folds=10, repeats=1, seed=0).fold)


def test_identical_rows_share_a_fold() -> None:
    x, y = np.repeat(np.arange(12.0), 3), np.repeat(np.arange(12.0) % 5, 3)
    fold = deal(rows_of(x, y), folds=4, repeats=6, seed=2).fold.reshape(6, 12, 3)
    assert (fold == fold[:, :, :1]).all()


def test_clusters_share_a_fold() -> None:
    rng = np.random.default_rng(0)
    cluster = rng.integers(0, 15, 90)
    fold = deal(rows_of(rng.normal(size=90), rng.normal(size=90), cluster=cluster), folds=5, repeats=2, seed=0).fold
    for r in range(2):
        assert all(len(set(fold[r, cluster == g])) == 1 for g in range(15))


def test_every_fold_covers_the_range_of_x() -> None:
    x = np.arange(200.0)
    fold = deal(rows_of(x, x), folds=10, repeats=1, seed=0).fold[0]
    assert all(x[fold == k].min() < 20 and x[fold == k].max() >= 180 for k in range(10))
    assert sorted(np.bincount(fold)) == [20] * 10


def test_few_rows_get_ten_repeats_and_many_one() -> None:
    assert (default_repeats(299), default_repeats(300)) == (10, 1)


def test_another_seed_deals_other_folds() -> None:
    x = np.arange(50.0)
    one, two = (deal(rows_of(x, x), folds=5, repeats=1, seed=s).fold for s in (0, 1))
    assert (one != two).any()


def test_the_only_row_of_a_level_always_trains() -> None:
    rng = np.random.default_rng(0)
    x, level = rng.normal(size=40), np.zeros(40)
    level[7] = 1
    rows = Rows(rng.normal(size=40), x, np.column_stack([np.ones(40), level]), np.ones((40, 1)))
    fold = deal(rows, folds=5, repeats=3, seed=0).fold
    assert (fold[:, 7] == -1).all()
    assert (np.delete(fold, 7, axis=1) >= 0).all()


def test_two_rows_of_a_level_train_together_only_where_they_would_be_held_out_together() -> None:
    rng = np.random.default_rng(0)
    x, level = rng.normal(size=40), np.zeros(40)
    level[[3, 30]] = 1
    rows = Rows(rng.normal(size=40), x, np.column_stack([np.ones(40), level]), np.ones((40, 1)))
    fold = deal(rows, folds=2, repeats=30, seed=0).fold[:, [3, 30]]
    assert ((fold[:, 0] == -1) == (fold[:, 1] == -1)).all()
    assert 0 < (fold[:, 0] == -1).sum() < 30
    assert (fold[fold[:, 0] >= 0, 0] != fold[fold[:, 0] >= 0, 1]).all()


def test_the_row_that_owns_the_slope_always_trains() -> None:
    """Anscombe 1973, set IV: x is 8 in ten rows and 19 in one."""
    x = np.array([8.0] * 7 + [19.0] + [8.0] * 3)
    y = np.array([6.58, 5.76, 7.71, 8.84, 8.47, 7.04, 5.25, 12.50, 5.56, 7.91, 6.89])
    fold = deal(rows_of(x, y), folds=10, repeats=2, seed=0).fold
    assert (fold[:, 7] == -1).all()
