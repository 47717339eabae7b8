"""Polynomials of the focal predictor."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, origin, plain, shown

__all__ = ["FAMILY", "Polynomial"]

_NAMES = {2: "quadratic", 3: "cubic", 4: "quartic", 5: "quintic"}
#: beyond this degree double precision cannot tell the powers apart on any data
_HIGHEST = 20


@dataclass(frozen=True)
class Polynomial(Shape):
    """Columns u, u^2, ..., u^degree with u = x, or u = x - centre where x lies far from zero (see `origin`).

    A quadratic is the simplest curve that can turn; its turning point is part of the answer. Higher degrees bend more
    and swing beyond the data: never extrapolate. Compare degrees as whole candidates, since stopping at the first
    degree that adds nothing can miss a later one. Without a constant in the span the powers stay powers of x itself.
    """

    degree: int = 2
    family: ClassVar[str] = "polynomial"
    group: ClassVar[str] = "polynomials"
    tail: ClassVar[str] = "bends on"

    @property
    def rank(self) -> int:  # type: ignore[override]  # quadratics are simple; a cubic has a spline's number of columns
        return 4 if self.degree == 2 else 8

    @property
    def detail(self) -> int:  # type: ignore[override]  # by columns, after the spline with as many
        return 10 * self.degree + 1

    @property
    def readable(self) -> bool:  # type: ignore[override]
        return self.degree == 2

    @property
    def key(self) -> str:
        return f"poly{self.degree} x"

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        written = re.fullmatch(r"poly(\d+)", word)
        if numbers is not None or not written:
            return None
        degree = int(written.group(1))
        if not 2 <= degree <= _HIGHEST:
            raise keys.wrong_numbers(f"{word} x", f"A polynomial has a degree from 2 to {_HIGHEST}.",
                                     instead="Write x for degree 1, poly2 x for a quadratic.")  # fmt: skip
        return Polynomial(degree)

    def words(self, x: str) -> str:
        return f"{_NAMES.get(self.degree, f'polynomial of degree {self.degree}')} in {x}"

    def refuse(self, x: Array) -> Refusal | None:
        found = distinct(x)
        if found > self.degree:
            return None
        return Refusal(
            wrong=f"A polynomial of degree {self.degree} needs more than {self.degree} different values.",
            seen=f"There are {found} different values in {len(x)} rows.",
            instead="A lower degree, or the predictor as groups: C(...) in the formula.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return (origin(x) if constant else 0.0,)

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        u = x - state[0]
        powers = [u]
        for _ in range(self.degree - 1):
            powers.append(powers[-1] * u)
        return np.column_stack(powers)

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        u = x - state[0]
        lower = [np.ones_like(u)]
        for _ in range(self.degree - 1):
            lower.append(lower[-1] * u)
        return np.column_stack([(k + 1) * power for k, power in enumerate(lower)])

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return () if self.degree <= 3 else None

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        u = f"({x} {'-' if state[0] > 0 else '+'} {shown(abs(state[0]))})" if state[0] else x
        label = {1: u, 2: f"{u} squared", 3: f"{u} cubed"}
        return [label.get(k, f"{u} to the power {k}") for k in range(1, self.degree + 1)]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        centre = ("CENTRE", plain(state[0]), f"powers are taken of {x} from here, near the middle of the data")
        u = "(x - CENTRE)" if state[0] else "x"
        powers = tuple((f"x{k}", f"{u}**{k}") for k in range(2, self.degree + 1))
        return Code(columns=(("x1", u), *powers), constants=(centre,) if state[0] else ())


FAMILY = Polynomial()
