"""A smooth curve with a penalty on its bending."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, plain

__all__ = ["FAMILY", "Smooth"]


#: rows evaluated together, so that twenty columns of intermediate results stay in the processor's cache
_BLOCK = 2_000


@dataclass(frozen=True)
class Smooth(Shape):
    """Cubic between 10 to 20 knots, straight beyond, its squared second derivative penalised (Reinsch 1967).

    Use to see the relation with as few assumptions as possible; single coefficients mean nothing, read the curve. The
    basis is the natural cubic spline on fixed knots (the penalised regression splines of Ruppert, Wand and Carroll
    2003; Wood 2017, section 5.3), written as x and one rounded hinge per inner knot: zero on the left, slope 1 on the
    right, its second derivative a triangle over the neighbouring knots. So the second derivative is linear between
    knots, the penalty has a closed form, and no column cancels against another far to the right.
    State: the knots, values of x at equally spaced shares of the rows; their number depends on the number of rows
    alone, and ties lower it.
    """

    family: ClassVar[str] = "smooth"
    group: ClassVar[str] = "smooth"
    rank: ClassVar[int] = 9
    readable: ClassVar[bool] = False

    @property
    def key(self) -> str:
        return "smooth x"

    def words(self, x: str) -> str:
        return f"smooth curve in {x}"

    def refuse(self, x: Array) -> Refusal | None:
        if distinct(x) >= 6:
            return None
        return Refusal(
            wrong="A smooth curve needs six different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="poly2 x, or the predictor as groups: C(...) in the formula.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        share = np.linspace(0, 1, min(10 + len(x) // 20, 20))
        knots = _observed(np.sort(x), share)
        if len(knots) < 6:  # ties fill the quantiles: use those of the different values
            knots = _observed(np.unique(x), share)
        return tuple(float(k) for k in knots)

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        out = np.empty((len(x), max(len(state) - 1, 1)))  # a training set with one value of x leaves x alone
        out[:, 0] = x
        for start in range(0, len(x), _BLOCK):
            part = slice(start, start + _BLOCK)
            out[part, 1:] = _rounded_hinges(x[part], state)
        return out

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        t = np.asarray(state)
        a, b = np.diff(t)[:-1], np.diff(t)[1:]
        p, v = np.clip(x[:, None] - t[:-2], 0, a), np.clip(x[:, None] - t[1:-1], 0, b)
        return np.column_stack([np.ones_like(x), (p * p / a + v * (2 - v / b)) / (a + b)])

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return state

    def penalty(self, state: Constants) -> Array | None:
        """Integral of f''^2 times the range of the knots: tridiagonal, zero for the straight part."""
        knots = np.array(state)
        gap = np.diff(knots)
        width = (gap[:-1] + gap[1:]) / 2
        out = np.zeros((max(len(knots) - 1, 1),) * 2)
        if len(knots) < 3:
            return out
        inner = np.diag(2 * width / 3) + np.diag(gap[1:-1] / 6, 1) + np.diag(gap[1:-1] / 6, -1)
        out[1:, 1:] = inner / np.outer(width, width) * (knots[-1] - knots[0])
        return out

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [x, *(f"{x} bend {j}" for j in range(1, len(state) - 1))]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        knots = ", ".join(plain(k) for k in state)
        bends = tuple((f"s{j}", f"bend(x, {j})") for j in range(1, len(state) - 1))
        return Code(
            columns=(("x", "x"), *bends),
            constants=(("KNOTS", f"({knots})", f"where the curve in {x} may bend; straight beyond the outer two"),),
            helper=_HELPER,
        )


def _observed(ordered: Array, share: Array) -> Array:
    """Values at these shares of the ordered ones, each once. A natural spline with knots on data has full rank."""
    places = np.unique(ordered[np.rint(share * (len(ordered) - 1)).astype(int)])
    return places[np.diff(places, prepend=-np.inf) > 1e-6 * np.ptp(ordered)]


def _rounded_hinges(x: Array, knots: Constants) -> Array:
    """For each inner knot: 0 up to the knot before, slope 1 from the knot after, a cubic rounding between; (n, k)."""
    t = np.asarray(knots)
    low, middle, high = t[:-2], t[1:-1], t[2:]
    a, b = middle - low, high - middle
    along = x[:, None]
    p = np.minimum(np.maximum(along - low, 0), a)
    v = np.minimum(np.maximum(along - middle, 0), b)
    rounded = p * p * p * (1 / (3 * a * (a + b))) + v * (a / (a + b) + v * (1 - v / (3 * b)) / (a + b))
    return np.asarray(rounded + np.maximum(along - high, 0))


_HELPER = '''
def bend(x, j):
    """Column j of a natural cubic spline: 0 before knot j - 1, slope 1 after knot j + 1, rounded between."""
    a, b = KNOTS[j] - KNOTS[j - 1], KNOTS[j + 1] - KNOTS[j]
    p, v = np.clip(x - KNOTS[j - 1], 0, a), np.clip(x - KNOTS[j], 0, b)
    rounded = p**3 / (6 * a) + a * v / 2 + v**2 / 2 - v**3 / (6 * b)
    return rounded * 2 / (a + b) + np.maximum(x - KNOTS[j + 1], 0)
'''

FAMILY = Smooth()
