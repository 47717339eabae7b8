"""The price of a nice number: what is lost when a searched constant is replaced by one a person would say.

Candidates for powers are the named ones; for places, rates and ceilings the roundest number in the set. The price is
shown in log-likelihood (units of y, so it does not depend on the scale) and in the span effect. Where the set covers
all that was searched, no value is named.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from batten.effects.constants import Constant
from batten.effects.contrast import span_difference
from batten.effects.profile import best_given
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

__all__ = ["Rounding", "roundest", "roundings"]

#: candidates that are priced although the data rule them out
NEAREST = 3
#: powers of y that have names (Box and Cox 1964), and those of x
_OF_Y = {
    -1.0: "the reciprocal of {}", -0.5: "the reciprocal root of {}", 0.0: "the log of {}",
    1 / 3: "the cube root of {}", 0.5: "the square root of {}", 1.0: "{} as it is",
}  # fmt: skip
_OF_X = {**_OF_Y, -2.0: "the reciprocal square of {}", 2.0: "the square of {}", 3.0: "the cube of {}"}
del _OF_X[1 / 3]


@dataclass(frozen=True)
class Rounding:
    """One candidate for a constant.

    loss: log-likelihood lost against the best value. inside: the data do not rule it out. difference: the span effect
    of the mean with it, units of y, NaN where it cannot be had; change: that minus the span effect as estimated.
    advised: the nearest inside.
    """

    value: float
    words: str
    loss: float
    inside: bool
    difference: float
    change: float
    advised: bool


def roundings(
    est: Estimate, constant: Constant, span: tuple[float, float], *, x: str = "x", y: str = "y"
) -> tuple[Rounding, ...]:
    """Candidates in order, each with its price; empty where no value can be named or nothing was searched.

    Those the data do not rule out, and the nearest others. x, y: names for the words.
    """
    if constant.profile is None or est.link is not None or not constant.named or constant.kind == "listed":
        return ()
    names = {"power of y": _OF_Y, "power of x": _OF_X}.get(constant.kind)
    if names is None:
        value = roundest(*constant.pieces[_piece(constant)], near=constant.estimate)
        names = {} if value is None else {value: f"{value:.6g}"}
    inside = [v for v in names if constant.profile.holds(v)]
    advised = min(inside, key=lambda v: abs(v - constant.estimate), default=None)
    now = span_difference(est, span)
    near = sorted(names, key=lambda v: abs(v - constant.estimate))[:NEAREST]
    out = []
    for value, words in sorted(names.items()):
        if value not in near and value not in inside:
            continue
        loss, difference = _price(est, constant, value, span)
        told = words.format(y if constant.kind == "power of y" else x)
        out.append(Rounding(value, told, loss, value in inside, difference, difference - now, value == advised))
    return tuple(out)


def _piece(constant: Constant) -> int:
    """Which piece holds the estimate."""
    held = [i for i, (low, high) in enumerate(constant.pieces) if low <= constant.estimate <= high]
    return held[0] if held else 0


def _price(est: Estimate, constant: Constant, value: float, span: tuple[float, float]) -> tuple[float, float]:
    """Log-likelihood lost and the span effect with the constant held, the other constants found again."""
    if constant.position is None:
        best = best_given(est, est.c)[0]
        level, theta, c = best_given(est, (value,))
        again = estimate(est.rows, est.remedy, theta=theta or None, c=c)
    else:
        best = best_given(est, None)[0]
        level, theta, c = best_given(est, None, fixed=(constant.position, value))
        again = estimate(est.rows, est.remedy, theta=theta, c=c if est.remedy.left.searched else None)
    difference = span_difference(again, span) if isinstance(again, Estimate) else math.nan
    return best - level, difference


def roundest(low: float, high: float, *, near: float) -> float | None:
    """The number with the fewest digits that lies in the set and within a quarter of its width from `near`.

    None where the set has no ends.
    """
    if not (math.isfinite(low) and math.isfinite(high)) or not high > low:
        return None
    power = math.ceil(math.log10(high - low)) + 1
    for exponent in range(power, power - 5, -1):
        for lead in (5, 2, 1):
            step = lead * 10.0**exponent
            value = round(round(near / step) * step, max(0, -exponent))
            if low <= value <= high and abs(value - near) <= (high - low) / 4:
                return value
    return None
