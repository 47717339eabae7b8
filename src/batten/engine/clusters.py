"""Rows that belong together: sums over clusters, and fits with one cluster left out."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from batten.engine.rows import Array, Ints

__all__ = ["Clusters"]

#: share of a direction's length from which a cluster owns it, so that no fit without the cluster exists
OWNS = 1 - 1e-8
#: numbers held at once
BLOCK = 4_000_000


@dataclass(frozen=True, eq=False)
class Clusters:
    """code (n,): cluster 0..G-1 of each row, every code in use."""

    code: Ints

    @cached_property
    def order(self) -> Ints:
        """Rows sorted by cluster."""
        return np.argsort(self.code, kind="stable")

    @cached_property
    def starts(self) -> Ints:
        """Where each cluster starts in that order (G,)."""
        return np.searchsorted(self.code[self.order], np.arange(self.count))

    @cached_property
    def count(self) -> int:
        """G."""
        return int(self.code.max()) + 1

    def sums(self, values: Array) -> Array:
        """Sums within clusters: (n, ...) -> (G, ...)."""
        return np.asarray(np.add.reduceat(values[self.order], self.starts, axis=0))

    def scores(self, q: Array, e: Array, *, leave_out: bool = True) -> Array:
        """Change of the coefficients of an orthonormal basis q (n, p) through each cluster, (G, p), sign reversed.

        leave_out: (I - Q_g'Q_g)^-1 Q_g'e_g, the exact change when cluster g is left out of least squares with residuals
        e (n,) (Bell and McCaffrey 2002); otherwise Q_g'e_g, to first order. A direction that only one cluster carries
        cannot be left out and does not move.
        """
        first = self.sums(q * e[:, None])
        if not leave_out:
            return first
        out, p = np.empty_like(first), q.shape[1]
        ends = np.append(self.starts[1:], len(e))
        low = 0
        while low < self.count:
            rows = max(BLOCK // p**2, int(ends[low] - self.starts[low]))
            high = max(low + 1, int(np.searchsorted(ends, self.starts[low] + rows, side="right")))
            part = q[self.order[self.starts[low] : ends[high - 1]]]
            cross = np.add.reduceat(
                part[:, :, None] * part[:, None, :], self.starts[low:high] - self.starts[low], axis=0
            )
            values, vectors = np.linalg.eigh(cross)
            stretch = np.where(values < OWNS, 1 / np.maximum(1 - values, 1 - OWNS), 0.0)
            along = np.einsum("gpk,gp->gk", vectors, first[low:high]) * stretch
            out[low:high] = np.einsum("gpk,gk->gp", vectors, along)
            low = high
        return out
