"""A curve whose gap to a final level closes at a constant rate."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, exp, origin, plain, shown, width

__all__ = ["FAMILY", "LevelExponential"]


@dataclass(frozen=True)
class LevelExponential(Shape):
    """y = a - b exp(-c (x - origin)); without a constant in the span y = a (1 - exp(-c x)), through zero at x = 0.

    a (final level) and b (gap to it at the origin) are coefficients; the rate c > 0 is searched. Use for warming,
    curing or learning that slows down evenly. Where the data stop early, a and c cannot be told apart, and the profile
    of c runs to the end of its range: say so. State: (1 with a constant in the span, else 0; origin).
    """

    family: ClassVar[str] = "level-exp"
    group: ClassVar[str] = "curves"
    searched: tuple[str, ...] = ("rate",)
    own_level: ClassVar[bool] = True
    tail: ClassVar[str] = "levels off"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 7

    @property
    def key(self) -> str:
        return "level-exp x"

    def words(self, x: str) -> str:
        return f"levelling off in {x} (exponential)"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"rate at which the gap closes, per unit of {x}",)

    def refuse(self, x: Array) -> Refusal | None:
        if distinct(x) >= 4:
            return None
        return Refusal(
            wrong="An exponential that levels off needs four different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="A straight line, or log x.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return float(constant), origin(x) if constant else 0.0

    def candidates(self, x: Array, state: Constants) -> Array:
        low, high = self.bounds(x, state)
        return np.geomspace(low[0], high[0], 33)[1:-1, None]

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        """From nearly straight over the data to levelling off within a fiftieth of them."""
        reach = width(x) if state[0] else float(np.max(np.abs(x))) or 1.0
        return np.array([0.01 / reach]), np.array([50 / reach])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        if not state[0]:
            return -np.expm1(np.minimum(-theta[0] * x, 300.0))[:, None]
        return np.column_stack([np.where(np.isnan(x), np.nan, 1.0), -exp(-theta[0] * (x - state[1]))])

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        rise = theta[0] * exp(-theta[0] * (x - state[1]))
        return np.column_stack([np.zeros_like(x), rise]) if state[0] else rise[:, None]

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        u = x - state[1]
        slope = u * exp(-theta[0] * u)
        return np.column_stack([np.zeros_like(x), slope])[None] if state[0] else slope[None, :, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return ["final level", *([f"gap to the final level at {x} {shown(state[1])}"] if state[0] else [])]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        rate = ("RATE", plain(theta[0]), f"rate at which the gap closes, per unit of {x}; estimated")
        if not state[0]:
            return Code(columns=(("closed", "-np.expm1(-RATE * x)"),), constants=(rate,))
        start = ("ORIGIN", plain(state[1]), f"the gap is the one at this {x}")
        u = "(x - ORIGIN)" if state[1] else "x"
        return Code(
            columns=(("one", "x * 0 + 1"), ("gap", f"-np.exp(-RATE * {u})")),
            constants=(rate, start) if state[1] else (rate,),
        )


FAMILY = LevelExponential()
