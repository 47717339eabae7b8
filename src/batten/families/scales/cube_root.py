"""Cube root of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Scale

__all__ = ["FAMILY", "CubeRoot"]


@dataclass(frozen=True)
class CubeRoot(Scale):
    """z = y^(1/3), with the sign of y.

    Use for volumes and masses of similar bodies, and for skewed positive responses whose roots are nearly normal, as
    those of a chi-square are (Wilson and Hilferty 1931); it takes zeros and negatives. Not for effects that multiply.
    """

    family: ClassVar[str] = "cube root"
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 4

    @property
    def key(self) -> str:
        return "cbrt y"

    def words(self, y: str) -> str:
        return f"cube root of {y}"

    def refuse(self, y: Array) -> Refusal | None:
        return None

    def forward(self, y: Array, c: Constants) -> Array:
        return np.cbrt(y)

    def inverse(self, z: Array, c: Constants) -> Array:
        return np.asarray(z**3)

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        return np.asarray(3 * z**2)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        """-log 3 - (2/3) log |y|; infinite where y = 0, so that such rows have no likelihood on this scale."""
        with np.errstate(divide="ignore"):
            return np.asarray(-np.log(3) - np.log(np.abs(y)) * (2 / 3))

    def code(self, y: str, c: Constants) -> Code:
        return Code(columns=(("z", "np.cbrt(y)"),), inverse="z**3")


FAMILY = CubeRoot()
