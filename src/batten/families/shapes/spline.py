"""Restricted cubic splines."""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import pairwise
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import listed, plain, shown

__all__ = ["FAMILY", "QUANTILES", "Spline", "knots_at_quantiles"]

#: knot quantiles by number of knots (Harrell 2015, Regression Modeling Strategies, table 2.3)
QUANTILES: dict[int, tuple[float, ...]] = {
    3: (0.10, 0.50, 0.90),
    4: (0.05, 0.35, 0.65, 0.95),
    5: (0.05, 0.275, 0.5, 0.725, 0.95),
    6: (0.05, 0.23, 0.41, 0.59, 0.77, 0.95),
    7: (0.025, 0.1833, 0.3417, 0.5, 0.6583, 0.8167, 0.975),
}


def knots_at_quantiles(x: Array, count: int) -> Constants:
    """Knots at fixed quantiles of x; below 100 rows the outer ones at the 5th smallest and largest value.

    Ties are dropped, so fewer knots than asked for may come back.
    """
    knots = np.quantile(x, QUANTILES[count])
    if 10 <= len(x) < 100:
        low, high = np.sort(x)[[4, -5]]
        if low < knots[1] and knots[-2] < high:  # in a few rows the fifth value lies too far in
            knots[0], knots[-1] = low, high
    return tuple(float(k) for k in np.unique(knots))


@dataclass(frozen=True)
class Spline(Shape):
    """Cubic between the knots, straight beyond the outer ones (Stone and Koo 1985; Durrleman and Simon 1989).

    Use when the relation bends smoothly; not for a sharp threshold (see hinges). Columns are x and, for j = 1..k-2,
    [(x-tj)+^3 - (x-t_{k-1})+^3 (tk-tj)/(tk-t_{k-1}) + (x-tk)+^3 (t_{k-1}-tj)/(tk-t_{k-1})] / (tk-t1)^2
    (Harrell 2015, eq. 2.25 in his scaling). Single coefficients mean nothing; read the curve.
    """

    knots: int | tuple[float, ...] = 4
    family: ClassVar[str] = "spline"
    group: ClassVar[str] = "splines"
    readable: ClassVar[bool] = False

    @property
    def rank(self) -> int:  # type: ignore[override]  # FP2 stands between three knots and more
        return 6 if self.count == 3 else 8

    @property
    def detail(self) -> int:  # type: ignore[override]  # by columns, before the polynomial with as many
        return 10 * (self.count - 1)

    @property
    def count(self) -> int:
        return self.knots if isinstance(self.knots, int) else len(self.knots)

    @property
    def key(self) -> str:
        if isinstance(self.knots, int):
            return f"spline{self.knots} x"
        return f"spline({listed(self.knots)}) x"

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        written = re.fullmatch(r"spline(\d*)", word)
        if not written or bool(written.group(1)) is (numbers is not None):
            return None
        if numbers is None:
            count = int(written.group(1))
            if count not in QUANTILES:
                raise keys.wrong_numbers(
                    f"{word} x", "A spline has 3 to 7 knots at its usual places.",
                    instead="Write spline4 x, or knots by hand: spline(5, 10, 20) x.",
                )  # fmt: skip
            return Spline(count)
        if len(numbers) < 3 or any(b <= a for a, b in pairwise(numbers)):
            raise keys.wrong_numbers(
                f"spline({listed(numbers)}) x", "A spline needs three or more knots in rising order.",
                instead="Write spline(5, 10, 20) x, or spline4 x.",
            )  # fmt: skip
        return Spline(numbers)

    def words(self, x: str) -> str:
        knots = f"{self.knots} knots" if isinstance(self.knots, int) else f"knots {listed(self.knots)}"
        return f"spline in {x} ({knots})"

    def refuse(self, x: Array) -> Refusal | None:
        values = np.unique(x)
        if isinstance(self.knots, int):
            found = len(self.learn(x))
            if found == self.knots <= len(values):
                return None
            return Refusal(
                wrong=f"A spline with {self.knots} knots needs {self.knots} different knot places.",
                seen=f"Ties among the values leave {found} ({len(values)} different values in {len(x)} rows).",
                instead="Fewer knots, groups, or knots given by hand: spline(10, 20, 40) x.",
            )
        if len(values) >= self.count and _told_apart(self, values):
            return None
        return Refusal(
            wrong="Rows must lie between the knots, or the pieces of the spline cannot be told apart.",
            seen=f"Knots at {listed(self.knots)}; {len(values)} different values from {shown(values[0])} "
            f"to {shown(values[-1])}.",
            instead=f"Other knots, or knots at quantiles of x: spline{min(max(self.count, 3), 7)} x.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return knots_at_quantiles(x, self.knots) if isinstance(self.knots, int) else self.knots

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.column_stack([x, *_bends(x, state, power=3)])

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.column_stack([np.ones_like(x), *_bends(x, state, power=2)])

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return state

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [x, *(f"{x} bend {j}" for j in range(1, len(state) - 1))]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        knots = ", ".join(plain(k) for k in state)
        bends = tuple((f"s{j}", f"bend(x, {j - 1})") for j in range(1, len(state) - 1))
        return Code(
            columns=(("x", "x"), *bends),
            constants=(("KNOTS", f"({knots})", f"knots in {x}, where the curve may bend"),),
            helper=_HELPER,
        )


def _told_apart(shape: Spline, values: Array) -> bool:
    """Whether a constant and the columns are linearly independent on up to 2,000 of the different values."""
    some = values[np.unique(np.linspace(0, len(values) - 1, min(len(values), 2000)).astype(int))]
    columns = np.column_stack([np.ones_like(some), shape.columns(some, shape.learn(some))])
    lengths = np.linalg.norm(columns, axis=0)
    return bool(lengths.all()) and int(np.linalg.matrix_rank(columns / lengths, tol=1e-10)) == columns.shape[1]


def _bends(x: Array, knots: Constants, *, power: int) -> list[Array]:
    """The nonlinear columns (power 3) or their derivatives (power 2, with the factor 3)."""
    t = np.asarray(knots)
    if len(t) < 3:  # a training set with two different knot places: straight
        return []
    last, before, size = t[-1], t[-2], (t[-1] - t[0]) ** 2

    def piece(knot: float) -> Array:
        above = np.maximum(x - knot, 0)
        return above * above * above if power == 3 else 3 * above * above

    near, far = piece(before), piece(last)
    return [
        (piece(k) - near * ((last - k) / (last - before)) + far * ((before - k) / (last - before))) / size
        for k in t[:-2]
    ]


_HELPER = '''
def bend(x, j, c=KNOTS[-2], d=KNOTS[-1]):
    """Column j of a restricted cubic spline: cubic between the knots, straight beyond the outer two."""
    own, before, last = (np.maximum(x - knot, 0) ** 3 for knot in (KNOTS[j], c, d))
    return (own - before * (d - KNOTS[j]) / (d - c) + last * (c - KNOTS[j]) / (d - c)) / (d - KNOTS[0]) ** 2
'''

FAMILY = Spline()
