"""Is another rung of the ladder called for? First steps towards a power of x, and towards the level or the log of y."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.diagnose.span import basis, outside
from batten.engine.rows import Array

__all__ = ["PowerStep", "pe_columns", "power_step"]


@dataclass(frozen=True, eq=False)
class PowerStep:
    """column (n,): x log x, to be tested beside x. power: first step of the iteration from 1, NaN where it has none."""

    column: Array
    delta: float
    power: float


def power_step(X: Array, x: Array, z: Array, *, root: Array | None = None) -> PowerStep | None:
    """First step towards a power of x (Box and Tidwell 1962); None unless x (n,) is above zero.

    The column x log x is added to the design X (n, p), whose last column is x, and has coefficient delta; with b the
    coefficient of x without it, the power moves from 1 to 1 + delta / b. root (n,): what rows of X and z are times
    already. The power found by least squares lies elsewhere; the test of delta is the point.
    """
    if np.min(x) <= 0:
        return None
    # in units of its geometric mean: log of x / g differs from log x by a multiple of x, which X holds
    column = x * (np.log(x) - np.log(x).mean())
    weighed = column if root is None else column * root
    new = outside(basis(X), weighed)
    length = float(new @ new)
    b = float(np.linalg.lstsq(X / np.linalg.norm(X, axis=0), z, rcond=None)[0][-1] / np.linalg.norm(X[:, -1]))
    if length <= 1e-18 * float(weighed @ weighed):
        return None
    delta = float(new @ z) / length
    return PowerStep(column, delta, 1 + delta / b if b else float("nan"))


def pe_columns(level_fit: Array, log_fit: Array) -> tuple[Array, Array] | None:
    """Columns (n,) that speak against the model in y, and against the one in log y (PE test; see `pe_test`).

    None where a fitted value of the model in y is not above zero.
    """
    if np.min(level_fit) <= 0:
        return None
    return log_fit - np.log(level_fit), level_fit - np.exp(log_fit)
