"""Smooth curves in training sets equal refits there, in every kind of design, and by cells as by rows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from batten.compare import smoothed
from batten.compare.heldout import HeldOut, held_out
from batten.engine.folds import Splits, deal
from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import means_at_rows


def rows(n: int = 120) -> Rows:
    rng = np.random.default_rng(3)
    x, g, d = rng.lognormal(1.5, 0.6, n), (rng.random(n) < 0.4).astype(float), rng.normal(size=n)
    y = np.exp(1 + 0.4 * np.sin(x / 2) + 0.2 * g + 0.1 * d + rng.normal(0, 0.2, n))
    return Rows(y, x, np.column_stack([np.ones(n), g, d]), np.ones((n, 1)))


def fitted(data: Rows, key: str) -> Estimate:
    done = estimate(data, parse(key))
    assert isinstance(done, Estimate), done
    return done


def refitted(data: Rows, key: str, splits: Splits) -> np.ndarray:
    """Mean squared error of the mean of every split (times the weights of rows), each refitted from nothing."""
    out = []
    for train, test in splits.sets:
        where = data.x[test], data.base[test], data.modifier[test]
        mean = means_at_rows(fitted(data.take(train), key), *where, root=False).value
        weight = np.ones(len(test)) if data.weights is None else data.weights[test]
        out.append((weight * (data.y[test] - mean) ** 2).mean())
    return np.array(out)


def designs() -> dict[str, Rows]:
    data = rows()
    g, d = data.base[:, 1], data.base[:, 2]
    own = np.column_stack([1 - g, g])
    return {
        "beside covariates": data,
        "alone": replace(data, base=data.base[:, :1]),
        "through zero": replace(data, base=np.empty((120, 0)), intercept=None, constant=False),
        "crossed with a group": replace(data, modifier=data.base[:, :2]),
        "within groups": replace(data, base=own, modifier=own, intercept=None),
        "crossed with a number": replace(data, modifier=np.column_stack([np.ones(120), d])),
        "weighted": replace(data, weights=np.where(g > 0, 1.6, 0.6)),
        "ties": replace(data, x=np.round(data.x)),
    }


@pytest.mark.parametrize("design", designs())
@pytest.mark.parametrize("by_cells", [False, True])
def test_scores_equal_refits(design: str, by_cells: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    if by_cells:
        monkeypatch.setattr(smoothed, "ONE_CELL", 0)
    data, keys = designs()[design], ("y ~ smooth x", "log y ~ smooth x")
    splits = deal(data, folds=6, repeats=1, seed=1)
    together = held_out([fitted(data, key) for key in keys], splits)
    for key, got in zip(keys, together, strict=True):
        assert isinstance(got, HeldOut)
        # cross-products keep fewer digits than the columns themselves
        np.testing.assert_allclose(got.squared, refitted(data, key, splits), rtol=1e-8)


def test_a_level_that_a_training_set_loses_counts_no_curve_there() -> None:
    """Seven rows of a level dealt into seven folds: every set still has it; held in one fold, a set has lost it."""
    data = rows()
    few = np.zeros(120)
    few[:7] = 1
    data = replace(data, base=np.column_stack([np.ones(120), few]), modifier=np.column_stack([np.ones(120), few]))
    splits = deal(data, folds=7, repeats=1, seed=1)
    (got,) = held_out([fitted(data, "y ~ smooth x")], splits)
    assert isinstance(got, HeldOut)
    np.testing.assert_allclose(got.squared, refitted(data, "y ~ smooth x", splits), rtol=1e-7)
