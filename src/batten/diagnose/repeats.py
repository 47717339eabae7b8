"""Rows that repeat, and cuts that keep equal values together."""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Array, Ints

__all__ = ["even_groups", "repeat_groups"]


def repeat_groups(X: Array) -> Ints:
    """Codes 0..m-1 (n,) of the distinct rows of X (n, p); lower codes have smaller first columns.

    Values that agree to 12 digits of their column's largest are the same: a column computed from a repeated value may
    differ in its last bit.
    """
    size = np.max(np.abs(X), axis=0)
    rounded = np.round(X / np.where(size > 0, size, 1.0), 12)
    order = np.lexsort(rounded.T[::-1])
    ordered = rounded[order]
    new = np.any(ordered[1:] != ordered[:-1], axis=1)
    codes = np.empty(len(X), dtype=np.intp)
    codes[order] = np.concatenate([[0], np.cumsum(new)])
    return codes


def even_groups(values: Array, count: int) -> Ints | None:
    """Codes 0..count-1 (n,) of groups of nearly equal size along `values` (n,), ties kept together.

    Each cut goes to the place between two different values that is nearest to the even share; of two as near, the one
    farther from the middle, so that reversed values give mirrored thirds. None when there are too few different values
    for `count` groups.
    """
    n = len(values)
    _, where, sizes = np.unique(values, return_inverse=True, return_counts=True)
    if len(sizes) < count:
        return None
    ends = np.cumsum(sizes)[:-1]
    cuts: list[int] = []
    for j in range(1, count):
        share = round(j * n / count) if 2 * j <= count else n - round((count - j) * n / count)
        first = cuts[-1] + 1 if cuts else 0
        open_places = np.arange(first, len(ends) - (count - 1 - j))
        miss = np.abs(ends[open_places] - share) + 1e-9 * np.minimum(ends[open_places], n - ends[open_places]) / n
        cuts.append(int(open_places[np.argmin(miss)]))
    return np.searchsorted(np.array(cuts), where, side="left").astype(np.intp)
