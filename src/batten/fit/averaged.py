"""Values with their uncertainty: what every functional of the rows comes back as."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.stats import t as student

from batten.engine.rows import Array

__all__ = ["Averaged", "interval", "jackknife_root"]


@dataclass(frozen=True, eq=False)
class Averaged:
    """Values (G,) and their uncertainty.

    root (N, G): covariance of the values is root' root; its rows belong to the data rows (or to parameters and residual
    spread under constant errors). Many rows and many places make it large, so it is kept as loads (r, G) of few
    features (N, r in all), root = features @ loads; None means that loads are the root. left_out (n, G): the values
    without row i, or None beyond the jackknife's reach. bias (b, G): further rows of the root, independent of all
    others, for what smoothing may have taken away; None without smoothing.
    """

    value: Array
    loads: Array
    left_out: Array | None
    df: float
    features: tuple[Array, ...] | None = None
    bias: Array | None = None

    @property
    def root(self) -> Array:
        return self.by_row if self.bias is None else np.vstack([self.by_row, self.bias])

    @property
    def by_row(self) -> Array:
        """The root's rows that belong to the data rows."""
        return self.loads if self.features is None else np.hstack(self.features) @ self.loads

    @cached_property
    def _cross(self) -> Array:
        """Cross-product of the features (r, r)."""
        return _products(self.features or (), self.features or ())

    def combine(self, weights: Array) -> Averaged:
        """Linear combinations: weights (G, H)."""
        left = None if self.left_out is None else self.left_out @ weights
        bias = None if self.bias is None else self.bias @ weights
        return Averaged(self.value @ weights, self.loads @ weights, left, self.df, self.features, bias)

    def log(self) -> Averaged:
        """Logarithms of positive values (NaN elsewhere)."""
        with np.errstate(invalid="ignore", divide="ignore"):
            value = np.log(self.value)
            bias = None if self.bias is None else self.bias / self.value
            if self.left_out is None:
                return Averaged(value, self.loads / self.value, None, self.df, self.features, bias)
            left = np.log(self.left_out)
        return Averaged(value, jackknife_root(left), left, self.df, bias=bias)

    @property
    def error(self) -> Array:
        """Standard errors (G,)."""
        return np.asarray(np.sqrt((self.root**2).sum(axis=0)))

    def covariance_of_gap(self, other: Averaged) -> Array:
        """Covariance (G, G) of self minus other, whose roots belong to the same rows."""
        bias = sum(a.bias.T @ a.bias for a in (self, other) if a.bias is not None)
        if self.features is None or other.features is None:
            root = self.by_row - other.by_row
            return np.asarray(root.T @ root + bias)
        between = self.loads.T @ _products(self.features, other.features) @ other.loads
        own = (a.loads.T @ a._cross @ a.loads for a in (self, other))
        return np.asarray(sum(own) - between - between.T + bias)


def _products(one: tuple[Array, ...], two: tuple[Array, ...]) -> Array:
    """Cross-products of two stacks of columns, without copying them side by side."""
    return np.block([[a.T @ b for b in two] for a in one])


def jackknife_root(left: Array) -> Array:
    n = len(left)
    return np.asarray(np.sqrt((n - 1) / n) * (left - left.mean(axis=0)))


def interval(averaged: Averaged, level: float, *, positive: bool = False) -> tuple[Array, Array]:
    """Lower and upper ends (G,) by the t quantile; on the log scale where the values are positive means."""
    t = float(student.ppf(0.5 + level / 2, averaged.df))
    if positive:
        logs = averaged.log()
        half = t * logs.error
        return averaged.value * np.exp(-half), averaged.value * np.exp(half)
    half = t * averaged.error
    return averaged.value - half, averaged.value + half
