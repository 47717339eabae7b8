"""One step at a searched place."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from batten.errors import Refusal
from batten.families.base import Array, Code, Constants, Shape
from batten.families.numbers import distinct, plain, shown

__all__ = ["FAMILY", "Cut"]


@dataclass(frozen=True)
class Cut(Shape):
    """Two groups of x, the cut point chosen with the response among up to 60 places between the outer tenths.

    On request only. The step at the best of many places looks larger than it is, and a test that forgets the search
    finds steps in noise (Miller and Siegmund 1982; Altman and others 1994); hinges and splines lose less. The cut
    belongs to the upper group. State: (1 with a constant in the span, else 0).
    """

    family: ClassVar[str] = "cut"
    group: ClassVar[str] = "groups"
    searched: tuple[str, ...] = ("cut",)
    finite: ClassVar[bool] = True
    steps: ClassVar[bool] = True
    tail: ClassVar[str] = "flat"
    rank: ClassVar[int] = 10

    @property
    def key(self) -> str:
        return "cut x"

    def words(self, x: str) -> str:
        return f"{x} cut in two (place searched)"

    def constant_words(self, x: str, y: str) -> tuple[str, ...]:
        return (f"{x} where the upper group begins",)

    def refuse(self, x: Array) -> Refusal | None:
        if distinct(x) >= 4:
            return None
        return Refusal(
            wrong="A searched cut needs four different values.",
            seen=f"There are {distinct(x)} in {len(x)} rows.",
            instead="Groups with edges given by hand: bins(10) x.",
        )

    def learn(self, x: Array, *, constant: bool = True) -> Constants:
        return (float(constant),)

    def candidates(self, x: Array, state: Constants) -> Array:
        """Values of x that leave a tenth of the rows on each side."""
        ordered = np.sort(x)
        outer = max(1, -(-len(x) // 10))
        places = np.unique(ordered[outer : len(x) - outer + 1])
        places = places[places > ordered[0]]
        if not len(places):  # ties fill the lower nine tenths, or everything
            places = np.unique(x)[-1:]
        some = np.unique(np.linspace(0, len(places) - 1, min(len(places), 60)).astype(int))
        return np.asarray(places[some][:, None])

    def bounds(self, x: Array, state: Constants) -> tuple[Array, Array]:
        places = self.candidates(x, state)
        return places[0], places[-1]

    def columns(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        upper = np.where(np.isnan(x), np.nan, x >= theta[0])
        return upper[:, None] if state[0] else np.column_stack([1 - upper, upper])

    def slopes(self, x: Array, state: Constants, theta: Constants = ()) -> Array:
        return np.full((len(x), 2 - int(state[0])), np.nan)

    def cuts(self, state: Constants, theta: Constants = ()) -> Constants | None:
        return theta

    def names(self, x: str, state: Constants, theta: Constants = ()) -> list[str]:
        place = shown(theta[0])
        return [f"{x} below {place}", f"{x} {place} and above"][int(state[0]) :]

    def code(self, x: str, state: Constants, theta: Constants = ()) -> Code:
        upper = ("upper", "np.where(np.isnan(x), np.nan, x >= CUT)")
        lower = ("lower", "np.where(np.isnan(x), np.nan, x < CUT)")
        return Code(
            columns=(upper,) if state[0] else (lower, upper),
            constants=(("CUT", plain(theta[0]), f"where the upper group of {x} begins; searched"),),
        )


FAMILY = Cut()
