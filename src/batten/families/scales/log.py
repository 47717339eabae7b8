"""The natural logarithm of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Constants, Scale

__all__ = ["FAMILY", "Log"]


@dataclass(frozen=True)
class Log(Scale):
    """z = log y for y > 0.

    Use when effects multiply and the spread grows with the level; not where y can be zero (a log link keeps zeros).
    A difference on this scale is a ratio of medians, and of means where the spread does not change. The
    back-transformed fit is a median; the mean is that times the smearing factor mean(exp(e)) (Duan 1983).
    """

    family: ClassVar[str] = "log"
    reading: ClassVar[Literal["difference", "ratio", "none"]] = "ratio"
    closed: ClassVar[Literal["identity", "exp", "square", ""]] = "exp"
    rank: ClassVar[int] = 2

    @property
    def key(self) -> str:
        return "log y"

    def words(self, y: str) -> str:
        return f"log of {y}"

    def takes(self, y: Array) -> Bools:
        return y > 0

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if not bad:
            return None
        return Refusal(
            wrong="A logarithm needs a response above zero.",
            seen=f"{bad} of {len(y)} values are zero or negative (lowest {np.min(y):.6g}).",
            instead="A log link (loglink y) keeps zeros; sqrt y takes zero; yeojohnson y takes negatives.",
        )

    def forward(self, y: Array, c: Constants) -> Array:
        return np.log(y)

    def inverse(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.exp(z)

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        return self.inverse(z, c)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return -np.log(y)

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "np.log(y)"),), inverse="np.exp(z)", check=("y > 0", f"the log needs {y} above zero")
        )


FAMILY = Log()
