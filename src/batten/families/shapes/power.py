"""An estimated power of the focal predictor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Shape
from batten.families.numbers import distinct, log, plain, shown, typical

__all__ = ["FAMILY", "EstimatedPower"]

_LOWEST, _HIGHEST = -3.0, 3.0


@dataclass(frozen=True)
class EstimatedPower(Shape):
    """x to a power p searched with the response, for x > 0 (Box and Tidwell 1962; by profiling, not their steps).

    With a constant in the span the column is (u^p - 1)/p with u = x/unit, which is log u at p = 0 and spans the same
    as x^p elsewhere, so the search runs through the logarithm smoothly. Its coefficient is the slope per unit at
    x = unit. Without a constant the column is u^p.
    State: (1 with a constant in the span, else 0; unit, a power of ten).
    """

    family: ClassVar[str] = "estimated power"
    group: ClassVar[str] = "powers"
    searched: tuple[str, ...] = ("power",)
    needs_zero: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 1

    @property
    def key(self) -> str:
        return "x^p"

    def words(self, x: str) -> str:
        return f"estimated power of {x}"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"power of {x}",)

    def takes(self, x: Array) -> Bools:
        return x > 0

    def refuse(self, x: Array) -> Refusal | None:
        bad = int((~self.takes(x)).sum())
        if bad:
            return Refusal(
                wrong="An estimated power needs a predictor above zero.",
                seen=f"{bad} of {len(x)} values are zero or negative (lowest {shown(np.min(x))}).",
                instead="poly2 x, hinge x and spline4 x take any value.",
            )
        if distinct(x) < 4:
            return Refusal(
                wrong="An estimated power needs four different values.",
                seen=f"There are {distinct(x)} in {len(x)} rows.",
                instead="A named shape: log x, sqrt x, poly2 x.",
            )
        return None

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return float(constant), typical(x)

    def candidates(self, x: Array, state: Constants) -> Array:
        return np.linspace(_LOWEST, _HIGHEST, 25)[:, None]

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        return np.array([_LOWEST]), np.array([_HIGHEST])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        log_u, (p,) = log(x / state[1]), theta
        if not state[0]:
            return np.exp(p * log_u)[:, None]
        return (log_u if p == 0 else np.expm1(p * log_u) / p)[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        log_u, (p,) = log(x / state[1]), theta
        lead = 1.0 if state[0] else p
        return lead * np.exp((p - 1) * log_u)[:, None] / state[1]

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        log_u, (p,) = log(x / state[1]), theta
        slope = log_u**2 * _curve(p * log_u) if state[0] else log_u * np.exp(p * log_u)
        return slope[None, :, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        p = shown(theta[0])
        name = x if state[1] == 1 else f"({x} / {shown(state[1])})"
        return [f"({name} to the power {p} - 1) / {p}" if state[0] and theta[0] else f"{name} to the power {p}"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        column = "np.exp(POWER * np.log(x / UNIT))"
        if state[0]:
            column = "((x / UNIT)**POWER - 1) / POWER" if theta[0] else "np.log(x / UNIT)"
            if 0 < abs(theta[0]) < 1e-3:  # the subtraction would lose digits
                column = "np.expm1(POWER * np.log(x / UNIT)) / POWER"
        return Code(
            columns=(("power_x", column),),
            constants=(
                ("POWER", plain(theta[0]), f"power of {x}; estimated"),
                ("UNIT", plain(state[1]), f"{x} is divided by this, so that its powers stay near 1"),
            ),
            check=("x > 0", f"an estimated power needs {x} above zero"),
        )


def _curve(t: Array) -> Array:
    """(e^t (t - 1) + 1) / t^2, the derivative of (e^t - 1)/t; by its series where the subtraction would lose digits."""
    small = np.abs(t) < 0.5
    near = np.where(small, t, 0.0)
    series, term = np.zeros_like(near), np.ones_like(near)
    for k in range(16):
        series += term / (k + 2)
        term = term * near / (k + 1)
    far = np.where(small, 1.0, t)
    return np.where(small, np.where(np.isnan(t), np.nan, series), (np.exp(far) * (far - 1) + 1) / far**2)


FAMILY = EstimatedPower()
