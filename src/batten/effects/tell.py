"""Building blocks of sentences: numbers written and kept at once, and the three directional states.

Words never claim a cause. A direction is told only where the whole interval lies on one side: clearly more, clearly
less, or the data do not settle the direction.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from batten.effects.numbers import place, show, show_interval
from batten.effects.value import Effect

__all__ = ["UNSETTLED", "Names", "Sentence", "Told"]

UNSETTLED = "the data do not settle the direction"


@dataclass(frozen=True)
class Sentence:
    """One finished sentence. kind: what it tells. values: every number printed in it, by name, in full precision."""

    text: str
    kind: str
    values: tuple[tuple[str, float], ...] = ()

    @property
    def numbers(self) -> dict[str, float]:
        """The numbers used, by name (a fresh dict)."""
        return dict(self.values)

    def __str__(self) -> str:
        return self.text


@dataclass(frozen=True)
class Names:
    """How the response and the focal predictor are called, their units ("" when unknown), whether covariates stand
    beside, which of them are held at a value (name, value), and the level of intervals.
    """

    y: str = "y"
    x: str = "x"
    y_unit: str = ""
    x_unit: str = ""
    covariates: bool = False
    at: tuple[tuple[str, object], ...] = ()
    level: float = 0.95

    @property
    def one(self) -> str:
        """One unit of x: "kg", "day", or "unit of mass_kg"."""
        return "day" if self.x_unit == "days" else self.x_unit or f"unit of {self.x}"

    @property
    def alike(self) -> str:
        held = "".join(f", with {name} at {value}" for name, value in self.at)
        return held or (", covariates alike" if self.covariates else "")


@dataclass
class Told:
    """Writes numbers into one sentence and remembers them."""

    names: Names
    numbers: dict[str, float] = field(default_factory=dict)

    def __post_init__(self) -> None:
        numbers = {name: value for name, value in self.names.at if isinstance(value, int | float)}
        self.numbers.update({f"at {name}": float(value) for name, value in numbers.items()})

    def number(self, name: str, value: float, unit: str = "", *, width: float | None = None) -> str:
        self.numbers[name] = value
        return show(value, unit, width=width)

    def place(self, name: str, value: float, unit: str = "") -> str:
        """A value of x or y as it was asked for."""
        self.numbers[name] = value
        return place(value, unit)

    def interval(self, name: str, low: float, high: float, unit: str = "") -> str:
        """Both ends named with their level: "95% interval 10.1 to 14.7 min"."""
        self.numbers[f"{name}_low"], self.numbers[f"{name}_high"] = low, high
        self.numbers["level"] = round(100 * self.names.level, 6)
        return f"{place(self.numbers['level'])}% interval {show_interval(low, high, unit)}"

    def estimate(self, name: str, effect: Effect, unit: str = "") -> str:
        """ "12.4 min (95% interval 10.1 to 14.7 min)"; without an interval, the reason in its place."""
        if math.isnan(effect.low):
            return f"{self.number(name, effect.estimate, unit)} ({effect.note or 'no interval'})"
        value = self.number(name, effect.estimate, unit, width=effect.high - effect.low)
        return f"{value} ({self.interval(name, effect.low, effect.high, unit)})"

    def amount(self, name: str, effect: Effect, unit: str = "", *, more: str = "more", less: str = "less") -> str:
        """ "12.4 min more (95% interval ...)", "... less (...)", or the difference where no direction is settled."""
        way = effect.direction()
        if math.isnan(effect.low):
            return f"a difference of {self.estimate(name, effect, unit)}"
        if way == "open":
            return f"a difference of {self.estimate(name, effect, unit)}; {UNSETTLED}"
        size = effect if way == "higher" else effect.times(-1)
        value = self.number(name, size.estimate, unit, width=size.high - size.low)
        return f"{value} {more if way == 'higher' else less} ({self.interval(name, size.low, size.high, unit)})"

    def sentence(self, kind: str, text: str) -> Sentence:
        return Sentence(text, kind, tuple(self.numbers.items()))
