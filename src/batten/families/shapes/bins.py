"""Groups of the focal predictor."""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import pairwise
from typing import ClassVar

import numpy as np

from batten.errors import Refusal, keys
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, listed, plain, shown

__all__ = ["FAMILY", "Bins"]


@dataclass(frozen=True)
class Bins(Shape):
    """One step per group of x: `count` groups of about equal size, or groups between given inner edges.

    Use where the decision itself is by class; the price is the slope lost inside each group (Cox 1957; Royston, Altman
    and Sauerbrei 2006). An edge is a value of x and belongs to the group above it; the outer groups are open. Groups
    chosen by size hold at least max(10, 5%) rows: fewer groups are made until they do, but never fewer than two.
    With a constant in the span the first group is the reference and has no column.
    State: (1 with a constant in the span, else 0; inner edges).
    """

    count: int = 5
    edges: Constants = ()
    family: ClassVar[str] = "bins"
    group: ClassVar[str] = "groups"
    steps: ClassVar[bool] = True
    tail: ClassVar[str] = "flat"
    rank: ClassVar[int] = 10

    @property
    def detail(self) -> int:  # type: ignore[override]
        return self.count

    @property
    def key(self) -> str:
        return f"bins({listed(self.edges)}) x" if self.edges else f"bins{self.count} x"

    def read(self, word: str, numbers: Constants | None) -> Shape | None:
        written = re.fullmatch(r"bins(\d*)", word)
        if not written or bool(written.group(1)) is (numbers is not None):
            return None
        if numbers is None:
            count = int(written.group(1))
            if not 2 <= count <= 50:
                raise keys.wrong_numbers(f"{word} x", "There can be 2 to 50 groups.", instead="Write bins5 x.")
            return Bins(count)
        if not numbers or any(b <= a for a, b in pairwise(numbers)):
            raise keys.wrong_numbers(f"{word}({listed(numbers)}) x", "Groups need inner edges in rising order.",
                                     instead="Write bins(10, 20, 40) x for four groups.")  # fmt: skip
        return Bins(len(numbers) + 1, numbers)

    def words(self, x: str) -> str:
        return f"grouped {x} (at {listed(self.edges)})" if self.edges else f"grouped {x} ({self.count})"

    def refuse(self, x: Array) -> Refusal | None:
        if not self.edges:
            return None if distinct(x) > 1 else Refusal(
                wrong="Groups need a predictor that varies.",
                seen=f"All {len(x)} values are {shown(x[0])}.",
                instead="Another focal predictor.",
            )  # fmt: skip
        sizes = _sizes(x, np.array(self.edges))
        if sizes.all():
            return None
        empty = self.names("x", (0.0, *self.edges))[int(np.argmin(sizes))]
        return Refusal(
            wrong="A group without rows cannot be estimated.",
            seen=f"No row has {empty} (values run from {shown(np.min(x))} to {shown(np.max(x))}).",
            instead=f"Other edges, or groups of about equal size: bins{self.count} x.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return (float(constant), *(self.edges or _equal_count(x, self.count)))

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        edges = np.array(state[1:])
        steps = np.searchsorted(edges, x, side="right")[:, None] == np.arange(int(state[0]), len(edges) + 1)
        return np.where(np.isnan(x)[:, None], np.nan, steps)

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.full((len(x), len(state) - int(state[0])), np.nan)

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return state[1:]

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        edges = [shown(e) for e in state[1:]]
        between = [f"{x} {low} to {high}" for low, high in pairwise(edges)]
        return [f"{x} below {edges[0]}", *between, f"{x} {edges[-1]} and above"][int(state[0]) :]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        edges = ", ".join(plain(e) for e in state[1:])
        first = int(state[0])
        reference = "; the first group is the reference" if first else ""
        return Code(
            columns=tuple((f"group{j + 1}", f"group(x, {j})") for j in range(first, len(state))),
            constants=(("EDGES", f"({edges},)", f"where a new group of {x} begins{reference}"),),
            helper=_HELPER,
        )


def _sizes(x: Array, edges: Array) -> Array:
    """Rows in each group."""
    return np.bincount(np.searchsorted(edges, x, side="right"), minlength=len(edges) + 1).astype(float)


def _equal_count(x: Array, count: int) -> Constants:
    """Inner edges, each the first value of its group, so that ties stay together and units do not matter."""
    ordered = np.sort(x)
    above = ordered[ordered > ordered[0]]
    if not len(above):
        return (float(ordered[0]),)  # a training set with a single value
    edges = above[:1]
    for groups in range(min(count, len(x)), 1, -1):
        starts = np.ceil(np.arange(1, groups) * len(x) / groups).astype(int)
        edges = np.unique(ordered[starts])
        edges = edges[edges > ordered[0]]
        if not len(edges):  # the lowest value fills all but the last group: it is one group, the others are the second
            edges = above[:1]
        if (_sizes(x, edges) >= max(10.0, 0.05 * len(x))).all():
            break
    return tuple(float(e) for e in edges)


_HELPER = '''
def group(x, j):
    """1 in group j of x, 0 in the others, missing where x is missing."""
    return np.where(np.isnan(x), np.nan, np.searchsorted(EDGES, x, side="right") == j)
'''

FAMILY = Bins()
