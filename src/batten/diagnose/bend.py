"""Does the bend matter? The gap between a remedy's curve and a flexible one, in units of y, with a band for all of it.

The flexible curve is a restricted cubic spline of y itself whose knots are fixed by the number of rows alone, so the
verdict on the straight line is one test that was not chosen by the data. The same comparison with a remedy in the
line's place gives that remedy's left-over bend.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.stats import f as fisher

from batten.engine.rows import Array, Ints, Rows
from batten.errors import Refusal
from batten.families.remedy import Remedy
from batten.families.scales.identity import Identity
from batten.families.shapes.spline import Spline
from batten.fit.averaged import Averaged
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means

__all__ = ["Bend", "Flexible", "bend_of", "flexible", "knots_for"]

#: places along the central 90% of x where curves are compared
PLACES = 25
#: rows, evenly spaced along x, from which the width of a band is had at large n; its relative error is about
#: 1/sqrt(2 PART), half a percent
PART = 20_000
#: draws of the largest standardised gap along the curve
DRAWS = 2_000


@dataclass(frozen=True, eq=False)
class Flexible:
    """The reference curve on these rows: places (G,) in the central 90% of x, its means there, its residual SD.

    add_on_f, add_on_p: robust Wald test (HC3) of the spline's bending columns, on df (q, n - p).
    estimate is None where x has too few different values to bend. part: the rows, evenly spaced along x, that the width
    of bands comes from where there are very many.
    """

    estimate: Estimate | None
    places: Array
    curve: Averaged | None
    residual_sd: float
    add_on_f: float
    add_on_p: float
    add_on_df: tuple[int, int]
    tolerance: float
    tolerance_is_default: bool
    part: Ints | None = None


@dataclass(frozen=True, eq=False)
class Bend:
    """Gap of one curve against the flexible one along `places`: flexible minus curve, units of y.

    largest: its largest absolute size, at `at`; low, high: limits for the largest size at the stated level.
    verdict: "matters", "too small to matter" or "cannot tell".
    """

    places: Array
    gap: Array
    error: Array
    largest: float
    at: float
    low: float
    high: float
    tolerance: float
    verdict: str


def knots_for(n: int) -> int:
    """Knots of the reference spline by n alone: 3 below 30 rows, 4 to 100, 5 above (METHODS of Harrell 2015)."""
    return 3 if n < 30 else 4 if n <= 100 else 5


def flexible(rows: Rows, *, tolerance: float | None, level: float = 0.95) -> Flexible:
    """Fit the reference curve. tolerance: smallest gap that matters, units of y; None: a quarter of its residual SD."""
    low, high = np.quantile(rows.x, [0.05, 0.95])
    places = np.linspace(low, high, PLACES)
    for knots in range(knots_for(rows.count), 2, -1):
        est = estimate(rows, Remedy(Identity(), Spline(knots)))
        if not isinstance(est, Refusal):
            break
    else:
        return Flexible(None, places, None, float("nan"), *_NO_TEST, tolerance or float("nan"), tolerance is None)
    f, p, df = _add_on(est)
    bound = est.sigma / 4 if tolerance is None else tolerance
    part = None
    if rows.count > PART:
        part = np.argsort(rows.x, kind="stable")[np.linspace(0, rows.count - 1, PART).astype(np.intp)]
    curve = averaged_means(est, places, jackknife=False, rows=part)
    return Flexible(est, places, curve, est.sigma, f, p, df, bound, tolerance is None, part)


_NO_TEST: tuple[float, float, tuple[int, int]] = (float("nan"), float("nan"), (0, 0))


def _add_on(est: Estimate) -> tuple[float, float, tuple[int, int]]:
    """Robust (or cluster) Wald test of the bending columns of every modifier."""
    k, m = len(est.state) - 1, est.rows.modifier.shape[1]
    first = len(est.coef) - k * m
    bending = [first + block * k + j for block in range(m) for j in range(1, k)]
    b = est.coef[bending]
    v = est.covariance("robust")[np.ix_(bending, bending)]
    size = np.sqrt(np.diagonal(v))
    if not (size > 0).all() or len(bending) > est.df_error:  # as many clusters as columns leave no test
        return _NO_TEST
    f = float((b / size) @ np.linalg.solve(v / np.outer(size, size), b / size)) / len(bending)
    df = (len(bending), int(est.df_error))
    return f, float(fisher.sf(f, *df)), df


def bend_of(reference: Flexible, est: Estimate, *, level: float = 0.95) -> Bend | Refusal | None:
    """How far the estimate's mean curve lies from the flexible one, or None where nothing can bend.

    A Refusal where the remedy has no mean somewhere in the central 90% of x.
    """
    if reference.curve is None:
        return None
    own = averaged_means(est, reference.places, jackknife=False, rows=reference.part)
    gap = reference.curve.value - own.value
    lost = ~np.isfinite(own.value)
    if lost.any():
        return Refusal(
            wrong="The mean curve has gaps inside the data.",
            seen=f"{est.remedy.key} has no mean at {int(lost.sum())} of {len(lost)} places in the central 90% of x.",
            instead="log y or a log link, whose mean always exists.",
        )
    covariance = reference.curve.covariance_of_gap(own)
    error = np.sqrt(np.maximum(np.diagonal(covariance), 0.0))
    # two curves that are the same by algebra differ by rounding alone
    still = error <= 1e-9 * float(np.abs(reference.curve.value).max())
    width = _critical(covariance[np.ix_(~still, ~still)], level, est.df_error) * np.where(still, 0.0, error)
    size = np.abs(gap)
    at = int(np.argmax(size))
    low, high = float(np.maximum(size - width, 0).max()), float((size + width).max())
    t = reference.tolerance
    verdict = "too small to matter" if high < t else "matters" if low > t else "cannot tell"
    return Bend(reference.places, gap, error, float(size[at]), float(reference.places[at]), low, high, t, verdict)


def _critical(covariance: Array, level: float, df: float) -> float:
    """Quantile of the largest standardised deviation along the curve, by seeded draws of the limiting process."""
    if not len(covariance):
        return 0.0
    size = np.sqrt(np.diagonal(covariance))
    values, vectors = np.linalg.eigh(covariance / np.outer(size, size))
    # directions that carry under a millionth of the variance do not move the largest deviation
    kept = values > 1e-6 * values[-1]
    half = vectors[:, kept] * np.sqrt(values[kept])
    normal, chi = _draws(df)
    draws = np.abs(normal[:, : half.shape[1]] @ half.T).max(axis=1) / chi
    return float(np.quantile(draws, level))


@lru_cache(maxsize=8)
def _draws(df: float) -> tuple[Array, Array]:
    """Standard normal draws (DRAWS, PLACES) and the root of chi-square over df (DRAWS,), the same in every call."""
    rng = np.random.default_rng(20)
    return rng.standard_normal((DRAWS, PLACES)), np.sqrt(rng.chisquare(df, DRAWS) / df)
