"""Weights in a script: learned from how the errors spread."""

from __future__ import annotations

import math

from batten.emit.parts import Parts
from batten.emit.text import docstring, number

__all__ = ["Constant", "root_function", "root_of", "spread_constants", "weighted_fit"]

Constant = tuple[str, str, str]


def spread_constants(parts: Parts) -> list[Constant]:
    """What was learned of the spread."""
    spread = parts.est.spread
    if spread is None:
        return []
    if not spread.positive:
        return [
            ("SPREAD", number(spread.power), "the log of the errors' SD grows by this for each SIZE of the plain fit"),
            ("SIZE", number(spread.unit), f"SD of {parts.y}"),
            ("TYPICAL", number(spread.centre * spread.unit), "plain fitted value of a row of average weight"),
        ]
    return [
        ("SPREAD", number(spread.power), "the errors' SD goes with this power of the plain fit's value; estimated"),
        ("LEAST", number(spread.unit), "plain fitted values below this count as this"),
        ("TYPICAL", number(math.exp(spread.centre)), "plain fitted value of a row of average weight"),
    ]


def root_function(parts: Parts) -> list[list[str]]:
    """root(): the square root of a row's weight, from the fitted value of plain least squares."""
    spread = parts.est.spread
    if spread is None:
        return []
    source = "(np.maximum(value, LEAST) / TYPICAL) ** -SPREAD"
    if not spread.positive:
        source = "np.exp(-SPREAD * (value - TYPICAL) / SIZE)"
    text = "Root of the weight of a row with this value of the plain fit: its errors count by their inverse SD."
    return [["def root(value):", *docstring(text), f"    return {source}"]]


def weighted_fit() -> list[str]:
    """plain and fit."""
    return [
        "plain = smf.ols(MODEL, rows).fit()  # its fitted values say how errors spread",
        "fit = smf.wls(MODEL, rows, weights=root(plain.fittedvalues) ** 2).fit()",
    ]


def root_of(design: str) -> str:
    """Source of the roots of the weights of further rows."""
    return f"root({design} @ plain.params.to_numpy())"
