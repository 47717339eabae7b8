"""Two small invented sets, one nearly straight (A) and one with a bottom (B), and published ones typed in."""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Array

__all__ = ["A_X", "A_Y", "BANK_X", "BANK_Y", "B_X", "B_Y", "line", "residuals", "shuffled"]

A_X = np.array([1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20], dtype=float)
A_Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
B_X = np.array([1, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11], dtype=float)
B_Y = np.array([9.1, 8.6, 7.9, 6.8, 7.2, 5.6, 4.9, 5.3, 4.4, 5.6, 5.1, 6.9, 7.8, 8.4, 9.6, 10.3])

#: Kutner, Nachtsheim, Neter and Li (2005), Applied Linear Statistical Models, table 3.4 (bank deposits)
BANK_X = np.array([125, 100, 200, 75, 150, 175, 75, 175, 125, 200, 100], dtype=float)
BANK_Y = np.array([160, 112, 124, 28, 152, 156, 42, 124, 150, 104, 136], dtype=float)


def line(x: Array, *more: Array) -> Array:
    """Design [1, x, more]."""
    return np.column_stack([np.ones_like(x), x, *more])


def residuals(X: Array, z: Array) -> Array:
    return z - X @ np.linalg.lstsq(X, z, rcond=None)[0]


def shuffled(n: int, seed: int) -> Array:
    return np.random.default_rng(seed).permutation(n)
