"""A curve that rises from zero and levels off as a hyperbola."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Shape
from batten.families.numbers import plain, positive, shown

__all__ = ["FAMILY", "LevelHyperbola"]


@dataclass(frozen=True)
class LevelHyperbola(Shape):
    """y = V x / (K + x) for x >= 0 (Michaelis and Menten 1913); V is a coefficient, K > 0 is searched.

    Use for uptake, catch or yield that starts at zero and saturates. Where the data stay far below the ceiling V and K
    cannot be told apart, and the profile of K runs to the end of its range: say so.
    """

    family: ClassVar[str] = "level-hyp"
    group: ClassVar[str] = "curves"
    searched: tuple[str, ...] = ("K",)
    own_level: ClassVar[bool] = True
    needs_zero: ClassVar[bool] = True
    tail: ClassVar[str] = "levels off"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 8

    @property
    def key(self) -> str:
        return "level-hyp x"

    def words(self, x: str) -> str:
        return f"levelling off in {x} (hyperbola)"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"{x} at half of the ceiling",)

    def takes(self, x: Array) -> Bools:
        return x >= 0

    def refuse(self, x: Array) -> Refusal | None:
        bad, found = int((~self.takes(x)).sum()), len(np.unique(x[x > 0]))
        if not bad and found >= 3:
            return None
        return Refusal(
            wrong="A levelling hyperbola needs a predictor of zero or more, with three different values above zero.",
            seen=f"{bad} of {len(x)} values are negative (lowest {shown(np.min(x))}); {found} differ above zero.",
            instead="level-exp x takes any value; log x or spline4 x flatten too.",
        )

    def candidates(self, x: Array, state: Constants) -> Array:
        low, high = self.bounds(x, state)
        return np.geomspace(low[0], high[0], 33)[:, None]

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        above = positive(x)
        return np.array([np.min(above) / 30]), np.array([np.max(above) * 100])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        x = np.where(x >= 0, x, np.nan)
        return (x / (theta[0] + x))[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        x = np.where(x >= 0, x, np.nan)
        return (theta[0] / (theta[0] + x) ** 2)[:, None]

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        x = np.where(x >= 0, x, np.nan)
        return (-x / (theta[0] + x) ** 2)[None, :, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return ["ceiling"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        return Code(
            columns=(("share", "x / (K + x)"),),
            constants=(("K", plain(theta[0]), f"{x} at half of the ceiling; estimated"),),
            check=("x >= 0", f"this curve needs {x} of zero or more"),
        )


FAMILY = LevelHyperbola()
