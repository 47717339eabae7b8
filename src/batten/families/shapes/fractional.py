"""Fractional polynomials of the focal predictor."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, listed, plain, power, shown, typical

__all__ = ["FAMILIES", "POWERS", "Fractional"]

#: the published set; 0 stands for the logarithm (Royston and Altman 1994)
POWERS: Constants = (-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0, 3.0)


@dataclass(frozen=True)
class Fractional(Shape):
    """One or two powers of x chosen with the response from POWERS, or given (Royston and Altman 1994).

    u = (x + shift) / unit; columns are u^p, log u for p = 0, and for a repeated power u^p and u^p log u. Use for one
    smooth bend (first degree) or a curve that may turn once (second degree); negative powers react strongly to the
    smallest x. Where x has zeros or negatives the shift brings the lowest value up to the smallest gap between values
    (Royston and Sauerbrei 2008), and values below the lowest one learned from count as that one.
    State: (shift, unit, lowest u allowed times unit, or 0 without a shift). theta: the powers, unless given.
    """

    degree: int = 1
    powers: Constants = ()
    family: ClassVar[str] = "fractional"
    group: ClassVar[str] = "fractional"
    needs_zero: ClassVar[bool] = True
    finite: ClassVar[bool] = True
    tail: ClassVar[str] = "bends on"

    @property
    def rank(self) -> int:  # type: ignore[override]  # the second degree stands after the spline with three knots
        return 5 if self.degree == 1 else 7

    @property
    def readable(self) -> bool:  # type: ignore[override]
        return self.degree == 1

    @property
    def searched(self) -> tuple[str, ...]:  # type: ignore[override]  # nothing is searched when powers are given
        return () if self.powers else ("power",) if self.degree == 1 else ("first power", "second power")

    @property
    def key(self) -> str:
        return f"fp{self.degree}({listed(self.powers)}) x" if self.powers else f"fp{self.degree} x"

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        degrees = {"fp1": 1, "fp2": 2}
        if word not in degrees:
            return None
        degree = degrees[word]
        if numbers is not None and len(numbers) != degree:
            raise keys.wrong_numbers(
                f"{word}({listed(numbers)}) x", f"{word} takes {degree} power{'s' * (degree > 1)}.",
                instead="Write fp1(-0.5) x, fp2(0, 3) x, or fp1 x to have the power chosen.",
            )  # fmt: skip
        return Fractional(degree, tuple(sorted(numbers or ())))

    def words(self, x: str) -> str:
        chosen = f"powers {listed(self.powers)}" if self.degree > 1 else f"power {listed(self.powers)}"
        return f"fractional polynomial in {x} ({chosen if self.powers else f'degree {self.degree}'})"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return tuple(f"{name} of {x} (0 is the log)" for name in self.searched)

    def refuse(self, x: Array) -> Refusal | None:
        needed = 2 + 2 * self.degree if not self.powers else 1 + self.degree
        if distinct(x) >= needed:
            return None
        return Refusal(
            wrong=f"A fractional polynomial of degree {self.degree} needs {needed} different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="A named shape: log x, sqrt x, poly2 x.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        low = float(np.min(x))
        if low > 0:
            return 0.0, typical(x), 0.0
        gap = _smallest_gap(x)
        return gap - low, typical(x + (gap - low)), gap

    def candidates(self, x: Array, state: Constants) -> Array:
        if self.powers:
            return np.empty((1, 0))
        return np.array(list(itertools.combinations_with_replacement(POWERS, self.degree)))

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        count = len(self.searched)
        return np.full(count, POWERS[0]), np.full(count, POWERS[-1])

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        u, log_u = _scaled(x, state)
        columns: list[Array] = []
        for j, p in enumerate(chosen := self.powers or theta):
            once = log_u if p == 0 else power(u, p)
            columns.append(once * log_u if p in chosen[:j] else once)
        return np.column_stack(columns)

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        u, log_u = _scaled(x, state)
        inside = np.where(x + state[0] < state[2], 0.0, 1 / state[1])  # flat below the lowest value learned from
        columns: list[Array] = []
        for j, p in enumerate(chosen := self.powers or theta):
            below = power(u, p - 1)
            once = below if p == 0 else p * below
            again = 2 * log_u * below if p == 0 else below * (1 + p * log_u)
            columns.append((again if p in chosen[:j] else once) * inside)
        return np.column_stack(columns)

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        u = f"({x} + {shown(state[0])})" if state[0] else x
        u = u if state[1] == 1 else f"({u} / {shown(state[1])})"
        labels: list[str] = []
        for j, p in enumerate(chosen := self.powers or theta):
            once = f"log of {u}" if p == 0 else u if p == 1 else f"{u} to the power {shown(p)}"
            labels.append(f"{once} times log of {u}" if p in chosen[:j] else once)
        return labels

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        u = "x / UNIT" if not state[0] else "np.maximum(x + SHIFT, LOWEST) / UNIT"
        chosen = self.powers or theta
        once = [f"np.log({u})" if p == 0 else f"({u})**{plain(p)}" for p in chosen]
        columns = [
            f"{c} * np.log({u})" if p in chosen[:j] else c for j, (p, c) in enumerate(zip(chosen, once, strict=True))
        ]
        shift = (
            ("SHIFT", plain(state[0]), f"added to {x}, so that logs and negative powers exist"),
            ("LOWEST", plain(state[2]), f"{x} + SHIFT counts as at least this, its lowest value in these rows"),
        )
        unit = ("UNIT", plain(state[1]), f"{x} is divided by this, so that its powers stay near 1")
        return Code(
            columns=tuple((f"fp{j + 1}", column) for j, column in enumerate(columns)),
            constants=(*(shift if state[0] else ()), unit),
            check=None if state[0] else ("x > 0", f"these powers need {x} above zero"),
        )


def _scaled(x: Array, state: Constants) -> tuple[Array, Array]:
    """u and log u; NaN where u is not above zero."""
    shift, unit, lowest = state
    u = (np.maximum(x + shift, lowest) if lowest else x) / unit
    u = np.where(u > 0, u, np.nan)
    return u, np.log(u)


def _smallest_gap(x: Array) -> float:
    """Smallest step between different values; steps of rounding size do not count."""
    gaps = np.diff(np.unique(x))
    real = gaps[gaps > 1e-9 * np.ptp(x)]
    return float(real.min()) if len(real) else 1.0


FAMILIES = (Fractional(1), Fractional(2))
