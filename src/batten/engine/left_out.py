"""What fits without one fold leave of their own rows, had from the fit to all rows.

With many rows a training set's coefficients differ from those of all rows by little: its residuals are e - A d with a
small d. Averages and medians over them then need no pass over the rows for every fold: sums of powers of A d over all
rows serve every fold, and only rows near the middle can be a median.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from batten.engine.rows import Array, Ints

__all__ = ["LeftOut"]

#: relative error of an average of exponentials from which the rows are gone through instead
PRECISE = 1e-8
#: a row whose length in A is beyond this many mean squares is followed by itself in the search for a median
FAR = 9.0
#: classes of residuals where they are pooled
CLASSES = 4096
#: half width of the stretch around the median that is searched, in largest shifts of the other rows
STRETCH = 2.5


@dataclass(frozen=True, eq=False)
class LeftOut:
    """Residuals of K training sets.

    e (n,): residuals of all rows' fit, rows sorted by fold. a (n, p): columns whose products with d (K, p) the training
    sets' fits add to the linear predictor. starts (K + 1,): fold k holds out rows starts[k] to starts[k + 1]; rows
    before starts[0] always train. length (n,): sums of squares of the rows of a.
    """

    e: Array
    a: Array
    d: Array
    starts: Ints
    length: Array

    @property
    def count(self) -> Ints:
        """Training rows of each set (K,)."""
        return len(self.e) - np.diff(self.starts)

    def own(self, k: int) -> Array:
        """Residuals of set k on its training rows."""
        low, high = self.starts[k : k + 2]
        e = np.concatenate([self.e[:low], self.e[high:]])
        e[:low] -= self.a[:low] @ self.d[k]
        e[low:] -= self.a[high:] @ self.d[k]
        return e

    @cached_property
    def shift(self) -> Array:
        """Largest that a residual can move in each set (K,)."""
        return np.asarray(np.sqrt(self.length.max() * (self.d**2).sum(axis=1)))

    @cached_property
    def bounds(self) -> tuple[float, float]:
        """Lowest and highest residual of all rows' fit."""
        return float(self.e.min()), float(self.e.max())

    @cached_property
    def averages(self) -> Array:
        """Mean residual of each training set (K,)."""
        low, high = self.starts[:-1], self.starts[1:]
        held_e, held_a = _sums(self.e, low, high), _sums(self.a, low, high)
        return np.asarray((self.e.sum() - held_e - ((self.a.sum(axis=0) - held_a) * self.d).sum(axis=1)) / self.count)

    @cached_property
    def exponentials(self) -> Array:
        """Mean of exp(residual) of each training set (K,), to a relative error below PRECISE.

        exp(e - s) = exp(e) (1 - s + s^2 / 2 - ...) with s = A d; what is left out is at most exp(max |s|) max |s| / 3
        times the quadratic part.
        """
        w = np.exp(self.e)
        zero, one, two = w.sum(), self.a.T @ w, self.a.T @ (self.a * w[:, None])
        out = np.empty(len(self.d))
        for k, d in enumerate(self.d):
            held = slice(*self.starts[k : k + 2])
            part = self.a[held] @ d
            linear = one @ d - w[held] @ part
            bent = 0.5 * (d @ two @ d - w[held] @ part**2)
            total = zero - w[held].sum() - linear + bent
            missing = np.exp(self.shift[k]) * self.shift[k] / 3 * bent
            out[k] = total / self.count[k] if missing <= PRECISE * total else np.exp(self.own(k)).mean()
        return out

    @cached_property
    def middles(self) -> Array:
        """The two middle residuals of each training set (K, 2); the same one twice where the number is odd.

        Exact: rows that cannot reach the middle are only counted.
        """
        far = self.length > FAR * self.length.mean()
        largest = float(np.sqrt((self.d**2).sum(axis=1).max()))
        shift = largest * float(np.sqrt(FAR * self.length.mean()))
        centre = float(np.median(self.e))
        low, high = centre - STRETCH * shift, centre + STRETCH * shift
        near = np.flatnonzero(((self.e >= low) & (self.e <= high)) | far)
        below = np.searchsorted(near, self.starts)  # where each fold's rows begin among those near
        before = np.concatenate([[0], np.cumsum((self.e < low) & ~far)])[np.append(self.starts, len(self.e))]
        e, a = self.e[near], self.a[near]
        out = np.empty((len(self.d), 2))
        for k, d in enumerate(self.d):
            own = np.delete(e - a @ d, slice(*below[k : k + 2]))
            size = int(self.count[k])
            under = int(before[-1] - (before[k + 1] - before[k]))
            places = np.array([(size - 1) // 2, size // 2]) - under
            if places[0] >= 0 and places[1] < len(own):
                out[k] = np.partition(own, places)[places]
                if low + shift <= out[k, 0] and out[k, 1] <= high - shift:
                    continue
            out[k] = np.partition(self.own(k), places + under)[places + under]
        return out

    @cached_property
    def _classes(self) -> tuple[Array, Array, Array]:
        """Rows in CLASSES of equal width along e, by set that holds them out (the last always trains): their number and
        sum of e (K + 1, CLASSES), sums of a (K + 1, CLASSES, p)."""
        low, high = self.bounds
        place = np.minimum(((self.e - low) * (CLASSES / ((high - low) or 1.0))).astype(np.intp), CLASSES - 1)
        sets, ends = len(self.d), np.append(self.starts, len(self.e))
        place[: ends[0]] += sets * CLASSES
        for k in range(1, sets):
            place[ends[k] : ends[k + 1]] += k * CLASSES

        def summed(values: Array | None) -> Array:
            return np.bincount(place, values, (sets + 1) * CLASSES).astype(np.float64).reshape(sets + 1, CLASSES)

        return summed(None), summed(self.e), np.stack([summed(column) for column in self.a.T], axis=2)

    def pooled(self, k: int, mean_square: float) -> tuple[Array, Array]:
        """Residuals of set k's training rows pooled into narrow classes, and their weights; mean_square: theirs.

        Each class has the mean of its rows; what is lost of their mean square by that is shared out evenly.
        """
        count, e, a = (part.sum(axis=0) - part[k] for part in self._classes)
        full = count > 0
        centre = (e[full] - a[full] @ self.d[k]) / count[full]
        weight = count[full] / self.count[k]
        half = np.sqrt(max(mean_square - float(weight @ centre**2), 0.0))
        return np.concatenate([centre - half, centre + half]), np.tile(weight / 2, 2)

    def squares(self, k: int, eta: Array, mean_square: float) -> Array:
        """Mean of max(eta + e, 0)^2 over the training rows of set k; mean_square: that of its residuals."""
        out = eta**2 + 2 * eta * self.averages[k] + mean_square
        short = np.flatnonzero(eta < self.shift[k] - self.bounds[0])
        if not len(short):
            return np.asarray(out)
        # what residuals below -eta would wrongly add
        tail = np.flatnonzero(self.e < self.shift[k] - eta.min())
        tail = tail[(tail < self.starts[k]) | (tail >= self.starts[k + 1])]
        e = np.sort(self.e[tail] - self.a[tail] @ self.d[k])
        sums = [np.concatenate([[0.0], np.cumsum(e**p)]) for p in range(3)]
        zero, one, two = (total[np.searchsorted(e, -eta[short])] for total in sums)
        out[short] -= (eta[short] ** 2 * zero + 2 * eta[short] * one + two) / self.count[k]
        return np.asarray(out)


def _sums(values: Array, low: Ints, high: Ints) -> Array:
    """Sums of values (n, ...) over each stretch of rows."""
    return np.stack([values[a:b].sum(axis=0) for a, b in zip(low, high, strict=True)])
