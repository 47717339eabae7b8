"""Log links: the mean of the response itself is exp(eta)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np
from scipy.special import digamma, gammaln, polygamma

from batten.errors import Refusal
from batten.families.base import Array, Bools, Code, Link
from batten.families.numbers import shown

__all__ = ["FAMILIES", "LogLink"]

_KEYS = {"poisson": "loglink y", "gamma": "loglink-gamma y", "gaussian": "loglink-gaussian y"}
_POWERS = {"poisson": 1, "gamma": 2, "gaussian": 0}


@dataclass(frozen=True)
class LogLink(Link):
    """mu = exp(eta), with working variance mu (Poisson), mu^2 (Gamma) or constant (Gaussian).

    Use when effects multiply and the mean is wanted without retransformation. The Poisson form is a pseudo-likelihood:
    it keeps zeros, needs no counts, and is right for the mean whatever the spread, given robust errors (Gourieroux,
    Monfort and Trognon 1984; Santos Silva and Tenreyro 2006); so it has no likelihood to compare. Gamma suits spread
    proportional to the mean and needs y above zero; Gaussian suits even spread.
    """

    kind: Literal["poisson", "gamma", "gaussian"] = "poisson"
    family: ClassVar[str] = "loglink"

    @property
    def detail(self) -> int:  # type: ignore[override]  # simplest assumption about the spread first
        return list(_KEYS).index(self.kind)

    @property
    def key(self) -> str:
        return _KEYS[self.kind]

    def words(self, y: str) -> str:
        return f"log link for {y}" + ("" if self.kind == "poisson" else f" ({self.kind.capitalize()})")

    def takes(self, y: Array) -> Bools:
        return y > 0 if self.kind == "gamma" else y >= 0 if self.kind == "poisson" else np.ones(len(y), dtype=bool)

    def refuse(self, y: Array) -> Refusal | None:
        bad = ~self.takes(y)
        if bad.any():
            which = "zero or negative" if self.kind == "gamma" else "negative"
            return Refusal(
                wrong="A log link needs a response " + ("above zero." if self.kind == "gamma" else "of zero or more."),
                seen=f"{int(bad.sum())} of {len(y)} values are {which} (lowest {shown(np.min(y))}).",
                instead="loglink y keeps zeros." if self.kind == "gamma" and not (y < 0).any()
                else "yeojohnson y, or a shape of the predictor (y ~ spline4 x).",
            )  # fmt: skip
        if np.mean(y) <= 0:
            return Refusal(
                wrong="A log link needs a response with a mean above zero.",
                seen=f"The mean of {len(y)} values is {shown(float(np.mean(y)))}.",
                instead="A shape of the predictor (y ~ spline4 x) leaves the response alone.",
            )
        return None

    def mean(self, eta: Array) -> Array:
        with np.errstate(over="ignore"):
            return np.exp(eta)

    def mean_slope(self, eta: Array) -> Array:
        return self.mean(eta)

    def variance(self, mu: Array) -> Array:
        return np.power(mu, _POWERS[self.kind])

    def deviance(self, y: Array, mu: Array) -> Array:
        if self.kind == "gaussian":
            return np.square(y - mu)
        if self.kind == "gamma":
            return 2 * ((y - mu) / mu - np.log(y / mu))
        return 2 * (np.where(y > 0, y * np.log(np.where(y > 0, y, 1.0) / mu), 0.0) - (y - mu))

    def start(self, y: Array) -> Array:
        """log of y moved towards its mean: log(y + a tenth of the mean), lower values held at a tenth of the mean."""
        tenth = 0.1 * float(np.mean(y))
        return np.log(np.maximum(y, 0) + tenth)

    def log_likelihood(self, y: Array, mu: Array) -> float | None:
        if self.kind == "poisson":
            return None
        n, total = len(y), float(self.deviance(y, mu).sum())
        if total <= 0:
            return float("inf")  # a perfect fit
        if self.kind == "gaussian":
            return float(-n / 2 * (np.log(2 * np.pi * total / n) + 1))
        v = gamma_shape(total / n)
        return float(np.sum(v * np.log(v * y / mu) - v * y / mu - np.log(y)) - n * gammaln(v))

    def code(self, y: str) -> Code:
        checks = {
            "poisson": ("y >= 0", f"the log link needs {y} of zero or more"),
            "gamma": ("y > 0", f"the Gamma log link needs {y} above zero"),
        }
        return Code(columns=(("z", "y"),), inverse="np.exp(z)", check=checks.get(self.kind))


def gamma_shape(mean_deviance: float) -> float:
    """Maximum-likelihood shape v of a Gamma: log v - digamma(v) = mean deviance / 2, by Newton on log v."""
    half = mean_deviance / 2
    v = (3 - half + np.sqrt((half - 3) ** 2 + 24 * half)) / (12 * half)  # close to the root (Minka 2002)
    for _ in range(50):
        step = (np.log(v) - digamma(v) - half) / (v * (1 / v - polygamma(1, v)))
        v *= np.exp(-step)
        if abs(step) < 1e-14:
            break
    return float(v)


FAMILIES = (LogLink("poisson"), LogLink("gamma"), LogLink("gaussian"))
