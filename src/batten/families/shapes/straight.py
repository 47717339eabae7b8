"""The focal predictor as it is: the straight line."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape

__all__ = ["FAMILY", "Straight"]


@dataclass(frozen=True)
class Straight(Shape):
    """One column, x itself. The untreated model against which every remedy is held."""

    family: ClassVar[str] = "straight"

    @property
    def key(self) -> str:
        return "x"

    def words(self, x: str) -> str:
        return x

    def refuse(self, x: Array) -> Refusal | None:
        return None

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return x[:, None]

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.ones((len(x), 1))

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return ()

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [x]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        return Code(columns=(("x", "x"),))


FAMILY = Straight()
