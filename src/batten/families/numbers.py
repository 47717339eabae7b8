"""Small number work shared by the members: literals a person would write, and powers that never warn."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable

import numpy as np

from batten.families.base import Array

__all__ = [
    "distinct", "exp", "listed", "log", "near", "number", "origin", "plain", "positive", "power", "shown", "typical",
    "width",
]  # fmt: skip


def number(text: str) -> float | None:
    """The finite decimal number that a text spells, or None."""
    return float(text) if re.fullmatch(r"[-+]?(\d+\.?\d*|\.\d+)([eE][-+]?\d+)?", text) else None


def plain(value: float) -> str:
    """The shortest text that reads back as the same number: 10, 0.5, -2."""
    return str(int(value)) if value == int(value) and abs(value) < 1e15 else repr(float(value))


def shown(value: float) -> str:
    """A number for labels: six digits, no trailing zeros."""
    return f"{value:.6g}"


def listed(values: Iterable[float]) -> str:
    """Numbers inside brackets of a key: 10, 20, 40."""
    return ", ".join(plain(v) for v in values)


def distinct(x: Array) -> int:
    """How many different values there are."""
    return len(np.unique(x))


def near(value: float, spread: float) -> float:
    """`value` rounded to a tenth of the leading digit of `spread`: a literal a person would write (1898 -> 1900)."""
    if not (spread > 0 and math.isfinite(spread)):
        return float(value)
    return float(round(value, 1 - math.floor(math.log10(spread))))


def origin(x: Array) -> float:
    """0, or a rounded middle of x where the values lie far from zero compared with their range.

    Powers of x itself are easiest to read and are safe while max|x| is at most three ranges; beyond that they are
    nearly collinear (years, temperatures in kelvin), and powers of the distance from a literal say the same better.
    """
    low, high = float(np.min(x)), float(np.max(x))
    return near((low + high) / 2, high - low) if max(abs(low), abs(high)) > 3 * (high - low) else 0.0


def positive(x: Array) -> Array:
    """The values above zero; 1 alone where a training set holds none."""
    above: Array = x[x > 0]
    return above if len(above) else np.ones(1)


def width(x: Array) -> float:
    """Range of x; 1 where a training set holds a single value."""
    return float(np.ptp(x)) or 1.0


def typical(x: Array) -> float:
    """A power of ten near the geometric mean of x > 0: dividing by it keeps high powers within range."""
    return float(10.0 ** np.round(np.mean(np.log10(x))))


def log(x: Array) -> Array:
    """Natural logarithm; NaN where x is zero or negative."""
    return np.log(np.where(x > 0, x, np.nan))


def power(x: Array, exponent: float) -> Array:
    """x to a fixed power; NaN where it is not defined or not finite."""
    with np.errstate(all="ignore"):
        size = abs(exponent)
        # products are some ten times faster than a general power, which a million rows feel
        raised = x * x * x if size == 3 else x * x if size == 2 else np.sqrt(x) if size == 0.5 else x**size
        raised = raised if exponent == size else 1 / raised
    return np.where(np.isfinite(raised), raised, np.nan)


def exp(t: Array) -> Array:
    """e^t that stays finite far outside the data, so that products with it do too."""
    return np.exp(np.clip(t, -300.0, 300.0))
