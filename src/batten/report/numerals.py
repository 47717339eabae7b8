"""Digits of the table's numbers: the same quantity reads the same in figures, tables, pages and text."""

from __future__ import annotations

import math

from batten.effects.numbers import place, show, show_interval

__all__ = ["behind", "difference", "error", "percent", "span_words"]


def error(value: float, lowest: float, unit: str = "") -> str:
    """A held-out error, to a hundredth of the lowest one; errors far above it keep three or four digits."""
    return show(value, unit, width=_width(value, lowest))


def behind(gap: float, lowest: float, unit: str = "") -> str:
    """The gap of a held-out error to the lowest one, with the digits of that error."""
    return show(gap, unit, width=_width(lowest + gap, lowest))


def _width(value: float, lowest: float) -> float | None:
    width = max(lowest / 100, abs(value) / 20 if abs(value) > 2 * lowest else 0.0)
    return width if math.isfinite(width) and width > 0 else None


def difference(estimate: float, low: float, high: float, unit: str = "") -> str:
    """An estimate with its interval in brackets: "+12.4 min (10.1 to 14.7)"."""
    if not math.isfinite(estimate):
        return "not defined"
    sign = "+" if estimate > 0 else ""
    if not (math.isfinite(low) and math.isfinite(high)):
        return f"{sign}{show(estimate, unit)} (no interval)"
    return f"{sign}{show(estimate, unit, width=high - low)} ({show_interval(low, high)})"


def percent(share: float) -> str:
    """A share as a whole percent."""
    return f"{100 * share:.0f}%" if math.isfinite(share) else "not defined"


def span_words(a: float, b: float, unit: str = "") -> str:
    """The two ends of the span: "10 to 25 kg"."""
    return f"{place(a)} to {place(b, unit)}"
