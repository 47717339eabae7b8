"""Dates on a scale that counts days."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, timedelta

import numpy as np

from batten.engine.rows import Array
from batten.frame.problem import Problem

__all__ = ["counted_from", "day_of", "day_ticks"]

#: steps between ticks: minutes up to half a day, days up to two weeks, months
_MINUTES = (1, 5, 15, 30, 60, 180, 360, 720)
_DAYS = (1, 2, 7, 14)
_MONTHS = (1, 2, 3, 6, 12, 24, 60, 120, 240, 600, 1200)
_DAY, _MONTH = timedelta(days=1), 30.4
#: a Monday from which steps of days are counted, so that they do not move with the data
_MONDAY = datetime(2001, 1, 1)
_NAMES = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")


def counted_from(problem: Problem) -> datetime | None:
    """The day that the focal predictor counts from, where it holds dates."""
    slots = problem.design.slots.values()
    return next((s.start.to_pydatetime() for s in slots if s.column == problem.focus and s.start is not None), None)


def day_of(start: datetime, days: float) -> str:
    """A place on the scale as a date, with its time of day where it has one: "2026-03-31", "2026-03-31 14:30"."""
    at = start + timedelta(minutes=round(days * 1440))
    return f"{at:%Y-%m-%d}" if (at.hour, at.minute) == (0, 0) else f"{at:%Y-%m-%d %H:%M}"


def day_ticks(start: datetime, low: float, high: float, *, most: int) -> tuple[Array, list[str]]:
    """Round dates from low to high, about `most` or fewer: days since `start`, and labels."""
    first, last, span = start + timedelta(days=low), start + timedelta(days=high), high - low
    if span < 1.5:
        minutes = next((m for m in _MINUTES if span * 1440 / m <= most), _MINUTES[-1])
        midnight = datetime(first.year, first.month, first.day)
        found = [
            (at, f"{at.day} {_NAMES[at.month - 1]} {at:%H:%M}") for at in _every(midnight, minutes * _DAY / 1440, last)
        ]
    elif span / _DAYS[-1] <= most:
        step = next(d for d in _DAYS if span / d <= most) * _DAY
        origin = _MONDAY + step * ((first - _MONDAY) // step)
        found = [(at, f"{at.day} {_NAMES[at.month - 1]} {at.year}") for at in _every(origin, step, last)]
    else:
        months = next((m for m in _MONTHS if span / (m * _MONTH) <= most), _MONTHS[-1])
        found = [(at, f"{_NAMES[at.month - 1]} {at.year}" if months < 12 else str(at.year))
                 for at in _months(first, months, last)]  # fmt: skip
    kept = [(at, label) for at, label in found if first <= at <= last]
    return np.array([(at - start) / _DAY for at, _ in kept]), [label for _, label in kept]


def _every(at: datetime, step: timedelta, last: datetime) -> Iterator[datetime]:
    while at <= last:
        yield at
        at += step


def _months(first: datetime, step: int, last: datetime) -> Iterator[datetime]:
    """First days of every so many months, those of January among them."""
    month = (first.year * 12 + first.month - 1) // step * step
    while (at := datetime(month // 12, month % 12 + 1, 1)) <= last:
        yield at
        month += step
