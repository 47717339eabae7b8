"""Inverse link: the mean of the response is 1 / eta, its spread in proportion to it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Link
from batten.families.links.loglink import LogLink
from batten.families.numbers import shown

__all__ = ["FAMILY", "InverseLink"]

_GAMMA = LogLink("gamma")


@dataclass(frozen=True)
class InverseLink(Link):
    """mu = 1 / eta with working variance mu^2: a Gamma model, canonical link (McCullagh and Nelder 1989, ch. 8).

    On request only. Use where rates add: times that fall towards a floor as dose or concentration grows, 1/y straight
    in x, without the bias of transforming y. Not where eta may reach zero within reach of the questions asked: there
    the mean has no end and beyond it none exists, so predictions there are missing. A difference of eta is no ratio of
    means, so coefficients have no reading in percent.
    """

    family: ClassVar[str] = "invlink"
    detail: ClassVar[int] = 4
    readable: ClassVar[bool] = False
    multiplies: ClassVar[bool] = False

    @property
    def key(self) -> str:
        return "invlink-gamma y"

    def words(self, y: str) -> str:
        return f"inverse link for {y} (Gamma)"

    def takes(self, y: Array) -> Bools:
        return y > 0

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if not bad:
            return None
        return Refusal(
            wrong="An inverse link needs a response above zero.",
            seen=f"{bad} of {len(y)} values are zero or negative (lowest {shown(np.min(y))}).",
            instead="loglink y keeps zeros." if not (y < 0).any()
            else "yeojohnson y, or a shape of the predictor (y ~ spline4 x).",
        )  # fmt: skip

    def mean(self, eta: Array) -> Array:
        """1 / eta; NaN where eta is not above zero, since no mean belongs to it."""
        with np.errstate(over="ignore"):
            return 1 / np.where(eta > 0, eta, np.nan)

    def mean_slope(self, eta: Array) -> Array:
        return -np.square(self.mean(eta))

    def variance(self, mu: Array) -> Array:
        return np.square(mu)

    def deviance(self, y: Array, mu: Array) -> Array:
        return _GAMMA.deviance(y, mu)

    def start(self, y: Array) -> Array:
        """One mean for all: from there the deviance, convex in eta, leads down without leaving eta > 0."""
        return np.full(len(y), 1 / float(np.mean(y)))

    def log_likelihood(self, y: Array, mu: Array) -> float | None:
        return _GAMMA.log_likelihood(y, mu)

    def code(self, y: str) -> Code:
        return Code(
            columns=(("z", "y"),), inverse="1 / np.where(z > 0, z, np.nan)",
            check=("y > 0", f"the inverse link needs {y} above zero"),
        )  # fmt: skip


FAMILY = InverseLink()
