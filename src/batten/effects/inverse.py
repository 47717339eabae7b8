"""The question asked backwards: at which x is the prediction y?

The estimate is every x inside the data where the curve passes y. The set holds every x whose interval for the mean (or
median) holds y: the inverted band, at the stated level for each x by itself. It may come in pieces, run to the end of
the data, or be empty: not reached. Nothing is said beyond the data.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.optimize import brentq
from scipy.stats import t as student

from batten.effects.classes import Classes, covariate_classes
from batten.effects.contrast import reach_trouble
from batten.effects.numbers import about, place, show, show_interval
from batten.engine.rows import Array
from batten.fit.averaged import interval
from batten.fit.carried import no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means
from batten.fit.predict import positive_by_nature

__all__ = ["Inverse", "x_for"]

#: places at which the band is looked at before its ends are found; the second where rows are many
GRID, COARSE = 101, 41
#: beyond this many numbers the band takes first-order errors rather than left-out rows
LEFT_OUT = 50_000_000
#: places asked at once where rows are many
AT_ONCE = 8


Piece = tuple[float, float]


@dataclass(frozen=True)
class Inverse:
    """Where the mean (or median) is y.

    estimates: x where the curve passes y. pieces: every x that cannot be excluded; a piece that reaches the end of the
    data may go on beyond. surely_below, surely_above: the x whose whole interval lies below, or above, y.
    """

    y: float
    of: str
    level: float
    estimates: tuple[float, ...]
    pieces: tuple[Piece, ...]
    surely_below: tuple[Piece, ...]
    surely_above: tuple[Piece, ...]
    reading: str

    @property
    def reached(self) -> bool:
        """Whether the curve itself passes y inside the data."""
        return bool(self.estimates)


def x_for(
    est: Estimate,
    y: float,
    *,
    of: str = "mean",
    level: float = 0.95,
    errors: str = "robust",
    base: Array | None = None,
    modifier: Array | None = None,
    unit: str = "",
    y_unit: str = "",
) -> Inverse:
    """Every x of the data whose mean (or median), averaged over covariates, is y or cannot be told from y.

    base (u, q), modifier (u, m): covariate rows to average over instead of the rows' own. unit, y_unit: for the words.
    """
    pooled = covariate_classes(est, base, modifier)
    if pooled is not None:
        base, modifier = pooled.base, pooled.modifier
    low, high = float(est.rows.x.min()), float(est.rows.x.max())
    xs = np.unique(np.concatenate([np.linspace(low, high, GRID if pooled is None else COARSE), _steps(est, low, high)]))
    usable = [x for x in xs if not reach_trouble(est, np.array([x]), of=of, base=base, modifier=modifier)]
    xs = np.array(usable, dtype=float)
    if not len(xs):
        return Inverse(y, of, level, (), (), (), (), f"the {of} cannot be had anywhere inside the data")
    band = _Band(est, y, of, level, errors, base, modifier, pooled)
    estimates = _passes(band, xs, np.array([band.gap(float(x)) for x in xs]))
    carried = no_mean_interval(est) if of == "mean" else ""
    if carried:
        return Inverse(y, of, level, estimates, (), (), (), carried)
    # a set narrower than the grid is found around the place itself
    xs = np.union1d(xs, estimates)
    curve, lower, upper = band.gaps(xs)
    holds = _pieces(lambda x: max(band.at(x)[1], -band.at(x)[2]), xs, np.maximum(lower, -upper))
    below, above = _sure(xs, holds, lower, upper, estimates)
    words = _Words(of, level, unit, y_unit, low, high, leaps=est.shape.steps)
    return Inverse(y, of, level, estimates, holds, below, above, words.reading(y, estimates, holds, curve + y))


@dataclass(frozen=True, eq=False)
class _Band:
    """The averaged curve and its band, less y."""

    est: Estimate
    y: float
    of: str
    level: float
    errors: str
    base: Array | None
    modifier: Array | None
    pooled: Classes | None

    def gap(self, x: float) -> float:
        """The curve alone at x, less y."""
        found = averaged_means(
            self.est, np.array([x]), of=self.of, base=self.base, modifier=self.modifier, root=False,
            weights=None if self.pooled is None else self.pooled.weights,
        )  # fmt: skip
        return float(found.value[0]) - self.y

    def gaps(self, xs: Array) -> tuple[Array, Array, Array]:
        """Curve, low end and high end at xs (G,), each less y."""
        if self.pooled is not None:
            return self._pooled_gaps(xs, self.pooled)
        covariates = self.est.n if self.base is None else len(self.base)
        found = averaged_means(
            self.est, xs, of=self.of, base=self.base, modifier=self.modifier, errors=self.errors,
            jackknife=self.est.n * covariates * GRID <= LEFT_OUT,
        )  # fmt: skip
        low, high = interval(found, self.level, positive=positive_by_nature(self.est, found))
        return found.value - self.y, low - self.y, high - self.y

    def _pooled_gaps(self, xs: Array, pooled: Classes) -> tuple[Array, Array, Array]:
        """The same at many rows, a few places at a time, with first-order errors."""
        value, error = np.empty(len(xs)), np.empty(len(xs))
        positive = True
        for start in range(0, len(xs), AT_ONCE):
            some = slice(start, start + AT_ONCE)
            found = averaged_means(
                self.est, xs[some], of=self.of, base=pooled.base, modifier=pooled.modifier, errors=self.errors,
                jackknife=False, weights=pooled.weights,
            )  # fmt: skip
            value[some] = found.value
            error[some] = np.sqrt(found.error**2 + pooled.spread(self.est, xs[some], of=self.of))
            positive = positive and positive_by_nature(self.est, found)
        reach = float(student.ppf(0.5 + self.level / 2, self.est.df_error)) * error
        if positive:
            return value - self.y, value * np.exp(-reach / value) - self.y, value * np.exp(reach / value) - self.y
        return value - self.y, value - reach - self.y, value + reach - self.y

    def at(self, x: float) -> tuple[float, float, float]:
        """The same at one place."""
        curve, low, high = self.gaps(np.array([x]))
        return float(curve[0]), float(low[0]), float(high[0])


def _steps(est: Estimate, low: float, high: float) -> Array:
    """Both sides of every place where the curve jumps."""
    if not est.shape.steps:
        return np.empty(0)
    cuts = np.array(est.shape.cuts(est.state, est.theta) or ())
    cuts = cuts[(cuts > low) & (cuts <= high)]
    return np.concatenate([cuts, np.nextafter(cuts, -np.inf)])


def _passes(band: _Band, xs: Array, gap: Array) -> tuple[float, ...]:
    """Where the curve passes y; at a jump, where it leaps over it."""
    out = [float(x) for x in xs[gap == 0]]
    for k in np.flatnonzero(gap[:-1] * gap[1:] < 0):
        out.append(float(brentq(band.gap, xs[k], xs[k + 1], xtol=_near(xs))))
    return tuple(sorted(out))


def _pieces(margin: Callable[[float], float], xs: Array, at_grid: Array) -> tuple[Piece, ...]:
    """Where margin <= 0, as pieces, their ends found between the grid's places."""
    inside = np.concatenate([[False], at_grid <= 0, [False]])
    edges = np.flatnonzero(np.diff(inside.astype(int)))
    ends = [
        float(xs[min(k, len(xs) - 1)]) if k in (0, len(xs)) else float(brentq(margin, xs[k - 1], xs[k], xtol=_near(xs)))
        for k in edges.tolist()
    ]
    return tuple(zip(ends[::2], ends[1::2], strict=True))


def _sure(
    xs: Array, holds: tuple[Piece, ...], lower: Array, upper: Array, passes: tuple[float, ...]
) -> tuple[tuple[Piece, ...], tuple[Piece, ...]]:
    """What is left between the pieces, by the side of y on which the whole band lies; a leap over y parts it."""
    ends = [float(xs[0]), *(end for piece in holds for end in piece), float(xs[-1])]
    gaps = [(low, high) for low, high in zip(ends[::2], ends[1::2], strict=True) if high > low]
    below: list[Piece] = []
    above: list[Piece] = []
    for low, high in gaps:
        leaps = [low, *(x for x in passes if low < x < high), high]
        for start, stop in pairwise(leaps):
            inside = (xs >= start) & (xs <= stop)
            if (inside & (upper < 0)).sum() > (inside & (lower > 0)).sum():
                below.append((start, stop))
            elif (inside & (lower > 0)).any():
                above.append((start, stop))
    return tuple(below), tuple(above)


def _near(xs: Array) -> float:
    return 1e-10 * float(xs[-1] - xs[0]) if len(xs) > 1 else 1e-12


@dataclass(frozen=True)
class _Words:
    of: str
    level: float
    unit: str
    y_unit: str
    low: float
    high: float
    leaps: bool

    def reading(self, y: float, estimates: tuple[float, ...], pieces: tuple[Piece, ...], curve: Array) -> str:
        """One sentence without a full stop."""
        target = f"{self.of} of {place(y, self.y_unit)}"
        ends = f"{about(self.low)} to {about(self.high, self.unit)}"
        if not pieces and not estimates:
            seen = show_interval(float(curve.min()), float(curve.max()), self.y_unit)
            return f"a {target} is not reached: from {ends} the {self.of} runs from {seen}"
        where = " and ".join(self._piece(piece) for piece in pieces) or "empty"
        if not estimates:
            return f"the curve does not reach a {target} from {ends}, but {where} cannot be excluded"
        width = max((b - a for a, b in pieces), default=self.high - self.low)
        at = " and ".join(place(x, self.unit) if self.leaps else show(x, self.unit, width=width) for x in estimates)
        percent = place(round(100 * self.level, 6))
        passed = "is passed where groups change, at" if self.leaps else "is reached at"
        return f"a {target} {passed} {at} ({percent}% interval {where})"

    def _piece(self, piece: Piece) -> str:
        low, high = piece
        width = high - low
        if low <= self.low and high >= self.high:
            return "everything inside the data"
        if high >= self.high:
            return f"{show(low, width=width)} {self.unit}".rstrip() + " to the end of the data"
        if low <= self.low:
            return f"the start of the data to {show(high, self.unit, width=width)}"
        return show_interval(low, high, self.unit)
