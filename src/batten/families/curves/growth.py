"""Growth curves between zero and a ceiling: the S-curve and the Gompertz curve."""

from __future__ import annotations

from abc import abstractmethod
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy.special import expit

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, exp, plain, width

__all__ = ["FAMILIES", "Gompertz", "SCurve"]


@dataclass(frozen=True)
class Growth(Shape):
    """y = a F(r (x - m)): the ceiling a is a coefficient; the place m and the steepness r (falling where r < 0) are
    searched. Use where y runs from near zero to a ceiling. Where the data stop below the bend, a and m cannot be told
    apart, and the profile of m runs to the end of its range: say so.
    """

    group: ClassVar[str] = "curves"
    searched: tuple[str, ...] = ("place", "steepness")
    own_level: ClassVar[bool] = True
    tail: ClassVar[str] = "levels off"
    rank: ClassVar[int] = 5

    @abstractmethod
    def share(self, t: Array) -> tuple[Array, Array]:
        """F(t) between 0 and 1, and F'(t)."""

    def refuse(self, x: Array) -> Refusal | None:
        if distinct(x) >= 5:
            return None
        return Refusal(
            wrong="A curve from zero to a ceiling needs five different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="A straight line, or log x.",
        )

    def candidates(self, x: Array, state: Constants) -> Array:
        """Places from half a range before the data to one range after; 1.5 to 25 steepness units over the range.

        Curves that are still zero at their higher end of the data are left out: nothing could scale them up.
        """
        sizes = np.array([1.5, 3.0, 6.0, 12.0, 25.0])
        grid = np.array([(m, r) for m in np.linspace(-0.5, 2.0, 11) for r in (*-sizes[::-1], *sizes)])
        highest = np.maximum(grid[:, 1] * (0 - grid[:, 0]), grid[:, 1] * (1 - grid[:, 0]))
        return grid[self.share(highest)[0] > 1e-6] * (width(x), 1 / width(x)) + (np.min(x), 0.0)

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        low, reach = float(np.min(x)), width(x)
        return np.array([low - 2 * reach, -100 / reach]), np.array([low + 3 * reach, 100 / reach])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        m, r = theta
        return self.share(r * (x - m))[0][:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        m, r = theta
        return r * self.share(r * (x - m))[1][:, None]

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        m, r = theta
        density = self.share(r * (x - m))[1]
        return np.stack([-r * density, (x - m) * density])[:, :, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return ["ceiling"]


@dataclass(frozen=True)
class SCurve(Growth):
    """Logistic growth, F(t) = 1 / (1 + exp(-t)) (Verhulst 1838): half of the ceiling at x = m, alike on both sides."""

    family: ClassVar[str] = "s-curve"
    detail: ClassVar[int] = 9

    @property
    def key(self) -> str:
        return "s-curve x"

    def words(self, x: str) -> str:
        return f"S-curve in {x}"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return f"{x} at half of the ceiling", f"steepness per unit of {x}"

    def share(self, t: Array) -> tuple[Array, Array]:
        return expit(t), expit(t) * expit(-t)

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        constants = (
            ("HALF_AT", plain(theta[0]), f"{x} at half of the ceiling; estimated"),
            ("STEEPNESS", plain(theta[1]), f"per unit of {x}; estimated"),
        )
        return Code(columns=(("share", "1 / (1 + np.exp(-STEEPNESS * (x - HALF_AT)))"),), constants=constants)


@dataclass(frozen=True)
class Gompertz(Growth):
    """Gompertz growth, F(t) = exp(-exp(-t)) (Gompertz 1825): steepest early, at 37% of the ceiling, where x = m."""

    family: ClassVar[str] = "gompertz"
    detail: ClassVar[int] = 10

    @property
    def key(self) -> str:
        return "gompertz x"

    def words(self, x: str) -> str:
        return f"Gompertz curve in {x}"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return f"{x} where the curve is steepest (37% of the ceiling)", f"steepness per unit of {x}"

    def share(self, t: Array) -> tuple[Array, Array]:
        left = exp(-t)
        done = np.exp(-left)
        return done, left * done

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        constants = (
            ("STEEPEST_AT", plain(theta[0]), f"{x} where the curve is steepest, at 37% of the ceiling; estimated"),
            ("STEEPNESS", plain(theta[1]), f"per unit of {x}; estimated"),
        )
        return Code(columns=(("share", "np.exp(-np.exp(-STEEPNESS * (x - STEEPEST_AT)))"),), constants=constants)


FAMILIES = (SCurve(), Gompertz())
