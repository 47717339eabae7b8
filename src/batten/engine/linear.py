"""Least squares of the displayed fit: one QR, refined coefficients, leverages.

Coefficients are refined with residuals in extended precision (Bjorck 1967, Iterative refinement of linear least squares
solutions), so that badly scaled polynomials keep the digits the data hold; elsewhere the refinement changes nothing.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from batten.engine.rows import Array, Rows

__all__ = ["REFINE_UP_TO", "Factored", "design", "factor", "solve"]

#: a column is aliased when less than this share of its length is left after the columns before it
ALIASED = 1e-11
#: from this many rows a triangle is had from cross-products, and how much of a column must be left beside the others
TALL, SAFE = 20_000, 1e-5
#: above this many numbers the extended-precision pass costs more than it can give
REFINE_UP_TO = 400_000


def design(rows: Rows, shape_columns: Array, *, own_level: bool = False) -> Array:
    """Design matrix (n, p): base columns, then the shape's columns times each modifier (modifier-major).

    own_level: the shape brings its own level, so the constant column of the base is left out.
    """
    base = rows.base
    if own_level and rows.intercept is not None:
        base = np.delete(base, rows.intercept, axis=1)
    n, m = rows.modifier.shape
    if m == 1 and (rows.modifier == 1).all():
        return np.hstack([base, shape_columns])
    focal = shape_columns[:, None, :] * rows.modifier[:, :, None]
    return np.hstack([base, focal.reshape(n, m * shape_columns.shape[1])])


@dataclass(frozen=True, eq=False)
class Factored:
    """Thin QR of a design with unit-length columns: X / length = q @ r. q (n, p), r (p, p), length (p,).

    basis: q, or what makes it again where it is not kept.
    """

    basis: Array | Callable[[], Array]
    r: Array
    length: Array

    @property
    def q(self) -> Array:
        return self.basis if isinstance(self.basis, np.ndarray) else self.basis()

    @property
    def leverage(self) -> Array:
        """h_i (n,)."""
        return np.asarray(np.einsum("ij,ij->i", self.q, self.q))

    @property
    def aliased(self) -> int:
        """How many columns are (numerically) combinations of the columns before them."""
        left = np.abs(np.diagonal(self.r))
        return int(self.r.shape[1] - len(left) + (left < ALIASED).sum())

    @cached_property
    def root(self) -> Array:
        """R^-1 in raw units (p, p): X @ root is orthonormal, root root' = (X'X)^-1."""
        return np.asarray(np.linalg.inv(self.r) / self.length[:, None])

    def on(self, basis: Array | Callable[[], Array]) -> Factored:
        """The same triangle with another basis, or another way to it."""
        other = Factored(basis, self.r, self.length)
        other.__dict__["root"] = self.root  # a penalised fit has its own
        return other

    @property
    def inverse_cross(self) -> Array:
        """(X'X)^-1 in raw units (p, p)."""
        return np.asarray(self.root @ self.root.T)


def factor(x: Array) -> Factored:
    """QR with columns scaled to unit length; ask `aliased` before using it."""
    length = np.sqrt((x * x).sum(axis=0))
    length = np.where(length == 0, 1.0, length)
    tall = _tall(x, length) if len(x) > TALL and x.shape[1] else None
    q, r = np.linalg.qr(x / length) if tall is None else tall
    return Factored(q, r, length)


def _tall(x: Array, length: Array) -> tuple[Array, Array] | None:
    """q and r of very many rows in a fifth of the time, by Cholesky's triangle of the cross-products, taken twice.

    Once leaves q orthonormal to the square of the columns' condition, twice to rounding (Yamamoto, Nakatsukasa,
    Yanagisawa and Fukaya 2015, Roundoff error analysis of the CholeskyQR2 algorithm). None where that is not safe.
    """
    try:
        first = np.linalg.cholesky(x.T @ x / np.outer(length, length)).T
        if np.diagonal(first).min() < SAFE:
            return None
        near = x @ (np.linalg.inv(first) / length[:, None])
        second = np.linalg.cholesky(near.T @ near).T
    except np.linalg.LinAlgError:
        return None
    if np.abs(second - np.eye(len(second))).max() > SAFE:
        return None
    return near @ np.linalg.inv(second), second @ first


def solve(factored: Factored, x: Array, z: Array) -> tuple[Array, Array]:
    """Least-squares coefficients (p,) in raw units, refined, and the residuals (n,) of the refined solution."""
    b = factored.root @ (factored.q.T @ z)
    if x.size > REFINE_UP_TO or x.size == 0:
        return b, z - x @ b
    wide_x, wide_z, wide_b = x.astype(np.longdouble), z.astype(np.longdouble), b.astype(np.longdouble)
    for _ in range(4):
        residual = wide_z - wide_x @ wide_b
        # the right-hand side of the semi-normal step is taken in extended precision, its solution need not be
        push = (wide_x.T @ residual).astype(np.float64)
        step = factored.root @ (factored.root.T @ push)
        wide_b = wide_b + step
        if not np.abs(step).max() > 1e-17 * np.abs(b).max():
            break
    refined = wide_b.astype(np.float64)
    if not np.isfinite(refined).all():
        return b, z - x @ b
    return refined, (wide_z - wide_x @ wide_b).astype(np.float64)
