"""The reciprocal of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Scale

__all__ = ["FAMILY", "Reciprocal"]


@dataclass(frozen=True)
class Reciprocal(Scale):
    """z = 1/y, y above zero throughout or below zero throughout. c = (sign of y,).

    Use for durations and ratios where the rate is the natural quantity. The order is reversed: what raises z lowers y.
    The fit must keep the sign of y; where it does not, the response is infinite and there is no mean.
    """

    family: ClassVar[str] = "reciprocal"
    rank: ClassVar[int] = 2
    detail: ClassVar[int] = 2

    @property
    def key(self) -> str:
        return "1/y"

    def words(self, y: str) -> str:
        return f"reciprocal of {y}"

    def takes(self, y: Array) -> Bools:
        """Those of the sign that most have."""
        return y > 0 if (y > 0).sum() >= (y < 0).sum() else y < 0

    def refuse(self, y: Array) -> Refusal | None:
        if self.takes(y).all():
            return None
        above, below = int((y > 0).sum()), int((y < 0).sum())
        return Refusal(
            wrong="A reciprocal needs a response above zero throughout, or below zero throughout.",
            seen=f"{above} values are above zero, {below} below, {len(y) - above - below} are zero.",
            instead="sqrt y and loglink y keep zeros; yeojohnson y takes any value.",
        )

    def learn(self, y: Array) -> Constants:
        return (1.0 if y[0] > 0 else -1.0,)

    def forward(self, y: Array, c: Constants) -> Array:
        return 1 / y

    def inverse(self, z: Array, c: Constants) -> Array:
        """1/z; infinite, with the sign of y, where z has lost that sign."""
        with np.errstate(divide="ignore"):
            return np.where(z * c[0] > 0, 1 / z, np.where(np.isnan(z), np.nan, c[0] * np.inf))

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        with np.errstate(divide="ignore", over="ignore"):
            return np.where(z * c[0] > 0, -1 / z**2, np.nan)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return -2 * np.log(np.abs(y))

    def limits(self, c: Constants) -> tuple[float, float]:
        return (0.0, np.inf) if c[0] > 0 else (-np.inf, 0.0)

    def code(self, y: str, c: Constants) -> Code:
        if c[0] > 0:
            inverse, condition, side = "np.where(z <= 0, np.inf, 1 / z)", "y > 0", "above"
        else:
            inverse, condition, side = "np.where(z >= 0, -np.inf, 1 / z)", "y < 0", "below"
        check = (condition, f"the reciprocal needs {y} {side} zero throughout")
        return Code(columns=(("z", "1 / y"),), inverse=inverse, check=check)


FAMILY = Reciprocal()
