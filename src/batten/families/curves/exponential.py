"""Exponential growth or decay."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, exp, origin, plain, shown, width

__all__ = ["FAMILY", "Exponential"]


@dataclass(frozen=True)
class Exponential(Shape):
    """y = a exp(b (x - origin)): a is a coefficient, the level at the origin; b is searched.

    Use for growth or decay at a constant rate towards zero, with even spread in units of y. The same curve fitted as
    log y ~ x weighs the rows differently, so the two rates differ: not a mistake of either. State: (origin,), which is
    0 unless x lies far from zero.
    """

    family: ClassVar[str] = "exponential"
    group: ClassVar[str] = "curves"
    searched: tuple[str, ...] = ("rate",)
    own_level: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 5

    @property
    def key(self) -> str:
        return "exponential x"

    def words(self, x: str) -> str:
        return f"exponential in {x}"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"growth of the log of {y} per unit of {x}",)

    def refuse(self, x: Array) -> Refusal | None:
        if distinct(x) >= 3:
            return None
        return Refusal(
            wrong="An exponential needs three different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="A straight line.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return (origin(x),)

    def candidates(self, x: Array, state: Constants) -> Array:
        """Growth and decay by 5% up to e^20 over the range of x."""
        rates = np.geomspace(0.05, 20, 13) / width(x)
        return np.concatenate([-rates[::-1], rates])[:, None]

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        return np.array([-25 / width(x)]), np.array([25 / width(x)])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return exp(theta[0] * (x - state[0]))[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return theta[0] * self.columns(x, state, theta)

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        return ((x - state[0])[:, None] * self.columns(x, state, theta))[None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [f"level at {x} {shown(state[0])}"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        constants = [("RATE", plain(theta[0]), f"growth of the log per unit of {x}; estimated")]
        if state[0]:
            constants.append(("ORIGIN", plain(state[0]), f"the level is the one at this {x}"))
        u = "(x - ORIGIN)" if state[0] else "x"
        return Code(columns=(("growth", f"np.exp(RATE * {u})"),), constants=tuple(constants))


FAMILY = Exponential()
