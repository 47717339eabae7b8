"""Numbers as a person would write them: digits that the interval supports, thousands apart, the unit behind."""

from __future__ import annotations

import math

__all__ = ["show"]


def show(value: float, unit: str = "", *, width: float | None = None) -> str:
    """`value` in words: "12.4 min". width: that of its interval, which then keeps two digits; else three digits."""
    if not math.isfinite(value):
        return "not defined"
    scale = abs(value) if width is None or not width > 0 or not math.isfinite(width) else width
    digits = 3 if scale == abs(value) else 2
    lead = math.floor(math.log10(scale)) if scale > 0 else 0
    decimals = max(0, digits - 1 - lead)
    if decimals > 6 or abs(value) >= 1e9:
        text = f"{value:.3g}"
    else:
        text = f"{value:,.{decimals}f}"
        text = text.lstrip("-") if float(text.replace(",", "")) == 0 else text
    return f"{text} {unit}".rstrip()
