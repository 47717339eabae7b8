"""Columns that repeat what others say are found before anything is fitted, and left out by name."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from scipy.linalg import cholesky

from batten.engine.rows import Array

__all__ = ["Kept", "keep_independent", "repeats"]

#: a column is aliased when this share of its length, or less, is left beside the columns before it. Rounding leaves
#: about 1e-15; a covariate's square or cube beside it, uncentred, leaves 1e-5 to 1e-8.
_LEFT = 1e-11
#: rows looked at at once, so that no second copy of the design is held
_BLOCK = 4096


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
    ones = np.ones(len(x))

    def block(rows: slice) -> Array:
        return np.column_stack([ones[rows], x[rows], base[rows], x[rows, None] * modifier[rows]])

    q, m = base.shape[1], modifier.shape[1]
    if intercept is not None and _surely_independent(_cross_products(block, len(x))[2:, 2:]):
        return Kept(tuple(range(q)), tuple(range(m)), intercept, constant=True)
    # from here on the columns are those of a small triangle, whose geometry is that of the n rows
    small = _triangle(block, len(x))
    one, line, base, slopes = small[:, :1], small[:, 1:2], small[:, 2 : 2 + q], small[:, 2 + q :]
    kept = _kept_base(one, line, base, slopes, intercept)
    lost = _dependent(np.column_stack([base[:, kept], slopes]))
    return Kept(
        base=tuple(kept),
        modifier=tuple(j for j in range(m) if j + len(kept) not in lost),
        intercept=None if intercept is None else kept.index(intercept),
        constant=intercept is not None or _in_span(one, base),
    )


def _kept_base(one: Array, line: Array, base: Array, slopes: Array, intercept: int | None) -> list[int]:
    """Base columns that say something beside the intercept, x (where the formula can say x) and those before them."""
    rest = [j for j in range(base.shape[1]) if j != intercept]
    first = [one] if intercept is not None else []
    first += [line] if _in_span(line, slopes) else []
    lost = {j - len(first) for j in _dependent(np.column_stack([*first, base[:, rest]]))}
    gone = {rest[j] for j in lost if j >= 0}
    return [j for j in range(base.shape[1]) if j not in gone]


def _in_span(column: Array, columns: Array) -> bool:
    """Whether a column (k, 1) is a combination of others."""
    last = columns.shape[1]
    return last > 0 and last in _dependent(np.column_stack([columns, column]))


def repeats(columns: Array) -> list[int]:
    """Positions of the columns (n, k) that are combinations of those before them."""
    return _dependent(_triangle(lambda rows: columns[rows], len(columns)))


def _blocks(block: Callable[[slice], Array], count: int) -> Iterator[Array]:
    for start in range(0, count, _BLOCK):
        yield block(slice(start, start + _BLOCK))


def _cross_products(block: Callable[[slice], Array], count: int) -> Array:
    return np.asarray(sum(part.T @ part for part in _blocks(block, count)))


def _surely_independent(cross: Array) -> bool:
    """A quick look at the cross-products (k, k), which settles nearly every design without a QR of all rows.

    Cross-products carry rounding of 1e-16, which a pivot (a squared share of length) passes on divided by its size:
    with all pivots above 1e-7 none is in doubt.
    """
    size = np.sqrt(np.diag(cross))
    if not np.all(size > 0):
        return False
    try:
        pivots = np.diag(cholesky(cross / np.outer(size, size))) ** 2
    except np.linalg.LinAlgError:
        return False
    return bool(pivots.min() > 1e-7)


def _triangle(block: Callable[[slice], Array], count: int) -> Array:
    """R of the columns' QR, by merging the triangles of blocks of rows."""
    triangle = np.empty((0, block(slice(0, 0)).shape[1]))
    for part in _blocks(block, count):
        triangle = np.asarray(np.linalg.qr(np.vstack([triangle, part]), mode="r"))
    return triangle


def _dependent(columns: Array) -> list[int]:
    """Gram-Schmidt, twice, so that what is left of a column is exact to rounding."""
    found: list[int] = []
    basis = np.empty((columns.shape[0], 0))
    for j in range(columns.shape[1]):
        left = columns[:, j]
        for _ in range(2):
            left = left - basis @ (basis.T @ left)
        length, before = float(np.linalg.norm(left)), float(np.linalg.norm(columns[:, j]))
        if length <= _LEFT * before:
            found.append(j)
        else:
            basis = np.column_stack([basis, left / length])
    return found
