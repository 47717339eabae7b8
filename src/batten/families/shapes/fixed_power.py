"""Fixed powers of the focal predictor: sqrt x, 1/x, x^2 and any other number."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Bools, Code, Constants, Shape
from batten.families.numbers import number, plain, power, shown

__all__ = ["FAMILIES", "FixedPower"]

_KEYS = {0.5: "sqrt x", -1.0: "1/x"}
_WORDS = {0.5: "square root of {x}", -1.0: "reciprocal of {x}", 2.0: "square of {x} only", 3.0: "cube of {x} only"}
_LABELS = {0.5: "square root of {x}", -1.0: "1 / {x}", 2.0: "{x} squared", 3.0: "{x} cubed"}
_EXPRESSIONS = {0.5: "np.sqrt(x)", -1.0: "1 / x"}
_DETAIL = {0.5: 2, -1.0: 3, 2.0: 4}


@dataclass(frozen=True)
class FixedPower(Shape):
    """One column, x to a fixed power (Tukey 1977, ladder of powers).

    Use for a single bend that never turns: roots and reciprocals fade, squares steepen. x^2 alone has no straight part
    (`poly2 x` has one); its zero slope stands at x = 0.
    """

    exponent: float
    family: ClassVar[str] = "fixed power"
    needs_zero: ClassVar[bool] = True
    rank: ClassVar[int] = 1

    @property
    def tail(self) -> str:  # type: ignore[override]  # a reciprocal flattens, a square steepens
        return "bends on" if self.exponent > 0 else "levels off"

    @property
    def detail(self) -> int:  # type: ignore[override]  # named powers come before other numbers
        return _DETAIL.get(self.exponent, 5)

    @property
    def key(self) -> str:
        return _KEYS.get(self.exponent, f"x^{plain(self.exponent)}")

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        named = {"sqrt": 0.5, "1/x": -1.0}
        if numbers is not None or (word not in named and (not word.startswith("x^") or word == "x^p")):
            return None
        exponent = named[word] if word in named else number(word.removeprefix("x^"))
        if exponent is None:
            raise keys.wrong_numbers(word, "A power of x is written with one number.", instead="Write x^2 or x^-0.5.")
        if exponent == 1:
            raise keys.wrong_numbers(word, "x^1 is x itself.", instead="Write x.")
        if exponent == 0:
            instead = "Write log x, which stands at power 0 of the ladder."
            raise keys.wrong_numbers(word, "x^0 is a constant.", instead=instead)
        return FixedPower(exponent)

    def words(self, x: str) -> str:
        return _WORDS.get(self.exponent, f"{{x}} to the power {shown(self.exponent)}").format(x=x)

    def takes(self, x: Array) -> Bools:
        """All for whole powers; for 1/x those of one sign where all have it; else those at or above zero."""
        if self.exponent > 0:
            return np.ones(len(x), dtype=bool) if self.exponent == int(self.exponent) else x >= 0
        return x < 0 if self.exponent == -1 and bool(np.all(x < 0)) else x > 0

    def refuse(self, x: Array) -> Refusal | None:
        bad = ~self.takes(x)
        if not bad.any():
            return None
        needs, seen = ("of zero or more", "negative") if self.exponent > 0 else ("above zero", "zero or negative")
        name = self.words("x")
        return Refusal(
            wrong=f"{name[0].upper()}{name[1:]} needs a predictor {needs}.",
            seen=f"{int(bad.sum())} of {len(x)} values are {seen} (lowest {shown(np.min(x))}).",
            instead="poly2 x, hinge x and spline4 x take any value.",
        )

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return power(x, self.exponent)[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return self.exponent * power(x, self.exponent - 1)[:, None]

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return () if self.exponent in (2.0, 3.0) else None

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [_LABELS.get(self.exponent, f"{{x}} to the power {shown(self.exponent)}").format(x=x)]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        expression = _EXPRESSIONS.get(self.exponent, f"x**{plain(self.exponent)}")
        whole = self.exponent > 0 and self.exponent == int(self.exponent)
        need = ("x >= 0", "of zero or more") if self.exponent > 0 else ("x != 0", "other than zero")
        check = None if whole else (need[0], f"this power needs {x} {need[1]}")
        return Code(columns=(("power_x", expression),), check=check)


FAMILIES = (FixedPower(0.5), FixedPower(-1.0), FixedPower(2.0))
