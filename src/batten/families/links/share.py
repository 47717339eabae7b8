"""Shares: the mean of a response between 0 and 1 on the logit scale."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np
from scipy.special import expit, logit

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Link
from batten.families.numbers import shown

__all__ = ["FAMILY", "Share"]


@dataclass(frozen=True)
class Share(Link):
    """mu = 1 / (1 + exp(-eta)) for 0 <= y <= 1, binomial pseudo-likelihood (Papke and Wooldridge 1996).

    Use for fractions, rows on 0 and 1 included. Right for the mean whatever the spread, given robust errors; so there
    is no likelihood to compare.
    """

    family: ClassVar[str] = "share"
    group: ClassVar[str] = "shares"
    reading: ClassVar[Literal["difference", "ratio", "none"]] = "none"
    detail: ClassVar[int] = 3

    @property
    def key(self) -> str:
        return "share y"

    def words(self, y: str) -> str:
        return f"share link for {y}"

    def takes(self, y: Array) -> Bools:
        return (y >= 0) & (y <= 1)

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if bad:
            return Refusal(
                wrong="A share link needs a response from 0 to 1.",
                seen=f"{bad} of {len(y)} values lie outside (they run from {shown(np.min(y))} to {shown(np.max(y))}).",
                instead="Divide percentages by 100; logit(0, 100) y takes bounds; loglink y needs no upper end.",
            )
        if np.ptp(y) == 0 and y[0] in (0.0, 1.0):
            return Refusal(
                wrong="A share link needs a response that is not 0 throughout or 1 throughout.",
                seen=f"All {len(y)} values are {shown(y[0])}.",
                instead="Another response: this one does not vary.",
            )
        return None

    def mean(self, eta: Array) -> Array:
        return expit(eta)

    def mean_slope(self, eta: Array) -> Array:
        return expit(eta) * expit(-eta)

    def variance(self, mu: Array) -> Array:
        return mu * (1 - mu)

    def deviance(self, y: Array, mu: Array) -> Array:
        """2 [y log(y/mu) + (1-y) log((1-y)/(1-mu))], with 0 log 0 = 0."""
        return 2 * (_part(y, mu) + _part(1 - y, 1 - mu))

    def start(self, y: Array) -> Array:
        """Logit of y moved half-way to one half."""
        return logit((y + 0.5) / 2)

    def log_likelihood(self, y: Array, mu: Array) -> float | None:
        return None

    def code(self, y: str) -> Code:
        return Code(
            columns=(("z", "y"),),
            inverse="1 / (1 + np.exp(-z))",
            check=("(y >= 0) & (y <= 1)", f"the share link needs {y} from 0 to 1"),
        )


def _part(y: Array, mu: Array) -> Array:
    return np.where(y > 0, y * np.log(np.where(y > 0, y, 1.0) / mu), 0.0)


FAMILY = Share()
