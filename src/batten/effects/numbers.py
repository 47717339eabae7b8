"""Numbers as a person would write them: digits that the interval supports, thousands apart, the unit behind.

Sentences, tables and figures all print through here, so the digits of one quantity agree wherever it appears.
"""

from __future__ import annotations

import math

__all__ = ["about", "counted", "place", "show", "show_interval"]


def show(value: float, unit: str = "", *, width: float | None = None) -> str:
    """`value` in words: "12.4 min". width: that of its interval, without which three digits are kept.

    The last digit kept is at most a twentieth of the width, so rounding never moves an end by more than a fortieth of
    it. Digits before the point are dropped only where an interval says so: 123,456 with a width of 5,000 is 123,500.
    """
    if not math.isfinite(value):
        return "not defined"
    if width is not None and math.isfinite(width) and width > 0:
        decimals = -math.floor(math.log10(width / 20))
    else:
        decimals = max(0, 2 - math.floor(math.log10(abs(value)))) if value else 0
    text = f"{value:.3g}" if decimals > 6 or abs(value) >= 1e12 else f"{round(value, decimals):,.{max(0, decimals)}f}"
    text = text.lstrip("-") if float(text.replace(",", "")) == 0 else text
    return _with_unit(text, unit)


def show_interval(low: float, high: float, unit: str = "") -> str:
    """Both ends with the same digits: "10.1 to 14.7 min"."""
    first = show(low, width=high - low)
    return f"{first} to {show(high, unit, width=high - low)}"


def counted(value: float) -> str:
    """Constants or degrees of freedom: "12", or "8.3" where a penalty makes them effective ones."""
    return f"{value:,.0f}" if value == round(value) else f"{value:,.1f}"


def place(value: float, unit: str = "") -> str:
    """A value of x that was asked for or read off the data, as typed: "1900", "10.5 kg"."""
    return _with_unit(f"{value:.6g}" if abs(value) < 1e6 or value != round(value) else f"{value:.0f}", unit)


def about(value: float, unit: str = "") -> str:
    """An end of the data, to four digits: "101.5 kg"."""
    return place(float(f"{value:.4g}"), unit)


def _with_unit(text: str, unit: str) -> str:
    return f"{text}{unit}" if unit == "%" else f"{text} {unit}".rstrip()
