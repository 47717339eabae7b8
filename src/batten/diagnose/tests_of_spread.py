"""Is the spread constant? Tests on squared residuals, and the spread itself in units of the response.

Run them on the residuals of the flexible fit (a restricted cubic spline): a missed bend makes squared residuals vary
and would accuse the wrong suspect. Residuals `e` (n,) are on the scale of the fit; with variance weights give e times
sqrt(w), which should have constant spread. Every function returns None where the test cannot be made on these rows.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import combinations_with_replacement

import numpy as np
from scipy import stats

from batten.diagnose.repeats import even_groups
from batten.diagnose.span import basis, outside
from batten.engine.rows import Array

__all__ = [
    "GroupSpread", "Park", "Spread", "SpreadTest",
    "breusch_pagan", "brown_forsythe", "fitted_spread", "koenker", "park", "white", "white_special",
]  # fmt: skip


@dataclass(frozen=True)
class SpreadTest:
    """Chi-square test on squared residuals. r2: of these on the columns; f, f_p: its F form on (df, rest)."""

    statistic: float
    df: int
    p: float
    r2: float
    rest: int

    @property
    def f(self) -> float:
        return np.inf if self.r2 >= 1 else (self.r2 / self.df) / ((1 - self.r2) / self.rest)

    @property
    def f_p(self) -> float:
        return float(stats.f.sf(self.f, self.df, self.rest))


@dataclass(frozen=True)
class GroupSpread:
    """F test of equal spread in groups of fitted values. sds: SD of the residuals in each group, low fits first."""

    statistic: float
    df: tuple[int, int]
    p: float
    sds: tuple[float, ...]


@dataclass(frozen=True)
class Spread:
    """Fitted SD at the 10th and 90th percentile of a column, units of the residuals. ratio: high / low."""

    at: tuple[float, float]
    low: float
    high: float

    @property
    def ratio(self) -> float:
        return self.high / self.low


@dataclass(frozen=True)
class Park:
    """slope of log variance on log mean with its robust standard error; near 0, 1, 2, 3: Gaussian, Poisson, Gamma
    or log-normal, inverse Gaussian. df: residual degrees of freedom for an interval."""

    slope: float
    std_error: float
    df: int


def koenker(e: Array, columns: Array) -> SpreadTest | None:
    """n R2 of squared residuals on `columns` (n, k) and a constant (Koenker 1981).

    The default, robust to non-normality. For clustered rows use `add_on_robust` with a constant as the null design and
    e squared as the response.
    """
    return _auxiliary(e, columns)


def white(e: Array, X: Array) -> SpreadTest | None:
    """n R2 of squared residuals on the columns of X (n, p), their squares and products (White 1980).

    Products that repeat other columns (of dummies, of a polynomial's terms) are dropped by rank, and cost no degrees of
    freedom.
    """
    U = _standardised(X)
    products = [U[:, i] * U[:, j] for i, j in combinations_with_replacement(range(U.shape[1]), 2)]
    return _auxiliary(e, np.column_stack([U, *products]))


def white_special(e: Array, fitted: Array) -> SpreadTest | None:
    """n R2 of squared residuals on the fitted values and their squares, 2 degrees of freedom (White's special case)."""
    U = _standardised(fitted[:, None])
    return _auxiliary(e, np.column_stack([U, U**2]))


def breusch_pagan(e: Array, columns: Array) -> SpreadTest | None:
    """Half the explained sum of squares of e^2 / mean(e^2) on the columns (Breusch and Pagan 1979).

    Trusts normal errors: rejects too often with heavy tails. For comparison with other programs; `koenker` decides.
    """
    studentised = _auxiliary(e, columns)
    if studentised is None:
        return None
    u = e**2 / np.mean(e**2)
    statistic = studentised.r2 * float(np.sum((u - u.mean()) ** 2)) / 2
    return replace(studentised, statistic=statistic, p=float(stats.chi2.sf(statistic, studentised.df)))


def brown_forsythe(e: Array, fitted: Array, *, groups: int = 2) -> GroupSpread | None:
    """Levene's test with medians on residuals in 2 to 4 groups of nearly equal size along the fitted values.

    Brown and Forsythe 1974. Equal fitted values stay together.
    """
    codes = even_groups(fitted, groups)
    if codes is None or np.min(np.bincount(codes)) < 2:
        return None
    parts = [e[codes == g] for g in range(groups)]
    distances = [np.abs(part - np.median(part)) for part in parts]
    # equal distances in every group (in pairs, always) leave nothing to compare with
    if all(np.ptp(d) <= 1e-12 * np.max(np.abs(e)) for d in distances):
        return None
    f, p = stats.levene(*parts, center="median")
    sds = tuple(float(np.std(part, ddof=1)) for part in parts)
    return GroupSpread(float(f), (groups - 1, len(e) - groups), float(p), sds)


def fitted_spread(e: Array, driver: Array) -> Spread | None:
    """SD of the residuals at the 10th and 90th percentile of `driver` (n,): x, or the fitted values.

    A log-linear variance function fitted to squared residuals, so it is positive everywhere.
    """
    at = float(np.quantile(driver, 0.1)), float(np.quantile(driver, 0.9))
    if at[1] <= at[0]:
        return None
    centre, scale = float(np.mean(driver)), float(np.std(driver))
    b = _log_linear(np.column_stack([np.ones_like(e), (driver - centre) / scale]), e**2)
    if b is None:
        return None
    low, high = (float(np.exp((b[0] + b[1] * (place - centre) / scale) / 2)) for place in at)
    return Spread(at, low, high)


def park(y: Array, mu: Array) -> Park | None:
    """Modified Park test: Gamma-log regression of (y - mu)^2 on log mu (Manning and Mullahy 2001).

    mu (n,): fitted means, from a log link or back-transformed, units of y. None unless all are above zero and differ.
    The standard error is of HC3 type, since squared residuals are far from Gamma.
    """
    if np.min(mu) <= 0 or len(y) < 4:
        return None
    log_mu = np.log(mu)
    away = log_mu - log_mu.mean()
    if np.max(np.abs(away)) <= 1e-10:
        return None
    W = np.column_stack([np.ones_like(away), away])
    squares = (y - mu) ** 2
    b = _log_linear(W, squares)
    if b is None:
        return None
    Q = basis(W)
    u = squares * np.exp(-(W @ b)) - 1
    inflated = u / np.maximum(1 - np.einsum("ij,ij->i", Q, Q), 1e-9)
    influence = np.linalg.solve(W.T @ W, W.T * inflated)
    return Park(float(b[1]), float(np.sqrt(np.sum(influence[1] ** 2))), len(y) - 2)


def _auxiliary(e: Array, columns: Array) -> SpreadTest | None:
    """n R2 of e^2 on the columns and a constant, redundant columns dropped by rank."""
    n = len(e)
    Q = basis(np.column_stack([np.ones(n), _standardised(columns)]))
    df, rest = Q.shape[1] - 1, n - Q.shape[1]
    squares = e**2
    about = squares - squares.mean()
    total = float(about @ about)
    if df < 1 or rest < 1 or total <= 1e-24 * float(squares @ squares):
        return None
    r2 = float(np.clip(1 - np.sum(outside(Q, about) ** 2) / total, 0, 1))
    return SpreadTest(n * r2, df, float(stats.chi2.sf(n * r2, df)), r2, rest)


def _standardised(X: Array) -> Array:
    """Columns of mean 0 and SD 1; constant ones are left out. Beside a constant they span the same as X."""
    away = X - X.mean(axis=0)
    size = np.sqrt(np.mean(away**2, axis=0))
    varies = size > 1e-10 * np.max(np.abs(X), axis=0)
    return np.asarray(away[:, varies] / size[varies])


def _log_linear(W: Array, d: Array, *, steps: int = 100) -> Array | None:
    """Coefficients b of E[d] = exp(W b) by Gamma quasi-likelihood, d (n,) >= 0; W (n, q) opens with a constant.

    Minimises sum(d exp(-W b) + W b), which is convex: Newton's steps, halved until it falls. None where it does not
    settle (too few d above zero).
    """
    level = float(np.mean(d))
    if not level > 0:
        return None
    b = np.zeros(W.shape[1])

    def loss(b: Array) -> float:
        with np.errstate(over="ignore", invalid="ignore"):
            return float(np.mean(d / level * np.exp(-(W @ b)) + W @ b))

    value = loss(b)
    for _ in range(steps):
        weight = d / level * np.exp(-(W @ b))
        step = np.linalg.lstsq((W.T * weight) @ W, W.T @ (weight - 1), rcond=None)[0]
        while not (new := loss(b + step)) <= value + 1e-13 * abs(value) and np.max(np.abs(step)) > 1e-12:
            step = step / 2
        b, value = b + step, new
        if np.max(np.abs(step)) <= 1e-10:
            b[0] += np.log(level)
            return b
    return None
