"""The Yeo-Johnson power family of the response."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Scale
from batten.families.numbers import listed, plain, shown

__all__ = ["FAMILY", "YeoJohnson"]


@dataclass(frozen=True)
class YeoJohnson(Scale):
    """z = ((y+1)^L - 1)/L for y >= 0 and -((1-y)^(2-L) - 1)/(2-L) for y < 0 (Yeo and Johnson 2000).

    Use in the place of Box-Cox where y has zeros or negatives. The 1 in the formula is one unit of y, so the answer
    depends on the units. Outside `limits` (L < 0 above, L > 2 below) the response is infinite.
    """

    power: float | None = None
    family: ClassVar[str] = "yeojohnson"
    group: ClassVar[str] = "powers"
    unit_free: ClassVar[bool] = False
    rank: ClassVar[int] = 5
    detail: ClassVar[int] = 3
    readable: ClassVar[bool] = False

    @property
    def searched(self) -> tuple[str, ...]:  # type: ignore[override]  # depends on whether a power was given
        return ("lambda",) if self.power is None else ()

    @property
    def key(self) -> str:
        return "yeojohnson y" if self.power is None else f"yeojohnson({plain(self.power)}) y"

    def read(self, word: str, numbers: Constants | None) -> Scale | None:
        if word != "yeojohnson":
            return None
        if numbers is not None and len(numbers) != 1:
            raise keys.wrong_numbers(
                f"yeojohnson({listed(numbers)}) y", "A Yeo-Johnson scale takes one power.",
                instead="Write yeojohnson(0.5) y, or yeojohnson y to have the power estimated.",
            )  # fmt: skip
        return YeoJohnson(None if numbers is None else numbers[0])

    def words(self, y: str) -> str:
        return f"Yeo-Johnson power of {y}" if self.power is None else f"Yeo-Johnson power {shown(self.power)} of {y}"

    def refuse(self, y: Array) -> Refusal | None:
        return None

    def learn(self, y: Array) -> Constants:
        return () if self.power is None else (self.power,)

    def search(self) -> tuple[float, float]:
        """Symmetric about 1, as the family is: turning y around turns L into 2 - L."""
        return -3.0, 5.0

    def forward(self, y: Array, c: Constants) -> Array:
        size = np.log1p(np.abs(y))
        return np.where(y < 0, -_bend(size, 2 - c[0]), _bend(size, c[0]))

    def inverse(self, z: Array, c: Constants) -> Array:
        with np.errstate(over="ignore"):
            return np.copysign(np.expm1(_size(z, c[0])), z)

    def inverse_slope(self, z: Array, c: Constants) -> Array:
        """(1 + |y|)^(1 - L) above zero, (1 + |y|)^(L - 1) below."""
        with np.errstate(over="ignore", invalid="ignore"):
            size = _size(z, c[0])
            slope = np.exp(np.where(z < 0, c[0] - 1, 1 - c[0]) * size)
        return np.where(np.isinf(size), np.nan, slope)

    def log_jacobian(self, y: Array, c: Constants) -> Array:
        return (c[0] - 1) * np.sign(y) * np.log1p(np.abs(y))

    def limits(self, c: Constants) -> tuple[float, float]:
        lam = c[0]
        return (1 / (2 - lam) if lam > 2 else -np.inf), (-1 / lam if lam < 0 else np.inf)

    def code(self, y: str, c: Constants) -> Code:
        return Code(
            columns=(("z", "bent(y)"),),
            constants=(("LAMBDA", plain(c[0]), f"Yeo-Johnson power of {y}"),),
            helper=_HELPER,
            inverse="unbent(z)",
        )


def _bend(size: Array, lam: float) -> Array:
    """((1 + |y|)^L - 1) / L from size = log(1 + |y|)."""
    return size if lam == 0 else np.expm1(lam * size) / lam


def _size(z: Array, lam: float) -> Array:
    """log(1 + |y|); +inf where no response is that large (L < 0 above zero, L > 2 below)."""
    if lam in (0.0, 2.0):
        return np.where(z < 0, _unbend(-z, 2 - lam), _unbend(z, lam))
    return _unbend(np.abs(z), lam if not (z < 0).any() else np.where(z < 0, 2 - lam, lam))


def _unbend(z: Array, lam: float | Array) -> Array:
    """The same from z >= 0; values for z < 0 are not used."""
    if np.ndim(lam) == 0 and lam == 0:
        return z
    with np.errstate(divide="ignore"):
        return np.asarray(np.log1p(np.maximum(lam * z, -1.0)) / lam)


_HELPER = '''
def bent(y):
    """Yeo-Johnson scale; np.sign keeps the two halves apart."""
    power, size = np.where(y < 0, 2 - LAMBDA, LAMBDA), np.log1p(np.abs(y))
    safe = np.where(power == 0, 1, power)
    return np.where(y < 0, -1, 1) * np.where(power == 0, size, np.expm1(safe * size) / safe)


def unbent(z):
    """Back from the Yeo-Johnson scale; infinite beyond its limit."""
    power, size = np.where(z < 0, 2 - LAMBDA, LAMBDA), np.abs(z)
    safe = np.where(power == 0, 1, power)
    with np.errstate(divide="ignore", over="ignore"):
        log_size = np.where(power == 0, size, np.log1p(np.maximum(safe * size, -1)) / safe)
        return np.where(z < 0, -1, 1) * np.expm1(log_size)
'''

FAMILY = YeoJohnson()
