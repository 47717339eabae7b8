"""Cube root of the focal predictor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape

__all__ = ["FAMILY", "CubeRoot"]


@dataclass(frozen=True)
class CubeRoot(Shape):
    """One column, x^(1/3) with the sign of x: the length of a body whose volume is x.

    Use where the response follows a length while the predictor is a volume or a mass; it takes zeros and negatives.
    """

    family: ClassVar[str] = "cube root"
    needs_zero: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"
    rank: ClassVar[int] = 1
    detail: ClassVar[int] = 5

    @property
    def key(self) -> str:
        return "cbrt x"

    def words(self, x: str) -> str:
        return f"cube root of {x}"

    def refuse(self, x: Array) -> Refusal | None:
        return None

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.asarray(np.cbrt(x)[:, None])

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        """x^(-2/3) / 3; NaN at zero, where the curve stands upright."""
        return np.asarray(1 / (3 * np.cbrt(np.where(x == 0, np.nan, x)) ** 2))[:, None]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [f"cube root of {x}"]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        return Code(columns=(("cbrt_x", "np.cbrt(x)"),))


FAMILY = CubeRoot()
