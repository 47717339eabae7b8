"""Coefficients on the fitting scale with the question's kind of error."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.stats import t as student

from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = ["Coefficients", "coefficients"]


@dataclass(frozen=True, eq=False)
class Coefficients:
    """estimate, error, low, high (p + q,): coefficients in raw units, then the shape's searched constants."""

    estimate: Array
    error: Array
    low: Array
    high: Array


def coefficients(est: Estimate, *, level: float = 0.95, errors: str = "robust") -> Coefficients:
    """Estimates with t intervals on the residual degrees of freedom, with clusters on their number less one.

    A searched constant of the shape (break, power, K) stands beside the coefficients, whose errors count it; powers
    chosen from a list do not. A searched power of y does not either: coefficients have no meaning across powers
    (Hinkley and Runger 1984), so they are given at the power found.
    """
    value = np.append(est.coef, est.theta[: est.moving])
    error = np.sqrt(np.diagonal(_covariance(est, errors))[: len(value)])
    half = float(student.ppf(0.5 + level / 2, est.df_error)) * error
    return Coefficients(value, error, value - half, value + half)


def _covariance(est: Estimate, errors: str) -> Array:
    if not est.remedy.left.searched:
        return est.covariance(errors)
    if errors == "constant":
        return np.asarray(est.factored.inverse_cross * est.sigma**2)
    moves = est.linear_moves() * est.few_clusters
    return np.asarray(moves.T @ moves)
