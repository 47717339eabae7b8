"""The logit of a response between two bounds."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy.special import expit

from batten.errors import Refusal, keys
from batten.families.base import Array, Bools, Code, Constants, Scale
from batten.families.numbers import listed, plain, shown

__all__ = ["FAMILY", "Logit"]


@dataclass(frozen=True)
class Logit(Scale):
    """z = log((y - low) / (high - y)) for low < y < high.

    Use for a response that fills a range with known ends and comes near both; not where rows lie on an end (a share
    link keeps them). The bounds are facts about the measurement, never learned from the rows.
    """

    low: float = 0.0
    high: float = 1.0
    family: ClassVar[str] = "logit"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 4

    @property
    def key(self) -> str:
        return f"logit({plain(self.low)}, {plain(self.high)}) y"

    def read(self, word: str, numbers: Constants | None) -> Scale | None:
        if word != "logit":
            return None
        if numbers is None or len(numbers) != 2 or not numbers[0] < numbers[1]:
            raise keys.wrong_numbers(
                f"logit({listed(numbers or ())}) y",
                "A logit needs the lower and the upper bound of the response.",
                instead="Write logit(0, 1) y, or logit(0, 100) y for percentages.",
            )
        return Logit(*numbers)

    def words(self, y: str) -> str:
        return f"logit of {y} between {shown(self.low)} and {shown(self.high)}"

    def takes(self, y: Array) -> Bools:
        return (y > self.low) & (y < self.high)

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if not bad:
            return None
        return Refusal(
            wrong=f"This logit needs a response strictly between {shown(self.low)} and {shown(self.high)}.",
            seen=f"{bad} of {len(y)} values lie on a bound or beyond "
            f"(they run from {shown(np.min(y))} to {shown(np.max(y))}).",
            instead="share y keeps rows on 0 and 1; or name wider bounds that are true for this response.",
        )

    def forward(self, y: Array, c: Constants) -> Array:
        return np.log(y - self.low) - np.log(self.high - y)

    def inverse(self, z: Array, c: Constants) -> Array:
        share: Array = expit(z)
        return self.low + (self.high - self.low) * share

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        share: Array = expit(z) * expit(-z)
        return (self.high - self.low) * share

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return float(np.log(self.high - self.low)) - np.log((y - self.low) * (self.high - y))

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "np.log(y - LOW) - np.log(HIGH - y)"),),
            constants=(
                ("LOW", plain(self.low), f"{y} cannot fall below this"),
                ("HIGH", plain(self.high), f"{y} cannot rise above this"),
            ),
            inverse="LOW + (HIGH - LOW) / (1 + np.exp(-z))",
            check=("(y > LOW) & (y < HIGH)", f"the logit needs {y} strictly between its bounds"),
        )


FAMILY = Logit()
