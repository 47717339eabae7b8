"""Where the fitted curve turns, with every x that the data do not rule out.

Quadratics: Fieller's exact set, with the slopes at both ends as a test of the form. Broken lines: the break, with its
profile set. Other curves: every x where zero lies inside the slope's simultaneous band. A monotone response scale does
not move a turning point, so the linear predictor is asked; under interactions, the mean averaged over covariates.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from scipy.stats import t as student

from batten.effects.contrast import no_interval
from batten.effects.numbers import about, place, show, show_interval
from batten.effects.profile import profile_of_shape
from batten.effects.slopes import breaks, slopes_along
from batten.effects.turning import UShape, delta_std_error, fieller, flat_set, u_shape
from batten.effects.value import Effect, effect_of
from batten.engine.rows import Array
from batten.engine.simultaneous import critical
from batten.families.shapes.polynomial import Polynomial
from batten.fit.averaged import interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means
from batten.fit.predict import positive_by_nature
from batten.fit.slopes import averaged_slopes

__all__ = ["Turn", "turning_point"]

Piece = tuple[float, float]
Form = Literal["highest", "lowest", ""]


@dataclass(frozen=True)
class Turn:
    """A turning point.

    estimate: the one place inside the data where the curve turns, or the quadratic's vertex wherever it lies; NaN where
    there is none or several. estimates: all of them. pieces: every x that cannot be excluded; infinite ends for a
    quadratic. located: one interval inside the data. form: what y is there. std_error: by the delta method, for
    comparison only. ends: slopes at the lowest and highest x against zero (quadratics and smooth curves). data: the
    lowest and the highest x. height: the mean of y there when it lies inside the data, with its interval as if the
    place were known; chosen as the best place, so it flatters.
    """

    estimate: float
    estimates: tuple[float, ...]
    pieces: tuple[Piece, ...]
    located: bool
    form: Form
    reading: str
    std_error: float = math.nan
    ends: UShape | None = None
    data: Piece = (math.nan, math.nan)
    height: Effect | None = None


@dataclass(frozen=True)
class _Asked:
    """What every branch needs: the data's range, level, words for x."""

    low: float
    high: float
    level: float
    errors: str
    unit: str

    def reading(self, form: Form, estimate: float, piece: Piece) -> str:
        """Words for a turning point that is located."""
        percent = place(round(100 * self.level, 6))
        at = show(estimate, self.unit, width=piece[1] - piece[0])
        return f"{form} at {at} ({percent}% interval {show_interval(*piece, self.unit)})"

    @property
    def range(self) -> str:
        return f"{about(self.low)} to {about(self.high, self.unit)}"

    def inside(self, piece: Piece) -> bool:
        return self.low <= piece[0] and piece[1] <= self.high


NOT_LOCATED = "the data do not locate a turning point"


def turning_point(
    est: Estimate,
    *,
    level: float = 0.95,
    errors: str = "robust",
    unit: str = "",
    base: Array | None = None,
    modifier: Array | None = None,
) -> Turn:
    """The turning point of any remedy within the data. unit: of x, for the reading.

    base (u, q), modifier (u, m): covariate rows to average over under interactions instead of the rows' own.
    """
    found = _turn(est, level=level, errors=errors, unit=unit, base=base, modifier=modifier)
    data = float(est.rows.x.min()), float(est.rows.x.max())
    height = None
    if data[0] <= found.estimate <= data[1]:
        at = averaged_means(est, np.array([found.estimate]), base=base, modifier=modifier, errors=errors)
        height = effect_of(at.value, interval(at, level, positive=positive_by_nature(est, at)))
        why = no_interval(est, height, of="mean")
        height = height.without_interval(why) if why else height
    return replace(found, data=data, height=height)


def _turn(
    est: Estimate, *, level: float, errors: str, unit: str, base: Array | None, modifier: Array | None
) -> Turn:  # fmt: skip
    x = est.rows.x
    asked = _Asked(float(x.min()), float(x.max()), level, errors, unit)
    if est.shape.steps:
        return _none("groups have no turning point")
    alone = est.rows.modifier.shape[1] == 1 and bool((est.rows.modifier == est.rows.modifier[0]).all())
    if _one_way(est):
        return _by_construction(est, asked)
    if breaks(est):
        return _of_breaks(est, asked, base=base, modifier=modifier)
    if alone and isinstance(est.shape, Polynomial) and est.shape.degree == 2:
        return _of_quadratic(est, asked)
    return _of_curve(est, asked, alone=alone, base=base, modifier=modifier)


def _none(reading: str) -> Turn:
    return Turn(math.nan, (), (), located=False, form="", reading=reading)


def _one_way(est: Estimate) -> bool:
    """Whether one column carries the whole slope, so that its sign does not depend on the data."""
    places = np.linspace(est.rows.x.min(), est.rows.x.max(), 41)
    with np.errstate(all="ignore"):
        slopes = est.shape.slopes(places, est.state, est.theta)
    return int((np.nan_to_num(slopes) != 0).any(axis=0).sum()) <= 1 and est.rows.modifier.shape[1] == 1


def _by_construction(est: Estimate, asked: _Asked) -> Turn:
    places = np.linspace(asked.low, asked.high, 2001)
    with np.errstate(all="ignore"):
        slope = np.nan_to_num(est.shape.slopes(places, est.state, est.theta)).sum(axis=1)
    if not (slope.min() < 0 < slope.max()):
        return _none("this shape cannot turn inside the data")
    return _none("this shape turns where its formula says, wherever the data lie; a quadratic would ask the data")


def _of_quadratic(est: Estimate, asked: _Asked) -> Turn:
    V = est.covariance(asked.errors)
    i, j = len(est.coef) - 2, len(est.coef) - 1
    b1, b2, v = float(est.coef[i]), float(est.coef[j]), (float(V[i, i]), float(V[i, j]), float(V[j, j]))
    t = float(student.ppf(0.5 + asked.level / 2, est.df_error))
    found = fieller(b1, b2, v11=v[0], v12=v[1], v22=v[2], critical=t, centre=est.state[0])
    error = delta_std_error(b1, b2, v11=v[0], v12=v[1], v22=v[2]) if b2 else math.nan
    form: Form = "lowest" if b2 * _rising(est) > 0 else "highest"
    inside = found.kind == "interval" and asked.inside(found.pieces[0])
    return Turn(
        found.estimate, (found.estimate,), found.pieces, located=inside, form=form,
        reading=_quadratic_words(found.kind, found.estimate, found.pieces, form, asked),
        std_error=error, ends=_ends(est, _eta_slopes(est, asked), asked),
    )  # fmt: skip


def _quadratic_words(kind: str, estimate: float, pieces: tuple[Piece, ...], form: Form, asked: _Asked) -> str:
    if kind != "interval":
        return NOT_LOCATED
    (piece,) = pieces
    if asked.inside(piece):
        return asked.reading(form, estimate, piece)
    set_words = show_interval(*piece, asked.unit)
    if piece[1] < asked.low or piece[0] > asked.high:
        return f"no turning point inside the data: it would lie at {set_words}, beyond {asked.range}"
    return f"{NOT_LOCATED} inside {asked.range}: its interval, {set_words}, runs beyond"


def _rising(est: Estimate) -> float:
    """1 where y rises with the linear predictor, -1 where it falls (1/y, the inverse link)."""
    middle = np.array([np.median(est.eta)])
    slope = est.scale.inverse_slope(middle, est.c) if est.link is None else est.link.mean_slope(middle)
    return float(np.sign(slope[0]))


def _eta_slopes(est: Estimate, asked: _Asked) -> Callable[[Array], tuple[Array, Array]]:
    """Slope of the linear predictor in the direction of y, and its standard error."""
    V, up = est.covariance(asked.errors), _rising(est)

    def slopes(x: Array) -> tuple[Array, Array]:
        modifier = np.repeat(est.rows.modifier[:1], len(x), axis=0)
        J = est.slope_jacobian_at(x, modifier)
        return up * est.slopes_at(x, modifier), np.sqrt(np.maximum(np.einsum("kp,pq,kq->k", J, V, J), 0.0))

    return slopes


def _mean_slopes(
    est: Estimate, asked: _Asked, base: Array | None, modifier: Array | None
) -> Callable[[Array], tuple[Array, Array]]:
    """Slope of the mean averaged over covariates, and its standard error."""

    def slopes(x: Array) -> tuple[Array, Array]:
        found = averaged_slopes(est, x, base=base, modifier=modifier, errors=asked.errors, jackknife=False)
        return found.value, found.error

    return slopes


def _ends(est: Estimate, slopes: Callable[[Array], tuple[Array, Array]], asked: _Asked) -> UShape:
    (low, high), (se_low, se_high) = slopes(np.array([asked.low, asked.high]))
    return u_shape(float(low), float(high), se_low=float(se_low), se_high=float(se_high), df=est.df_error)


def _of_breaks(est: Estimate, asked: _Asked, *, base: Array | None, modifier: Array | None) -> Turn:
    """A broken line turns at a break where the slope changes its sign."""
    places = breaks(est)
    segments = slopes_along(
        est, [asked.low, *places, asked.high], level=asked.level, errors=asked.errors, base=base, modifier=modifier
    )
    # the slopes asked for: at the low end, then left and right of each break, then at the high end
    flat: list[Piece] = []
    ends = [asked.low, *places, asked.high]
    rights = [segments[0], *(s for s in segments if s.side == "right")]
    for left, right, at in zip(ends[:-1], ends[1:], rights, strict=True):
        if at.slope.direction() == "open":
            flat.append((left, right))
    turns = [
        (k, place_)
        for k, place_ in enumerate(places)
        if rights[k].slope.estimate * rights[k + 1].slope.estimate < 0
    ]  # fmt: skip
    searched = [profile_of_shape(est, k, level=asked.level) for k, _ in turns] if est.theta else []
    given = [] if est.theta else [(p, p) for _, p in turns]
    pieces = _merged([piece for found in searched for piece in found.pieces] + given + flat)
    estimates = tuple(p for _, p in turns)
    form: Form = ""
    if len(turns) == 1:
        form = "lowest" if rights[turns[0][0]].slope.estimate < 0 else "highest"
    located = len(turns) == 1 and len(pieces) == 1 and not flat and asked.inside(pieces[0])
    located = located and not any(found.open_low or found.open_high for found in searched)
    words = _curve_words(estimates, pieces, located, form, asked)
    return Turn(estimates[0] if len(estimates) == 1 else math.nan, estimates, pieces, located, form, words)


def _merged(pieces: list[Piece]) -> tuple[Piece, ...]:
    """Overlapping pieces joined, in order."""
    out: list[Piece] = []
    for low, high in sorted(pieces):
        if out and low <= out[-1][1]:
            out[-1] = (out[-1][0], max(high, out[-1][1]))
        else:
            out.append((low, high))
    return tuple(out)


def _of_curve(
    est: Estimate, asked: _Asked, *, alone: bool, base: Array | None, modifier: Array | None
) -> Turn:  # fmt: skip
    """Any other curve: where its slope changes sign, and every x with zero inside the simultaneous band."""
    slopes = _eta_slopes(est, asked) if alone else _mean_slopes(est, asked, base, modifier)
    places = np.linspace(asked.low, asked.high, 101)
    if alone:
        J = est.slope_jacobian_at(places, np.repeat(est.rows.modifier[:1], len(places), axis=0))
        c = critical(J, est.covariance(asked.errors), df=est.df_error, level=asked.level).value
    else:
        root = averaged_slopes(est, places, base=base, modifier=modifier, errors=asked.errors, jackknife=False).root
        c = critical(np.eye(len(places)), root.T @ root, df=est.df_error, level=asked.level).value
    found = flat_set(slopes, (asked.low, asked.high), critical=c, points=201)
    form: Form = ""
    if len(found.estimates) == 1:
        form = "lowest" if slopes(np.array([asked.low]))[0][0] < 0 else "highest"
    estimate = found.estimates[0] if len(found.estimates) == 1 else math.nan
    words = _curve_words(found.estimates, found.pieces, found.located, form, asked)
    return Turn(
        estimate, found.estimates, found.pieces, found.located, form, words, ends=_ends(est, slopes, asked)
    )  # fmt: skip


def _curve_words(
    estimates: tuple[float, ...], pieces: tuple[Piece, ...], located: bool, form: Form, asked: _Asked
) -> str:
    if located:
        return asked.reading(form, estimates[0], pieces[0])
    if not pieces:
        return f"no turning point: the slope keeps its sign from {asked.range}"
    where = " and ".join(show_interval(*piece, asked.unit) for piece in pieces)
    if not estimates:
        return f"the fitted curve does not turn, but the slope may be zero within {where}"
    several = "several turning points" if len(estimates) > 1 else "a turning point"
    return f"the data do not locate {several}: the slope may be zero anywhere within {where}"
