"""What the coefficients of covariates read as in percent, where the response is logged or a log link."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.stats import t as student

from batten.effects.coefficients import coefficients
from batten.effects.percent import percent_of_dummy, ratio_of_means
from batten.effects.readings import multiplies
from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = ["Percent", "percents"]

#: standard error from which the point corrections are worth telling; below it the interval swallows them
WIDE = 0.2


@dataclass(frozen=True)
class Percent:
    """label; percent, low, high: of y for one unit more, or of the group against the first.

    kennedy, unbiased, unbiased_error: for yes/no columns of log y (Kennedy 1981; van Garderen and Shah 2002). means:
    percent between the two groups' means where their spreads differ (Manning 1998). NaN with a note elsewhere.
    """

    label: str
    percent: float
    low: float
    high: float
    kennedy: float
    unbiased: float
    unbiased_error: float
    means: float
    note: str


def percents(
    est: Estimate, labels: tuple[str, ...], *, level: float = 0.95, errors: str = "robust"
) -> tuple[Percent, ...]:
    """One reading per covariate column; () for scales where a coefficient is no percent.

    labels: names of the columns without the focal predictor. The ends of the interval are transformed, so it is uneven
    (Halvorsen and Palmquist 1980).
    """
    if not multiplies(est):
        return ()
    found = coefficients(est, level=level, errors=errors)
    even = coefficients(est, level=level, errors="constant").error
    critical = float(student.ppf(0.5 + level / 2, est.df_residual))
    out = []
    for j, label in enumerate(labels):
        column = est.rows.base[:, j]
        if np.ptp(column) == 0:
            continue
        percent, low, high = (100 * math.expm1(v) for v in (found.estimate[j], found.low[j], found.high[j]))
        pair = set(np.unique(column)) <= {0.0, 1.0}
        e, ours = _two_groups(est, labels, j)
        if pair and ours.all():  # every level has a column of its own, so that none is compared
            continue
        if est.link is not None or not pair:
            note = "of the mean" if est.link is not None else "for one unit more, of the median"
            out.append(Percent(label, percent, low, high, math.nan, math.nan, math.nan, math.nan, note))
            continue
        dummy = percent_of_dummy(float(found.estimate[j]), float(even[j]), df=est.df_residual, critical=critical)
        means = 100 * (ratio_of_means(float(found.estimate[j]), e, ours) - 1)
        note = "of the median; `means` is that of the means, which differs where the spreads do"
        if even[j] > WIDE:
            note += "; the error is wide enough for the unbiased reading to differ"
        exact, error = dummy.exact, dummy.std_error_exact
        out.append(Percent(label, percent, low, high, dummy.kennedy, exact, error, means, note))
    return tuple(out)


def _two_groups(est: Estimate, labels: tuple[str, ...], j: int) -> tuple[Array, Array]:
    """Residuals of the group's rows and of the first group's, and which are which (1, 0)."""
    factor, colon, _ = labels[j].partition(": ")
    same = [k for k, label in enumerate(labels) if colon and label.startswith(f"{factor}: ")] or [j]
    ours = est.rows.base[:, j] == 1
    first = (est.rows.base[:, same] == 0).all(axis=1)
    kept = ours | first
    e = est.residual / est.rows.root_weight
    return e[kept], ours[kept].astype(float)
