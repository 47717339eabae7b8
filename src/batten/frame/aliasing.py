"""Columns that repeat what others say are found before anything is fitted, and left out by name."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import cholesky

from batten.engine.rows import Array

__all__ = ["Kept", "keep_independent", "repeats"]

#: a column is aliased when this share of its length, or less, is left beside the columns before it. Rounding leaves
#: about 1e-15; a covariate's square or cube beside it, uncentred, leaves 1e-5 to 1e-8.
_LEFT = 1e-11


@dataclass(frozen=True)
class Kept:
    """Columns that are independent.

    base, modifier: positions kept. intercept: its position among the kept base columns, or None. constant: whether a
    constant lies in the span of base.
    """

    base: tuple[int, ...]
    modifier: tuple[int, ...]
    intercept: int | None
    constant: bool


def keep_independent(x: Array, base: Array, modifier: Array, *, intercept: int | None) -> Kept:
    """x (n,), base (n, q), modifier (n, m): what to keep so that the straight line [base | x * modifier] is estimable.

    A covariate that is the focal predictor in other units goes, not the focal predictor; a group in which x does not
    vary keeps its level and loses its slope. intercept: position of the constant column in base, or None.
    """
    rest = [j for j in range(base.shape[1]) if j != intercept]
    ones = np.ones((len(x), 1))
    # x itself goes before the covariates, provided that the formula can say "x" (x, or x within every group)
    first = [ones] if intercept is not None else []
    first += [x[:, None]] if _spans_constant(modifier) else []
    lead = len(first)
    lost = repeats(np.column_stack([*first, base[:, rest]])) if rest else []
    gone = {rest[j - lead] for j in lost if j >= lead}
    kept = tuple(j for j in range(base.shape[1]) if j not in gone)
    ahead = base[:, list(kept)]
    lost = repeats(np.column_stack([ahead, x[:, None] * modifier]))
    slopes = tuple(j for j in range(modifier.shape[1]) if j + len(kept) not in lost)
    place = None if intercept is None else kept.index(intercept)
    return Kept(kept, slopes, place, intercept is not None or _spans_constant(ahead))


def _spans_constant(columns: Array) -> bool:
    """Whether a constant is a combination of the columns."""
    if columns.shape[1] == 0:
        return False
    if np.any(np.all(columns == 1, axis=0)):
        return True
    ones = np.ones((len(columns), 1))
    independent = [j for j in range(columns.shape[1]) if j not in repeats(columns)]
    return repeats(np.column_stack([columns[:, independent], ones])) == [len(independent)]


def repeats(columns: Array) -> list[int]:
    """Positions of the columns (n, k) that are combinations of those before them."""
    if columns.shape[1] == 0:
        return []
    cross = columns.T @ columns
    size = np.sqrt(np.diag(cross))
    if np.all(size > 0) and _surely_independent(cross / np.outer(size, size)):
        return []
    return _dependent(np.asarray(np.linalg.qr(columns / np.where(size > 0, size, 1.0), mode="r")))


def _surely_independent(cosines: Array) -> bool:
    """A quick look at the cross-products (k, k), which settles nearly every design without a QR of all rows.

    Cross-products carry rounding of 1e-16, so pivots (squared shares of length) above 1e-8 are beyond doubt.
    """
    try:
        pivots = np.diag(cholesky(cosines)) ** 2
    except np.linalg.LinAlgError:
        return False
    return bool(pivots.min() > 1e-8)


def _dependent(triangle: Array) -> list[int]:
    """Gram-Schmidt, twice, on the triangle's columns (their geometry is that of the full columns)."""
    found: list[int] = []
    basis = np.empty((triangle.shape[0], 0))
    for j in range(triangle.shape[1]):
        left = triangle[:, j]
        for _ in range(2):
            left = left - basis @ (basis.T @ left)
        length = float(np.linalg.norm(left))
        if length <= _LEFT * max(float(np.linalg.norm(triangle[:, j])), _LEFT):
            found.append(j)
        else:
            basis = np.column_stack([basis, left / length])
    return found
