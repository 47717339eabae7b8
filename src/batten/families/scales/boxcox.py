"""The Box-Cox power family of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Bools, Code, Constants, Scale
from batten.families.numbers import listed, plain, shown

__all__ = ["FAMILY", "BoxCox"]


@dataclass(frozen=True)
class BoxCox(Scale):
    """z = (y^L - 1) / L for y > 0, log y at L = 0 (Box and Cox 1964); L searched given the predictors, or given.

    Use to see which power of y the rows ask for, and whether a named one (log, square root) is as good. Coefficients
    mean nothing across different L (Hinkley and Runger 1984); predictions and contrasts do. Outside `limits` the
    inverse is 0 for L > 0 (Poirier 1978) and infinite for L < 0.
    """

    power: float | None = None
    family: ClassVar[str] = "boxcox"
    group: ClassVar[str] = "powers"
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 2
    readable: ClassVar[bool] = False

    @property
    def searched(self) -> tuple[str, ...]:  # type: ignore[override]  # depends on whether a power was given
        return ("lambda",) if self.power is None else ()

    @property
    def key(self) -> str:
        return "boxcox y" if self.power is None else f"boxcox({plain(self.power)}) y"

    def read(self, word: str, numbers: Constants | None) -> Scale | None:
        if word != "boxcox":
            return None
        if numbers is not None and len(numbers) != 1:
            raise keys.wrong_numbers(
                f"boxcox({listed(numbers)}) y", "A Box-Cox scale takes one power.",
                instead="Write boxcox(0.5) y, or boxcox y to have the power estimated.",
            )  # fmt: skip
        return BoxCox(None if numbers is None else numbers[0])

    def words(self, y: str) -> str:
        return f"Box-Cox power of {y}" if self.power is None else f"Box-Cox power {shown(self.power)} of {y}"

    def takes(self, y: Array) -> Bools:
        return y > 0

    def refuse(self, y: Array) -> Refusal | None:
        bad = int((~self.takes(y)).sum())
        if not bad:
            return None
        return Refusal(
            wrong="A Box-Cox power needs a response above zero.",
            seen=f"{bad} of {len(y)} values are zero or negative (lowest {shown(np.min(y))}).",
            instead="yeojohnson y takes any value; loglink y and sqrt y take zeros.",
        )

    def learn(self, y: Array) -> Constants:
        return () if self.power is None else (self.power,)

    def forward(self, y: Array, c: Constants) -> Array:
        (lam,) = c
        return np.log(y) if lam == 0 else np.expm1(lam * np.log(y)) / lam

    def inverse(self, z: Array, c: Constants) -> Array:
        (lam,) = c
        with np.errstate(over="ignore", divide="ignore"):
            return np.exp(_log_inverse(z, lam))

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        (lam,) = c
        with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
            log_y = _log_inverse(z, lam)
            slope = np.exp((1 - lam) * log_y)
        return np.where(log_y == -np.inf, 0.0, np.where(log_y == np.inf, np.nan, slope))

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return (c[0] - 1) * np.log(y)

    def limits(self, c: Constants) -> tuple[float, float]:
        (lam,) = c
        if lam == 0:
            return -np.inf, np.inf
        return (-1 / lam, np.inf) if lam > 0 else (-np.inf, -1 / lam)

    def code(self, y: str, c: Constants) -> Code:
        check = ("y > 0", f"the Box-Cox power needs {y} above zero")
        if c[0] == 0:
            return Code(columns=(("z", "np.log(y)"),), inverse="np.exp(z)", check=check)
        return Code(
            columns=(("z", "np.expm1(LAMBDA * np.log(y)) / LAMBDA"),),
            constants=(("LAMBDA", plain(c[0]), f"Box-Cox power of {y}"),),
            helper=_HELPER,
            inverse="undo(z)",
            check=check,
        )


def _log_inverse(z: Array, lam: float) -> Array:
    """log g(z) = log1p(L z) / L, which stays exact as L goes to 0; -inf or +inf outside the limits."""
    return z if lam == 0 else np.log1p(np.maximum(lam * z, -1.0)) / lam


_HELPER = '''
def undo(z):
    """Back from the Box-Cox scale; beyond its limit 0 (LAMBDA above zero) or infinite (below)."""
    with np.errstate(divide="ignore", over="ignore"):
        return np.exp(np.log1p(np.maximum(LAMBDA * z, -1)) / LAMBDA)
'''

FAMILY = BoxCox()
