"""Tables of one fit's answers: the place where effects meet pandas."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import pandas as pd

from batten.effects.checks import Check
from batten.effects.groups import GroupEffect
from batten.effects.lookup import LookupRow
from batten.effects.partial import Partial
from batten.effects.percents import Percent
from batten.effects.slopes import SlopeAt
from batten.effects.summary import Entry
from batten.effects.value import Effect
from batten.frame.problem import Problem

__all__ = [
    "check_table", "effect_table", "group_table", "lookup_table", "partial_table", "percent_table", "slope_table",
    "summary_table",
]  # fmt: skip


def effect_table(effects: Mapping[str, Effect], *, name: str) -> pd.DataFrame:
    """One row per effect: estimate, low, high, note."""
    return pd.DataFrame(
        [(e.estimate, e.low, e.high, e.note) for e in effects.values()],
        columns=["estimate", "low", "high", "note"],
        index=pd.Index(list(effects), name=name),
    )


def slope_table(slopes: tuple[SlopeAt, ...], *, focus: str) -> pd.DataFrame:
    """One row per place, indexed by x; the note tells the side where x is a break."""
    rows = []
    for at in slopes:
        side = f"{at.side} of the break" if at.side else ""
        note = "; ".join(part for part in (side, at.slope.note) if part)
        rows.append((at.slope.estimate, at.slope.low, at.slope.high, note))
    index = pd.Index([at.x for at in slopes], name=focus)
    return pd.DataFrame(rows, columns=["estimate", "low", "high", "note"], index=index)


def group_table(effects: tuple[GroupEffect, ...]) -> pd.DataFrame:
    """One row per group: difference, ratio, against_first, ratio_against_first, each with _low and _high; note."""
    rows = {}
    for e in effects:
        row: dict[str, Any] = {}
        parts = {
            "difference": e.span.difference, "ratio": e.span.ratio, "against_first": e.difference,
            "ratio_against_first": e.ratio,
        }  # fmt: skip
        for name, effect in parts.items():
            row[name], row[f"{name}_low"], row[f"{name}_high"] = effect.estimate, effect.low, effect.high
        rows[e.label] = {**row, "note": e.span.note}
    table = pd.DataFrame.from_dict(rows, orient="index")
    table.index.name = "group"
    return table


def lookup_table(rows: tuple[LookupRow, ...], *, focus: str) -> pd.DataFrame:
    """mean, median, low, high, note by x."""
    return pd.DataFrame(
        [(r.mean, r.median, r.low, r.high, r.note) for r in rows],
        columns=["mean", "median", "low", "high", "note"],
        index=pd.Index([r.x for r in rows], name=focus),
    )


def check_table(checks: tuple[Check, ...], labels: pd.Index) -> pd.DataFrame:
    """One row per check; a row's position in a reading becomes the label the user gave it.

    about, asked, test, statistic, df, df_rest, p (missing where there is no test), size, unit, reading.
    """
    rows = []
    for c in checks:
        kind, statistic, df = ("", math.nan, ()) if c.test is None else (c.test.kind, c.test.statistic, c.test.df)
        first, second = (*map(float, df), math.nan, math.nan)[:2]
        reading = c.reading if c.row is None else c.reading.replace("{row}", str(labels[c.row]))
        rows.append((c.about, c.asked, kind, statistic, first, second, c.p, c.size, c.unit, reading))
    columns = ["about", "asked", "test", "statistic", "df", "df_rest", "p", "size", "unit", "reading"]
    return pd.DataFrame(rows, columns=columns, index=pd.Index([c.name for c in checks], name="check"))


def summary_table(entries: tuple[Entry, ...]) -> pd.DataFrame:
    """value, unit, note by name."""
    index = pd.Index([e.name for e in entries], name="number")
    values = pd.Series([e.value for e in entries], index=index, dtype=object)  # whole numbers stay whole
    told = [(e.unit, e.note) for e in entries]
    return pd.DataFrame(told, columns=["unit", "note"], index=index).assign(value=values)[["value", "unit", "note"]]


def partial_table(found: Partial, problem: Problem) -> pd.DataFrame:
    """The focal predictor, value, curve and note, by the frame's own labels."""
    bent = ", ".join(problem.base_names[j] for j in found.bent)
    note = f"{bent} bends along {problem.focus}, and that is taken off too (CERES)" if bent else ""
    columns = {problem.focus: problem.rows.x, "value": found.value, "curve": found.curve, "note": note}
    return pd.DataFrame(columns, index=problem.index)


def percent_table(found: tuple[Percent, ...]) -> pd.DataFrame:
    """percent, low, high, kennedy, unbiased, unbiased_error, means, note by term."""
    names = ["percent", "low", "high", "kennedy", "unbiased", "unbiased_error", "means", "note"]
    index = pd.Index([p.label for p in found], name="term")
    return pd.DataFrame([[getattr(p, name) for name in names] for p in found], columns=names, index=index)
