"""One number with its interval, or the words for why it is not there."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from batten.engine.rows import Array

__all__ = ["Effect", "effect_of", "undefined"]


@dataclass(frozen=True)
class Effect:
    """estimate, low, high in one unit; NaN where undefined, with the reason in note."""

    estimate: float
    low: float
    high: float
    note: str = ""

    @property
    def defined(self) -> bool:
        return math.isfinite(self.estimate)

    def direction(self, *, against: float = 0.0) -> Literal["higher", "lower", "open"]:
        """Whether the whole interval lies above or below `against` (0 for a difference, 1 for a ratio)."""
        if self.low > against:
            return "higher"
        return "lower" if self.high < against else "open"

    def without_interval(self, why: str) -> Effect:
        """The estimate alone, and why it has no interval."""
        return Effect(self.estimate, math.nan, math.nan, self.note or why)

    def through(self, rising: Callable[[float], float]) -> Effect:
        """The same quantity read through a rising function, its interval by its ends."""
        return Effect(rising(self.estimate), rising(self.low), rising(self.high), self.note)

    def times(self, factor: float) -> Effect:
        """The same quantity in other units; a negative factor turns the interval round."""
        ends = sorted((self.low * factor, self.high * factor)) if self.defined else [math.nan, math.nan]
        return Effect(self.estimate * factor, ends[0], ends[1], self.note)


def undefined(note: str) -> Effect:
    """No number, and why."""
    return Effect(math.nan, math.nan, math.nan, note)


def effect_of(value: Array, ends: tuple[Array, Array], at: int = 0, note: str = "") -> Effect:
    """The entry `at` of values (G,) and of their interval ends (G,), (G,)."""
    return Effect(float(value[at]), float(ends[0][at]), float(ends[1][at]), note)
