"""Scales of axes: a rule, ticks at round numbers or dates, and their labels."""

from __future__ import annotations

import math
from datetime import datetime
from typing import Any

import numpy as np
from matplotlib.axes import Axes

from batten.engine.rows import Array
from batten.report import style
from batten.report.canvas import inches, letters, strokes
from batten.report.days import day_ticks

__all__ = ["round_places", "scale"]

#: inches that a date takes below a scale
DATE = 0.85


def scale(
    ax: Axes, side: str, *, most: int = 6, grid: bool = False, rule: bool = True, start: datetime | None = None
) -> str:
    """The scale of an axis (side "x" or "y") at round numbers; returns a word for it ("millions"), mostly "".

    Drawn once the limits are set. start: the day that x counts from, for dates.
    """
    low, high = ax.get_xlim() if side == "x" else ax.get_ylim()
    if start is not None:
        room = int(inches(ax)[0] / DATE) if side == "x" else most
        places, labels, word = (*day_ticks(start, low, high, most=min(most, room)), "")
    else:
        places = round_places(low, high, most=most)
        power, word = _large(float(np.abs(places).max()) if len(places) else 0.0)
        labels = _labels(places / power)
    if grid:
        _ticks(ax, side, places, 0.0, 1.0, color=style.FAINT, width=0.6, zorder=0.5)
    point = 1 / 72 / inches(ax)[side == "x"]  # as a share of the axes, across the scale
    if rule:
        end = [(0.0, 0.0), (1.0, 0.0)] if side == "x" else [(0.0, 0.0), (0.0, 1.0)]
        strokes(ax, [end], ax.transAxes, color=style.RULE, width=0.8, zorder=2.5)
        _ticks(ax, side, places, -3 * point, 0.0, color=style.RULE, width=0.8, zorder=2.5)
    for place, label in zip(places, labels, strict=True):
        if side == "x":
            at, how = (float(place), -6 * point), {"ha": "center", "va": "top", "transform": ax.get_xaxis_transform()}
        else:
            at, how = (-6 * point, float(place)), {"ha": "right", "va": "center", "transform": ax.get_yaxis_transform()}
        letters(ax, *at, label, color=style.QUIET, size=style.SMALL, **how)  # type: ignore[arg-type]
    return word


def _ticks(ax: Axes, side: str, places: Array, low: float, high: float, **look: Any) -> None:
    """Strokes across a scale, from `low` to `high` as shares of the axes."""
    if side == "x":
        strokes(ax, [[(p, low), (p, high)] for p in places], ax.get_xaxis_transform(), **look)
    else:
        strokes(ax, [[(low, p), (high, p)] for p in places], ax.get_yaxis_transform(), **look)


def round_places(low: float, high: float, *, most: int) -> Array:
    """At most `most` + 1 multiples of 1, 2, 2.5 or 5 times a power of ten inside low to high."""
    at_least = (high - low) / most
    unit = float(10.0 ** math.floor(math.log10(at_least)))
    step = unit * next(m for m in (1, 2, 2.5, 5, 10) if m * unit >= at_least * (1 - 1e-9))
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return np.arange(first, last + 1, dtype=np.float64) * step


_WORDS = (
    (1e12, "trillions"), (1e9, "billions"), (1e6, "millions"), (1e-4, ""), (1e-6, "millionths"), (1e-9, "billionths"),
)  # fmt: skip


def _large(size: float) -> tuple[float, str]:
    """The power of ten that tick labels are divided by, and its word."""
    for power, word in _WORDS:
        if size >= power:
            return (power, word) if word else (1.0, "")
    return 1.0, ""


def _labels(places: Array) -> list[str]:
    """Labels with as many decimals as the step needs."""
    if len(places) < 2:
        return [f"{p:.6g}" for p in places]
    step = float(places[1] - places[0])
    if not 1e-7 < step < 1e12:
        return [f"{p:.6g}" for p in places]
    decimals = next((d for d in range(8) if math.isclose(round(step, d), step, rel_tol=1e-6)), 8)
    return [f"{p + 0.0:,.{decimals}f}".replace("-", "−") for p in places]
