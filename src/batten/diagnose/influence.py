"""Which rows decide: the constants, the bend, and the choice between two remedies.

Everything comes from one fit in closed form; no row is refitted. Influence belongs to a scale: judge it on the remedy
in question, never on the straight line.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import stats

from batten.diagnose.span import basis, beyond, leverages, outside
from batten.engine.rows import Array

__all__ = ["PowerPull", "Preference", "dfbeta", "gaps_without", "loo_log_scores", "power_pull", "preference"]

#: a row with leverage this near 1 owns a parameter: the fit without it does not exist
OWNED = 1e-9


@dataclass(frozen=True, eq=False)
class PowerPull:
    """Atkinson's constructed variable for a power of the response.

    coefficient, t: of the constructed variable. power: 1 - coefficient, a quick estimate of lambda. without (n,): the
    same with each row left out, NaN where the row owns a parameter. response, constructed (n,): residuals of both on
    the design, the axes of the added-variable plot that shows which rows pull.
    """

    coefficient: float
    t: float
    power: float
    without: Array
    response: Array
    constructed: Array


@dataclass(frozen=True, eq=False)
class Preference:
    """Log-score preference for one remedy over another.

    per_row (n,): differences. total, mean, std_error (of the mean, paired): over rows where both are defined. row: the
    index of the row that speaks loudest for the preferred remedy; without: the total without it.
    """

    per_row: Array
    total: float
    mean: float
    std_error: float
    row: int
    without: float


def dfbeta(X: Array, e: Array, columns: list[int]) -> Array:
    """b - b_(-i) for the given columns, (n, len(columns)): (X'X)^-1 x_i e_i / (1 - h_i), units of the coefficients.

    Give the curvature columns of a remedy to see which rows make the bend. NaN for a row that owns a parameter.
    """
    length = np.linalg.norm(X, axis=0)
    Q, R = np.linalg.qr(X / length)
    rows = np.linalg.solve(R, Q.T)[columns] / length[columns, None]
    return np.asarray((rows * _left_out(e, leverages(Q))).T)


def gaps_without(X0: Array, extra: Array, z: Array) -> Array:
    """Largest difference that the columns `extra` (n, k) make to the fit, with row i left out of both fits (n,).

    Over the rows as they stand, so that a row left out is still looked at. From one fit of each; NaN for a row that
    owns a parameter. n by n numbers are made: give a part of very many rows.
    """
    Q0 = basis(X0)
    Q1 = np.hstack([Q0, beyond(Q0, extra)])
    shift, moved = np.zeros(len(z)), np.zeros((len(z), len(z)))
    for Q, sign in ((Q1, 1.0), (Q0, -1.0)):
        shift += sign * (Q @ (Q.T @ z))
        moved += sign * Q @ (Q * _left_out(outside(Q, z), leverages(Q))[:, None]).T
    return np.asarray(np.abs(shift[:, None] - moved).max(axis=0))


def power_pull(X: Array, y: Array) -> PowerPull | None:
    """Constructed variable w = y (log(y / G) - 1), G the geometric mean: regress y on (X, w) (Atkinson 1973, 1985).

    lambda is roughly 1 - coefficient, so the t test asks whether y should be transformed at all, and the rows that move
    the coefficient are those that choose the transformation. None unless y > 0 and w adds to X.
    """
    if np.min(y) <= 0:
        return None
    logs = np.log(y)
    w = y * (logs - logs.mean() - 1)
    Q = basis(X)
    new, response = outside(Q, w), outside(Q, y)
    length, df = float(new @ new), len(y) - Q.shape[1] - 1
    if df < 1 or length <= 1e-18 * float(w @ w):
        return None
    coefficient = float(new @ response) / length
    left = response - coefficient * new
    h = leverages(Q) + new**2 / length
    change = new / length * _left_out(left, h)
    spread = float(np.sqrt(left @ left / (df * length)))
    t = coefficient / spread if spread > 0 else float(np.copysign(np.inf, coefficient))
    return PowerPull(coefficient, t, 1 - coefficient, 1 - coefficient + change, response, new)


def loo_log_scores(e: Array, h: Array, *, s2: float, df: int, log_jacobian: Array) -> Array:
    """Leave-one-out log predictive density per row (n,), in units of y (proper: Gneiting and Raftery 2007).

    Of a Gaussian linear model on the scale of the fit, parameter uncertainty included: with
    t_i = e_i / (s_(-i) sqrt(1 - h_i)), log f of a t on df - 1 at t_i + log((1 - h_i) / s2_(-i)) / 2 + log |T'(y_i)|.
    e: residuals; h: leverages; s2 = RSS / df; df = n - p; log_jacobian: per row. Constants the data chose (lambda,
    powers, knots) count as known. NaN for a row that owns a parameter.
    """
    free = np.where(1 - h > OWNED, 1 - h, np.nan)
    s2_without = (s2 * df - e**2 / free) / (df - 1)
    t = e / np.sqrt(s2_without * free)
    return np.asarray(stats.t.logpdf(t, df - 1) + 0.5 * np.log(free / s2_without) + log_jacobian)


def preference(first: Array, second: Array) -> Preference | None:
    """Row by row, how much better `first` (n,) predicted than `second`: log scores, larger is better.

    A preference that vanishes without one row is that row's. None below two rows with both scores.
    """
    per_row = np.asarray(first - second, dtype=np.float64)
    known = np.isfinite(per_row)
    d = per_row[known]
    if len(d) < 2:
        return None
    total = float(d.sum())
    along = np.where(known, per_row * (1.0 if total >= 0 else -1.0), -np.inf)
    row = int(np.argmax(along))
    std_error = float(np.std(d, ddof=1) / np.sqrt(len(d)))
    return Preference(per_row, total, float(d.mean()), std_error, row, total - float(per_row[row]))


def _left_out(e: Array, h: Array) -> Array:
    """Residual of each row from the fit without it, e / (1 - h)."""
    return np.asarray(e / np.where(1 - h > OWNED, 1 - h, np.nan))
