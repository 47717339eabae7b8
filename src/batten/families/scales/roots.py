"""Square root and square of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Scale
from batten.families.numbers import shown

__all__ = ["FAMILIES", "Sqrt", "Square"]


@dataclass(frozen=True)
class Sqrt(Scale):
    """z = sqrt y for y >= 0.

    Use when the spread grows like the square root of the level (counts, areas). The mean is eta^2 plus the mean squared
    residual (Neyman and Scott 1960). Where the fit itself goes below zero the curve bounces up: `limits` tells.
    """

    family: ClassVar[str] = "sqrt"
    closed: ClassVar[Literal["identity", "exp", "square", ""]] = "square"
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 1

    @property
    def key(self) -> str:
        return "sqrt y"

    def words(self, y: str) -> str:
        return f"square root of {y}"

    def takes(self, y: Array) -> Bools:
        return y >= 0

    def refuse(self, y: Array) -> Refusal | None:
        return _negative(y, self.takes(y), "A square root needs a response of zero or more.")

    def forward(self, y: Array, c: Constants) -> Array:
        return np.sqrt(y)

    def inverse(self, z: Array, c: Constants) -> Array:
        return np.maximum(z, 0.0) ** 2

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        return 2 * np.maximum(z, 0)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        """-log(2 sqrt y); infinite where y = 0, so that such rows have no likelihood on this scale."""
        with np.errstate(divide="ignore"):
            return -0.5 * np.log(4 * y)

    def limits(self, c: Constants) -> tuple[float, float]:
        return 0.0, np.inf

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "np.sqrt(y)"),),
            inverse="np.maximum(z, 0) ** 2",
            check=("y >= 0", f"the square root needs {y} of zero or more"),
        )


@dataclass(frozen=True)
class Square(Scale):
    """z = y^2 for y >= 0.

    Use, rarely, when the spread shrinks as the level rises. A fit below zero is taken back to zero.
    """

    family: ClassVar[str] = "square"
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 3

    @property
    def key(self) -> str:
        return "y^2"

    def words(self, y: str) -> str:
        return f"square of {y}"

    def takes(self, y: Array) -> Bools:
        return y >= 0

    def refuse(self, y: Array) -> Refusal | None:
        return _negative(y, self.takes(y), "The square of a response cannot be undone where it is negative.")

    def forward(self, y: Array, c: Constants) -> Array:
        return y**2

    def inverse(self, z: Array, c: Constants) -> Array:
        return np.sqrt(np.maximum(z, 0.0))

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        """1 / (2 sqrt z); infinite at z = 0, where y = 0."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(z < 0, 0.0, 0.5 / np.sqrt(z))

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        with np.errstate(divide="ignore"):
            return np.log(2 * y)

    def limits(self, c: Constants) -> tuple[float, float]:
        return 0.0, np.inf

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "y**2"),),
            inverse="np.sqrt(np.maximum(z, 0))",
            check=("y >= 0", f"the square of {y} can only be undone at zero or more"),
        )


def _negative(y: Array, taken: Bools, wrong: str) -> Refusal | None:
    bad = int((~taken).sum())
    if not bad:
        return None
    return Refusal(
        wrong=wrong,
        seen=f"{bad} of {len(y)} values are negative (lowest {shown(np.min(y))}).",
        instead="yeojohnson y takes negatives; shapes of the predictor (y ~ poly2 x, y ~ spline4 x) leave y alone.",
    )


FAMILIES = (Sqrt(), Square())
