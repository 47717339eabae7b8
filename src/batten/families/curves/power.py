"""A power curve in units of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Shape
from batten.families.numbers import log, near, plain, positive, power, shown, typical

__all__ = ["FAMILY", "PowerCurve"]


@dataclass(frozen=True)
class PowerCurve(Shape):
    """y = a (x / unit)^b for x > 0 (and x = 0 where b > 0): a is a coefficient, the level at x = unit; b is searched.

    Use where y is proportional to a power of x, with even spread in units of y; log y ~ log x is the same curve with
    spread that grows with the level. State: (unit, 1 where x has zeros, so that b stays above zero).
    """

    family: ClassVar[str] = "power curve"
    group: ClassVar[str] = "curves"
    searched: tuple[str, ...] = ("exponent",)
    own_level: ClassVar[bool] = True
    needs_zero: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 6

    @property
    def key(self) -> str:
        return "power x"

    def words(self, x: str) -> str:
        return f"power curve in {x}"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"percent of {y} per percent of {x}",)

    def takes(self, x: Array) -> Bools:
        return x >= 0

    def refuse(self, x: Array) -> Refusal | None:
        bad, found = int((~self.takes(x)).sum()), len(np.unique(x[x > 0]))
        if not bad and found >= 3:
            return None
        return Refusal(
            wrong="A power curve needs a predictor of zero or more, with three different values above zero.",
            seen=f"{bad} of {len(x)} values are negative (lowest {shown(np.min(x))}); {found} differ above zero.",
            instead="exponential x takes any value; poly2 x and spline4 x do too.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        above = positive(x)
        low, high = float(np.min(above)), float(np.max(above))
        middle = float(np.exp(np.mean(np.log(above))))
        return (near(middle, high - low) if high < 3 * low else typical(above)), float(np.min(x) <= 0)

    def candidates(self, x: Array, state: Constants) -> Array:
        low, high = (float(limit[0]) for limit in self.bounds(x, state))
        sizes = np.geomspace(0.05, 0.9 * high, 12)
        exponents = np.concatenate([-sizes[::-1], sizes, (-2.0, -1.0, -0.5, 0.5, 1.0, 2.0, 3.0)])
        return np.unique(exponents[exponents > low])[:, None]

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        """Wide enough for e^25 over the range of x, and for the usual exponents where x spans a wide ratio."""
        above = positive(x)
        most = max(4.0, 25 / (float(np.log(np.max(above) / np.min(above))) or 1.0))
        return np.array([0.01 if state[1] else -most]), np.array([most])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return power(_scaled(x, state), theta[0])[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return theta[0] * power(_scaled(x, state), theta[0] - 1)[:, None] / state[0]

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        u = _scaled(x, state)
        return np.where(u == 0, 0.0, power(u, theta[0]) * log(u))[None, :, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [f"level at {x} {shown(state[0])}"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        return Code(
            columns=(("power_x", "(x / UNIT)**EXPONENT"),),
            constants=(
                ("EXPONENT", plain(theta[0]), f"percent change of the curve per percent of {x}; estimated"),
                ("UNIT", plain(state[0]), f"the level is the one at this {x}"),
            ),
            check=("x >= 0", f"a power curve needs {x} of zero or more"),
        )


def _scaled(x: Array, state: Constants) -> Array:
    return np.where(x >= 0, x, np.nan) / state[0]


FAMILY = PowerCurve()
