"""The response as it is."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Scale

__all__ = ["FAMILY", "Identity"]


@dataclass(frozen=True)
class Identity(Scale):
    """z = y. Effects are differences in units of y; mean and median need no correction."""

    family: ClassVar[str] = "identity"
    reading: ClassVar[Literal["difference", "ratio", "none"]] = "difference"
    closed: ClassVar[Literal["identity", "exp", "square", ""]] = "identity"

    @property
    def key(self) -> str:
        return "y"

    def words(self, y: str) -> str:
        return y

    def refuse(self, y: Array) -> Refusal | None:
        return None

    def forward(self, y: Array, c: Constants) -> Array:
        return y

    def inverse(self, z: Array, c: Constants) -> Array:
        return z

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        return np.ones_like(z)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return np.zeros_like(y)

    def code(self, y: str, c: Constants) -> Code:
        return Code(columns=(("z", "y"),), inverse="z")


FAMILY = Identity()
