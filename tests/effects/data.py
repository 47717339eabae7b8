"""Small invented data sets used by the tests of this folder."""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Array, Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

__all__ = ["A_D", "A_X", "A_Y", "B_X", "B_Y", "fitted", "rows_of"]

A_X = np.array([1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20], dtype=float)
A_Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
A_D = np.array([0.0, 1.0] * 6)
B_X = np.array([1, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11], dtype=float)
B_Y = np.array([9.1, 8.6, 7.9, 6.8, 7.2, 5.6, 4.9, 5.3, 4.4, 5.6, 5.1, 6.9, 7.8, 8.4, 9.6, 10.3])


def rows_of(x: Array, y: Array, *covariates: Array) -> Rows:
    """Rows with an intercept, covariates, and the focal predictor standing alone."""
    base = np.column_stack([np.ones_like(x), *covariates])
    return Rows(y=y, x=x, base=base, modifier=np.ones((len(x), 1)))


def fitted(key: str, rows: Rows, **constants: tuple[float, ...]) -> Estimate:
    """The remedy's estimate; fails with the refusal's words."""
    done = estimate(rows, parse(key), **constants)
    assert isinstance(done, Estimate), done
    return done
