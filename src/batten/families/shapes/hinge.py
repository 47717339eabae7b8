"""Broken lines: the slope changes at one or two places."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, listed, plain, shown

__all__ = ["FAMILIES", "Hinge"]


@dataclass(frozen=True)
class Hinge(Shape):
    """Columns x and (x - break)+ for each break, so the line stays joined (Hudson 1966; Muggeo 2003).

    Use where the relation changes at a threshold. Breaks are searched between the outer tenths of the rows, or given.
    A break at the end of that range is not an estimate, and the t statistic of the kink at the best place is no test
    of whether there is one (Davies 1987). The slope at a break is undefined; `slopes` gives the one on its left.
    """

    count: int = 1
    breaks: Constants = ()
    family: ClassVar[str] = "hinge"
    corners: ClassVar[bool] = True
    group: ClassVar[str] = "hinges"

    @property
    def rank(self) -> int:  # type: ignore[override]  # two breaks cost as much as a second-degree fractional polynomial
        return 4 if self.count == 1 else 7

    @property
    def detail(self) -> int:  # type: ignore[override]  # after the quadratic
        return 30

    @property
    def searched(self) -> tuple[str, ...]:  # type: ignore[override]  # nothing is searched when breaks are given
        return () if self.breaks else ("break",) if self.count == 1 else ("first break", "second break")

    @property
    def key(self) -> str:
        word = "hinge" if self.count == 1 else "hinge2"
        return f"{word}({listed(self.breaks)}) x" if self.breaks else f"{word} x"

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        counts = {"hinge": 1, "hinge2": 2}
        if word not in counts:
            return None
        if numbers is None:
            return Hinge(counts[word])
        if len(numbers) != counts[word] or list(numbers) != sorted(set(numbers)):
            raise keys.wrong_numbers(
                f"{word}({listed(numbers)}) x", "A hinge takes one break, hinge2 two in rising order.",
                instead="Write hinge(500) x, hinge2(200, 500) x, or hinge x to have the break searched.",
            )  # fmt: skip
        return Hinge(counts[word], numbers)

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return tuple(f"{name} in {x}" for name in self.searched)

    def words(self, x: str) -> str:
        if self.breaks:
            return f"hinge in {x} (at {listed(self.breaks)})"
        return f"hinge in {x}" if self.count == 1 else f"hinge in {x} (2 breaks)"

    def refuse(self, x: Array) -> Refusal | None:
        needed = 3 + 2 * self.count if not self.breaks else 2 + self.count
        found, low, high = distinct(x), float(np.min(x)), float(np.max(x))
        if found < needed:
            return Refusal(
                wrong=f"A broken line with {self.count} break{'s' * (self.count > 1)} needs {needed} different values.",
                seen=f"There are {found} in {len(x)} rows.",
                instead="A straight line, or the predictor as groups: C(...) in the formula.",
            )
        if self.breaks and not (low < self.breaks[0] and self.breaks[-1] < high):
            return Refusal(
                wrong="A break needs rows on both sides.",
                seen=f"Breaks at {listed(self.breaks)}; values run from {shown(low)} to {shown(high)}.",
                instead="A break inside the data, or hinge x to have it searched.",
            )
        return None

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return self.breaks

    def candidates(self, x: Array, state: Constants) -> Array:
        if self.breaks:
            return np.empty((1, 0))
        low, high = _interior(x)
        inside = x[(x >= low) & (x <= high)]
        places = np.unique(np.quantile(inside, np.linspace(0, 1, 30 if self.count == 1 else 15)))
        if len(places) <= self.count:
            places = np.linspace(low, high, 5)
        return np.array(list(itertools.combinations(places, self.count)))

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        if self.breaks:
            return np.empty(0), np.empty(0)
        low, high = _interior(x)
        return np.full(self.count, low), np.full(self.count, high)

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.column_stack([x, *(np.maximum(x - place, 0) for place in (*state, *theta))])

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        steps = [np.where(np.isnan(x), np.nan, x > place) for place in (*state, *theta)]
        return np.column_stack([np.ones_like(x), *steps])

    def theta_slopes(self, x: Array, state: Constants, theta: Constants) -> Array:
        out = np.zeros((len(theta), len(x), 1 + len(state) + len(theta)))
        for j, place in enumerate(theta):
            out[j, :, 1 + len(state) + j] = np.where(np.isnan(x), np.nan, -(x > place).astype(float))
        return out

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return (*state, *theta)

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        return [x, *(f"{x} above {shown(place)}" for place in (*state, *theta))]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        places = (*state, *theta)
        names = ["BREAK"] if len(places) == 1 else [f"BREAK{j + 1}" for j in range(len(places))]
        comment = f"where the slope in {x} changes" + ("" if self.breaks else "; estimated")
        return Code(
            columns=(("x", "x"), *((f"above{j + 1}", f"np.maximum(x - {name}, 0)") for j, name in enumerate(names))),
            constants=tuple((name, plain(place), comment) for name, place in zip(names, places, strict=True)),
        )


def _interior(x: Array) -> tuple[float, float]:
    """Where a break may lie: a tenth of the rows (and five, where there are enough) and two values on each side."""
    ordered, values = np.sort(x), np.unique(x)
    n = len(x)
    outer = max(-(-n // 10), min(5, (n - 1) // 3), 1)
    second, second_last = values[min(1, len(values) - 1)], values[max(len(values) - 2, 0)]
    low, high = max(ordered[outer - 1], second), min(ordered[n - outer], second_last)
    if low >= high:  # ties fill one side: leave the tenths
        low, high = min(second, second_last), max(second, second_last)
    return float(low), float(high)


FAMILIES = (Hinge(1), Hinge(2))
