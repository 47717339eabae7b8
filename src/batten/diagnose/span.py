"""Column spans: what columns add to a design, whatever their units and whether or not they repeat each other.

The tests of this folder ask how much a few columns explain beyond a design, never for coefficients; so they work with
orthonormal bases, in which redundant columns vanish by rank.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import qr

from batten.engine.rows import Array

__all__ = ["basis", "beyond", "has_constant", "leverages", "outside", "whitened"]

#: a unit column whose part outside the span is shorter than this counts as inside it
SAME = 1e-9


def basis(X: Array) -> Array:
    """Orthonormal basis (n, rank) of the columns of X (n, p), each judged against its own length."""
    X = X[:, np.any(X != 0, axis=0)]
    if X.shape[1] == 0:
        return X
    Q, R = np.linalg.qr(X / np.linalg.norm(X, axis=0))
    # pivoting on the small triangle finds the rank; on the n rows it would cost several times as much
    turn, R, _ = qr(R, mode="economic", pivoting=True)
    rank = int((np.abs(np.diag(R)) > SAME).sum())
    return np.asarray(Q @ turn[:, :rank], dtype=np.float64)


def outside(Q: Array, A: Array) -> Array:
    """The part of A, (n,) or (n, k), outside the span of the orthonormal Q (n, p)."""
    left = A - Q @ (Q.T @ A)
    # cancellation leaves rounding along Q; a second projection removes it
    return np.asarray(left - Q @ (Q.T @ left))


def beyond(Q: Array, extra: Array) -> Array:
    """Orthonormal basis (n, q) of what the columns `extra` (n, k) add to the span of the orthonormal Q (n, p)."""
    extra = extra[:, np.any(extra != 0, axis=0)]
    left = outside(Q, extra / np.linalg.norm(extra, axis=0))
    return basis(left[:, np.linalg.norm(left, axis=0) > SAME])


def has_constant(Q: Array, weights: Array | None = None) -> bool:
    """Whether a constant lies in the span of the orthonormal Q (n, p), whose rows may be whitened by `weights`."""
    one = np.ones(len(Q)) if weights is None else np.sqrt(weights)
    return bool(np.linalg.norm(outside(Q, one)) < 1e-8 * np.linalg.norm(one))


def leverages(Q: Array) -> Array:
    """Diagonal (n,) of the hat matrix of the orthonormal Q (n, p)."""
    return np.asarray(np.einsum("ij,ij->i", Q, Q))


def whitened(weights: Array | None, *arrays: Array) -> list[Array]:
    """Rows times the square root of their variance weights (Var = s2 / w); the same arrays without weights."""
    if weights is None:
        return list(arrays)
    root = np.sqrt(weights)
    return [a * (root if a.ndim == 1 else root[:, None]) for a in arrays]
