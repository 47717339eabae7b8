"""Is there curvature left? Tests that add columns to a design, or compare it with its own repeats.

Every function takes the null design X0 (n, p) and a response z (n,) on the scale of the fit, and returns None where
the test cannot be made on these rows (nothing to add, no degrees of freedom left). `weights` are variance weights
(Var = s2 / w); rows with frequency weights are to be repeated by the caller (np.repeat), which is what they mean.

All but the robust version assume constant variance: use `add_on_robust` where the spread is uneven. With fewer than
30 rows they have little power, with many they reject trifles: show `gap_rms` or `gap_max`, the size, beside p.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy import stats

from batten.diagnose.ladder_tests import pe_columns
from batten.diagnose.repeats import repeat_groups
from batten.diagnose.robust import scores_of_last
from batten.diagnose.span import basis, beyond, has_constant, outside, whitened
from batten.engine.rows import Array, Ints

__all__ = [
    "AddOn", "BothScales", "OneColumn", "PureError",
    "add_on", "add_on_robust", "link_test", "one_column", "pe_test", "pure_error", "reset",
]  # fmt: skip

#: a sum of squares below this share of z'z is rounding: a perfect fit
PERFECT = 1e-24
#: fitted values that vary by less than this share of their size are a flat fit: their powers would be rounding
FLAT = 1e-10


@dataclass(frozen=True)
class AddOn:
    """F test of columns added to a design.

    df: (columns added, residual degrees of freedom). errors: "constant", "HC3", "CR1" or "CR3".
    gap_rms, gap_max: root mean square and largest absolute difference between the two fits over the rows, units of z.
    """

    statistic: float
    df: tuple[int, int]
    p: float
    gap_rms: float
    gap_max: float
    errors: str = "constant"


@dataclass(frozen=True)
class PureError:
    """Lack of fit against the spread of repeated rows.

    df: (m - p, n - m) for m distinct rows. sum_lack, sum_pure: the two sums of squares, units of z squared.
    gap_rms: root mean square distance from the fit to the means of the repeats. sd: SD within repeats. Units of z.
    """

    statistic: float
    df: tuple[int, int]
    p: float
    sum_lack: float
    sum_pure: float
    gap_rms: float
    sd: float


@dataclass(frozen=True)
class OneColumn:
    """t test of one added column."""

    statistic: float
    df: int
    p: float
    estimate: float
    std_error: float


@dataclass(frozen=True)
class BothScales:
    """PE test. `level` speaks against the model in y, `log` against the model in log y; both or neither may."""

    level: OneColumn
    log: OneColumn


def add_on(X0: Array, extra: Array, z: Array, *, weights: Array | None = None) -> AddOn | None:
    """F test of the columns `extra` (n, k) beyond X0: of a spline's bends, of powers, of steps.

    The default test of a straight line, with the nonlinear columns of a restricted cubic spline whose knots were not
    chosen with these responses. Redundant columns are dropped by rank.
    """
    parts = _fit_both(X0, extra, z, weights=weights)
    if parts is None:
        return None
    df = parts.q, parts.df
    f = _f_ratio(float(parts.effect @ parts.effect) / parts.q, float(parts.left @ parts.left) / parts.df, parts.floor)
    return AddOn(f, df, float(stats.f.sf(f, *df)), *parts.gap(weights))


def add_on_robust(
    X0: Array, extra: Array, z: Array, *, weights: Array | None = None, cluster: Ints | None = None
) -> AddOn | None:
    """Wald F of the columns `extra` beyond X0 with errors that allow an uneven spread.

    HC3 (MacKinnon and White 1985) on (q, n - p - q) degrees of freedom; with cluster codes (n,) on (q, G - 1), CR3
    below 40 clusters, else CR1 (Bell and McCaffrey 2002; Cameron and Miller 2015). None also where one row or one
    cluster alone settles a tested column, or where the clusters are too few for the columns tested.
    """
    parts = _fit_both(X0, extra, z, weights=weights)
    if parts is None:
        return None
    scores = scores_of_last(parts.Q, parts.left, tested=parts.q, cluster=cluster)
    if scores is None:
        return None
    df = parts.q, parts.df if cluster is None else len(scores.values) - 1
    V = scores.values.T @ scores.values
    if float(parts.left @ parts.left) <= parts.floor:
        f = _f_ratio(float(parts.effect @ parts.effect), 0.0, parts.floor)
    elif df[1] < df[0] or np.linalg.matrix_rank(V, hermitian=True) < parts.q:
        return None
    else:
        f = float(parts.effect @ np.linalg.solve(V, parts.effect)) / parts.q
    return AddOn(f, df, float(stats.f.sf(f, *df)), *parts.gap(weights), scores.errors)


def reset(
    X0: Array, z: Array, *, powers: Sequence[int] = (2, 3), of: Array | None = None, weights: Array | None = None,
    robust: bool = False, cluster: Ints | None = None,
) -> AddOn | None:  # fmt: skip
    """RESET: F test of powers of the fitted values, or of the column `of` (n,), say the focal predictor (Ramsey 1969).

    Powers of the fitted values see nothing where the fit is nearly flat; powers of the focal predictor do. The base is
    scaled before it is raised, and centred where a constant is in the span (powers 2..k stay the same test).
    """
    of = fitted_values(X0, z, weights=weights) if of is None else of
    Q0 = basis(*whitened(weights, X0))
    base = of - of.mean() if has_constant(Q0, weights) else of
    size = float(np.sqrt(np.mean(base**2)))
    if size <= FLAT * float(np.sqrt(np.mean(of**2))):
        return None
    extra = np.column_stack([(base / size) ** k for k in powers])
    if robust or cluster is not None:
        return add_on_robust(X0, extra, z, weights=weights, cluster=cluster)
    return add_on(X0, extra, z, weights=weights)


def link_test(X0: Array, z: Array, *, weights: Array | None = None) -> OneColumn | None:
    """t test of the squared fit added to [1, fit]: is this the wrong scale? (Pregibon 1980)

    The fit is centred first, which moves neither t nor the estimate (units 1 / z).
    """
    fitted = fitted_values(X0, z, weights=weights)
    away = fitted - fitted.mean()
    if np.linalg.norm(away) <= FLAT * np.linalg.norm(fitted):
        return None
    return one_column(np.column_stack([np.ones_like(away), away]), away**2, z, weights=weights)


def pe_test(X_level: Array, y: Array, *, X_log: Array | None = None) -> BothScales | None:
    """PE test of a model in y against one in log y (MacKinnon, White and Davidson 1983).

    With f the level model's fit and gl the log model's: against the level model, t of (gl - log f) added to it; against
    the log model, t of (f - exp gl) added to it. Both or neither may be rejected. X_log: design of the log model where
    it differs. None where a response or a fitted value of the level model is not above zero, for log f does not exist.
    """
    X_log = X_level if X_log is None else X_log
    if np.min(y) <= 0:
        return None
    Q_level, Q_log = basis(X_level), basis(X_log)
    log_y = np.log(y)
    level_fit, log_fit = Q_level @ (Q_level.T @ y), Q_log @ (Q_log.T @ log_y)
    columns = pe_columns(level_fit, log_fit)
    if columns is None:
        return None
    level, log = one_column(X_level, columns[0], y), one_column(X_log, columns[1], log_y)
    return None if level is None or log is None else BothScales(level, log)


def pure_error(X0: Array, z: Array, *, weights: Array | None = None) -> PureError | None:
    """Lack of fit against pure error, where whole rows of X0 repeat.

    F = ((RSS - SSPE) / (m - p)) / (SSPE / (n - m)) with m distinct rows (Kutner and others 2005, section 3.7). None
    without repeats, without more distinct rows than parameters, or where all repeats agree exactly.
    """
    groups = repeat_groups(X0)
    w = np.ones(len(z)) if weights is None else weights
    total = np.bincount(groups, w)
    means = np.bincount(groups, w * z) / total
    Q0 = basis(*whitened(weights, X0))
    n, m, p = len(z), len(total), Q0.shape[1]
    sum_pure = float(w @ (z - means[groups]) ** 2)
    if n == m or m <= p or sum_pure <= PERFECT * float(w @ z**2):
        return None
    # RSS - SSPE without subtracting large sums: the fit's distance from the means of the repeats
    lack = means[groups] - fitted_values(X0, z, weights=weights)
    sum_lack = float(w @ lack**2)
    df = m - p, n - m
    f = (sum_lack / df[0]) / (sum_pure / df[1])
    gap = float(np.sqrt(np.mean(lack**2)))
    return PureError(f, df, float(stats.f.sf(f, *df)), sum_lack, sum_pure, gap, float(np.sqrt(sum_pure / df[1])))


def one_column(X0: Array, column: Array, z: Array, *, weights: Array | None = None) -> OneColumn | None:
    """t test of one column (n,) added to X0; None where X0 already holds it or no degree of freedom is left."""
    X0, column, z = whitened(weights, X0, column, z)
    Q0 = basis(X0)
    df = len(z) - Q0.shape[1] - 1
    new = outside(Q0, column)
    length = float(new @ new)
    if df < 1 or length <= 1e-18 * float(column @ column):
        return None
    estimate = float(new @ z) / length
    left = outside(Q0, z) - estimate * new
    std_error = float(np.sqrt(left @ left / (df * length)))
    t = estimate / std_error if std_error > 0 else float(np.copysign(np.inf, estimate))
    return OneColumn(t, df, float(2 * stats.t.sf(abs(t), df)), estimate, std_error)


def fitted_values(X0: Array, z: Array, *, weights: Array | None = None) -> Array:
    """Least-squares fit (n,) in units of z."""
    Xw, zw = whitened(weights, X0, z)
    Q0 = basis(Xw)
    fit = Q0 @ (Q0.T @ zw)
    return fit if weights is None else fit / np.sqrt(weights)


@dataclass(frozen=True, eq=False)
class _Both:
    """The design with and without the tested columns, whitened: Q (n, p + q), effect (q,), left (n,) residuals."""

    Q: Array
    effect: Array
    left: Array
    df: int
    floor: float

    @property
    def q(self) -> int:
        return len(self.effect)

    def gap(self, weights: Array | None) -> tuple[float, float]:
        """Root mean square and largest difference between the two fits, units of z."""
        shift = self.Q[:, -self.q :] @ self.effect
        shift = shift if weights is None else shift / np.sqrt(weights)
        return float(np.sqrt(np.mean(shift**2))), float(np.max(np.abs(shift)))


def _fit_both(X0: Array, extra: Array, z: Array, *, weights: Array | None) -> _Both | None:
    X0, extra, z = whitened(weights, X0, extra, z)
    Q0 = basis(X0)
    Q1 = beyond(Q0, extra)
    df = len(z) - Q0.shape[1] - Q1.shape[1]
    if Q1.shape[1] == 0 or df < 1:
        return None
    away = outside(Q0, z)
    return _Both(np.hstack([Q0, Q1]), Q1.T @ away, outside(Q1, away), df, PERFECT * float(z @ z))


def _f_ratio(above: float, below: float, floor: float) -> float:
    """above / below, where sums up to `floor` are rounding: 0 when nothing is explained, infinite when all is."""
    if below > floor:
        return above / below
    return np.inf if above > floor else 0.0
