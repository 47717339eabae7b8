"""Fields to type into. What is typed stays as it is, also where it cannot be read."""

from __future__ import annotations

import math
from collections.abc import Callable
from datetime import datetime, timedelta
from typing import Any, Protocol

import ipywidgets as widgets
import pandas as pd

from batten.effects.numbers import place
from batten.errors.widget import not_a_date, not_a_number
from batten.frame.columns import word
from batten.report.days import day_of
from batten.report.lettering import plain, shortened

__all__ = ["Choices", "Dates", "Days", "Field", "Numbers", "labelled", "number_in"]

#: up to this many choices stand side by side as buttons
BUTTONS = 6
#: letters of a column's name that a label keeps
NAME = 50


class Field(Protocol):
    """One value of one column."""

    name: str
    box: Any

    def read(self) -> Any: ...

    def on_change(self, call: Callable[..., None]) -> None: ...


class Numbers:
    """A number, typed. `value` is kept to the last digit for as long as its text stands untouched."""

    def __init__(self, name: str, value: float, *, unit: str = "", label: str = "") -> None:
        self.name = name
        self.text = widgets.Text(continuous_update=False)
        self.box = labelled(label or shortened(name, NAME), self.text, unit)
        self.set(value)

    def set(self, value: float) -> None:
        """Write a value into the field."""
        self._value, self._written = value, place(value)
        self.text.value = self._written

    def read(self) -> float:
        return self._value if self.text.value == self._written else number_in(self.text.value, self.name)

    def on_change(self, call: Callable[..., None]) -> None:
        self.text.observe(call, "value")


class Days:
    """A date, typed, for a number of days since `start`."""

    def __init__(self, name: str, value: float, *, start: datetime, label: str) -> None:
        self.name, self._start = name, start
        self.text = widgets.Text(continuous_update=False)
        self.box = labelled(label, self.text)
        self.set(value)

    def set(self, value: float) -> None:
        """Write a value into the field."""
        self._value, self._written = value, day_of(self._start, value)
        self.text.value = self._written

    def read(self) -> float:
        if self.text.value == self._written:
            return self._value
        return (date_in(self.text.value, self.name).to_pydatetime() - self._start) / timedelta(days=1)

    def on_change(self, call: Callable[..., None]) -> None:
        self.text.observe(call, "value")


class Dates:
    """A date, typed."""

    def __init__(self, name: str, value: pd.Timestamp) -> None:
        self.name = name
        self.text = widgets.Text(word(value), continuous_update=False)
        self.box = labelled(shortened(name, NAME), self.text)

    def read(self) -> pd.Timestamp:
        return date_in(self.text.value, self.name)

    def on_change(self, call: Callable[..., None]) -> None:
        self.text.observe(call, "value")


class Choices:
    """One of a column's levels."""

    def __init__(self, name: str, value: Any, levels: list[Any]) -> None:
        self.name, self._levels = name, levels
        texts = _apart([plain(word(level)) for level in levels])
        kind = widgets.ToggleButtons if len(levels) <= BUTTONS else widgets.Dropdown
        self.choice = kind(options=texts, index=levels.index(value))
        self.box = labelled(shortened(name, NAME), self.choice)

    def read(self) -> Any:
        return self._levels[self.choice.index]

    def on_change(self, call: Callable[..., None]) -> None:
        self.choice.observe(call, "index")


def date_in(text: str, name: str) -> pd.Timestamp:
    """The date that a text holds."""
    try:
        stamp = pd.Timestamp(text)
    except ValueError:
        raise not_a_date(name, text) from None
    if not isinstance(stamp, pd.Timestamp):  # empty text is "not a time"
        raise not_a_date(name, text)
    return stamp


def number_in(text: str, name: str) -> float:
    """The number that a text holds; a space, or a comma that stands between thousands, may group its digits."""
    try:
        value = float(_ungrouped(text))
    except ValueError:
        raise not_a_number(name, text) from None
    if not math.isfinite(value):
        raise not_a_number(name, text)
    return value


def _ungrouped(text: str) -> str:
    """Thousands written as this package prints them: "1,234,567.8"; "12,5" is left as it is, and refused."""
    text = text.strip().replace("−", "-")
    whole, point, rest = text.partition(".")
    head, *groups = whole.split(",")
    if groups and 0 < len(head.lstrip("+-")) <= 3 and all(len(group) == 3 and group.isdigit() for group in groups):
        return f"{head}{''.join(groups)}{point}{rest}"
    return text


def _apart(texts: list[str]) -> list[str]:
    """The same, with numbers behind texts that would read alike."""
    return [f"{text} ({i + 1})" if texts.count(text) > 1 else text for i, text in enumerate(texts)]


def labelled(label: str, control: widgets.Widget, unit: str = "") -> widgets.HBox:
    """A control with its label before it, which the page ties to it, and a unit behind."""
    control.description = label
    control.style.description_width = "initial"
    control.layout.width = "auto"
    box = widgets.HBox([control, widgets.Label(shortened(unit, 20))] if unit else [control])
    box.add_class("batten-field")
    return box
