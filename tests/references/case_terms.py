"""Terms in the focal predictor: what a factor of a published formula is, and which of batten's shapes holds them."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from case_tables import NotDelivered

__all__ = ["Term", "focal_term", "shape_of", "unwrapped", "usual_terms"]


@dataclass(frozen=True)
class Term:
    """One term in the focal predictor. kind: power (value: exponent), log (value: length of its unit in natural logs),
    fixed (value: exponent), hinge (value: place), groups, band (value: its number from below)."""

    kind: str
    value: float = 1.0


def unwrapped(factor: str) -> str:
    """A factor without blanks, np. and I()."""
    return re.sub(r"^I\((.*)\)$", r"\1", factor.replace(" ", "").replace("np.", ""))


def focal_term(factor: str, x: str, frame: pd.DataFrame) -> Term | None:
    """What a factor is in the column x, or None."""
    text, name = unwrapped(factor), re.escape(x)
    if text in (x, f"C({x})", f"1/{x}"):
        return {x: Term("power", 1), f"C({x})": Term("groups"), f"1/{x}": Term("fixed", -1)}[text]
    power = re.fullmatch(rf"{name}\*\*\(?(-?[\d.]+)\)?", text)
    if power:
        exponent = float(power[1])
        return Term("power" if exponent in range(2, 21) else "fixed", exponent)
    function = re.fullmatch(rf"(log|log10|log2|sqrt)\({name}\)", text)
    if function:
        units = {"log": 1.0, "log10": math.log(10), "log2": math.log(2)}
        return Term("log", units[function[1]]) if function[1] in units else Term("fixed", 0.5)
    hinge = re.fullmatch(rf"maximum\((?:{name}-([\d.]+),0|0,{name}-([\d.]+))\)", text)
    if hinge:
        return Term("hinge", float(hinge[1] or hinge[2]))
    return Term("power", 2) if _holds_square(frame, factor, x) else None


def _holds_square(frame: pd.DataFrame, column: str, x: str) -> bool:
    if column not in frame or not pd.api.types.is_numeric_dtype(frame[column]):
        return False
    known = frame[[column, x]].dropna()
    values = known[x].to_numpy(float)
    return bool(np.ptp(values) > 1 and np.array_equal(known[column].to_numpy(float), values**2))


def shape_of(terms: Mapping[str, Term], x: pd.Series) -> str:
    """Right-hand side of the key that holds these terms of the column x."""
    values: dict[str, list[float]] = {}
    for term in terms.values():
        values.setdefault(term.kind, []).append(term.value)
    kinds = set(values)
    powers, places = sorted(values.get("power", [])), sorted(values.get("hinge", []))
    if kinds == {"power"} and powers == list(range(1, len(powers) + 1)):
        return "x" if len(powers) == 1 else f"poly{len(powers)} x"
    if kinds == {"power"} and len(powers) == 1:
        return f"x^{powers[0]:g}"
    if kinds == {"hinge", "power"} and powers == [1] and len(places) <= 2:
        return f"hinge{'' if len(places) == 1 else 2}({', '.join(map(repr, places))}) x"
    if len(terms) == 1 and kinds == {"fixed"}:
        exponent = values["fixed"][0]
        return {0.5: "sqrt x", -1.0: "1/x"}.get(exponent, f"x^{exponent!r}")
    if len(terms) == 1 and kinds == {"groups"}:
        return f"bins({', '.join(repr(float(v)) for v in np.unique(x.dropna())[1:])}) x"
    if len(terms) == 1 and kinds == {"log"}:
        return "log x"
    raise NotDelivered(f"no shape of batten's holds the terms {', '.join(terms)}")


def usual_terms(x: str, right: str) -> dict[str, Term]:
    """Names under which the terms of a shape are published."""
    powers = re.fullmatch(r"poly(\d+) x", right)
    if powers:
        more = range(2, int(powers[1]) + 1)
        return {x: Term("power", 1), "x2": Term("power", 2), **{f"I({x}**{k})": Term("power", k) for k in more}}
    reciprocal, root = Term("fixed", -1), Term("fixed", 0.5)
    return {
        "x": {x: Term("power", 1)},
        "log x": {f"log({x})": Term("log"), x: Term("log")},
        "1/x": {f"1/{x}": reciprocal, f"I(1/{x})": reciprocal},
        "sqrt x": {f"sqrt({x})": root},
    }.get(right, {})
