"""Logarithm-like scales that take zeros: log(1 + y) and asinh y."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Scale
from batten.families.numbers import shown

__all__ = ["FAMILIES", "Asinh", "Log1p"]


@dataclass(frozen=True)
class Log1p(Scale):
    """z = log(1 + y) for y > -1.

    On request only: the 1 is one unit of y, so another unit gives another answer, and with zeros in the data a reading
    in percent has no meaning (Chen and Roth 2024). A log link keeps zeros without this.
    """

    family: ClassVar[str] = "log1p"
    unit_free: ClassVar[bool] = False
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 4
    readable: ClassVar[bool] = False

    @property
    def key(self) -> str:
        return "log1p y"

    def words(self, y: str) -> str:
        return f"log of 1 + {y}"

    def takes(self, y: Array) -> Bools:
        return y > -1

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if not bad:
            return None
        return Refusal(
            wrong="The log of 1 + y needs a response above -1.",
            seen=f"{bad} of {len(y)} values are -1 or below (lowest {shown(np.min(y))}).",
            instead="yeojohnson y and asinh y take any value.",
        )

    def forward(self, y: Array, c: Constants) -> Array:
        return np.log1p(y)

    def inverse(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.expm1(z)

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.exp(z)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return -np.log1p(y)

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "np.log1p(y)"),), inverse="np.expm1(z)", check=("y > -1", f"log1p needs {y} above -1")
        )


@dataclass(frozen=True)
class Asinh(Scale):
    """z = asinh y = log(y + sqrt(y^2 + 1)), for any y.

    On request only: like log(1 + y) it depends on the unit of y (Aihounton and Henningsen 2021), and its slopes are no
    percentages (Bellemare and Wichman 2020).
    """

    family: ClassVar[str] = "asinh"
    unit_free: ClassVar[bool] = False
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 5
    readable: ClassVar[bool] = False

    @property
    def key(self) -> str:
        return "asinh y"

    def words(self, y: str) -> str:
        return f"inverse hyperbolic sine of {y}"

    def refuse(self, y: Array) -> Refusal | None:
        return None

    def forward(self, y: Array, c: Constants) -> Array:
        return np.arcsinh(y)

    def inverse(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.sinh(z)

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.cosh(z)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return -np.log(np.hypot(1, y))

    def code(self, y: str, c: Constants) -> Code:
        return Code(columns=(("z", "np.arcsinh(y)"),), inverse="np.sinh(z)")


FAMILIES = (Log1p(), Asinh())
