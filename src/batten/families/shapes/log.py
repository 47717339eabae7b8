"""The natural logarithm of the focal predictor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Shape
from batten.families.numbers import log, shown

__all__ = ["FAMILY", "Log"]


@dataclass(frozen=True)
class Log(Shape):
    """One column, log x for x > 0: each doubling of x adds the same amount.

    Use when effects fade as x grows and x spans a wide ratio; not where x can be zero.
    """

    family: ClassVar[str] = "log"
    needs_zero: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"
    rank: ClassVar[int] = 1
    detail: ClassVar[int] = 1

    @property
    def key(self) -> str:
        return "log x"

    def words(self, x: str) -> str:
        return f"log of {x}"

    def takes(self, x: Array) -> Bools:
        return x > 0

    def refuse(self, x: Array) -> Refusal | None:
        bad = int((~self.takes(x)).sum())
        if not bad:
            return None
        return Refusal(
            wrong="A logarithm needs a predictor above zero.",
            seen=f"{bad} of {len(x)} values are zero or negative (lowest {shown(np.min(x))}).",
            instead="sqrt x takes zero; poly2 x, hinge x and spline4 x take any value.",
        )

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return log(x)[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return 1 / np.where(x > 0, x, np.nan)[:, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [f"log of {x}"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        return Code(columns=(("log_x", "np.log(x)"),), check=("x > 0", f"the log needs {x} above zero"))


FAMILY = Log()
