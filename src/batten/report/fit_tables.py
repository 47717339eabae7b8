"""Small tables about one fit, as HTML: numbers straight from its public tables, in the digits of the sentences."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from batten.effects.contrast import SpanEffect
from batten.effects.numbers import show, show_interval
from batten.report.days import counted_from
from batten.report.grid import Column, Grid, as_html
from batten.report.lettering import plain, shortened
from batten.report.markup import details, paragraph
from batten.report.naming import place_in, span_in
from batten.report.numerals import difference

if TYPE_CHECKING:
    from batten.exam.fit import Fit

__all__ = ["checks_table", "coefficients_table", "constants_table", "effect_table", "lookup_table", "predictions_table"]

#: letters of a column's name that a table's head keeps
NAME = 50

#: the check that is always in view, and the p value from which others are not
BEND, FOUND = "left-over bend", 0.05
#: the name of a method, in brackets at the end of a question
_METHOD = re.compile(r" \([^()]*\)(?=\?$)")


def effect_table(fit: Fit, effects: Sequence[SpanEffect]) -> str:
    """The span's effects side by side, of the mean and of the median."""
    problem = fit.problem
    y_unit, x_unit = problem.unit(problem.response), problem.unit(problem.focus)
    first = effects[0]
    ends = span_in(problem, first.a, first.b)
    y, x = shortened(problem.response, NAME), shortened(problem.focus, NAME)
    per = f"{y_unit or y} per {'day' if counted_from(problem) else x_unit or f'unit of {x}'}"
    heads = [Column(f"{x} {ends}"), *(Column(f"{e.of} of {y}") for e in effects)]
    rows = [
        (_with_unit("difference", y_unit), *(difference(*_ends(e.difference)) for e in effects)),
        ("ratio", *(_ratio(e) for e in effects)),
        (f"slope over the span, {per}", *(difference(*_ends(e.span_slope)) for e in effects)),
    ]
    return _html(heads, rows)


def predictions_table(fit: Fit, mean: pd.DataFrame, median: pd.DataFrame, new: pd.DataFrame) -> str:
    """One row's mean and median, and where a new row with the same values is expected."""
    problem, level = fit.problem, f"{fit.question.level:.0%}"
    unit = problem.unit(problem.response)
    heads = [Column(_with_unit(plain(problem.response), unit)), Column("value"), Column(f"{level} interval")]
    rows = [("mean", *_value_and_interval(mean)), ("median", *_value_and_interval(median))]
    low, high = float(new["low"].iloc[0]), float(new["high"].iloc[0])
    rows.append(("one new row like this", "", _interval(low, high)))
    return _html(heads, rows)


def lookup_table(fit: Fit, by: str | None = None) -> str:
    """Mean, median and where a new row is expected at round values of the focal predictor, by group if asked."""
    problem, table = fit.problem, fit.lookup(by=by)
    names = ["mean", "median", "low", "high"]
    values = table[names].to_numpy(float)
    middle = float(np.nanmedian(np.abs(values))) if np.isfinite(values).any() else 0.0
    groups = [Column(plain(by))] if by else []
    focus = _with_unit(plain(problem.focus), "" if counted_from(problem) else problem.unit(problem.focus))
    heads = [*groups, Column(focus, "number")]
    heads += [Column(_with_unit(name, problem.unit(problem.response)), "number") for name in names]
    rows = []
    for place, row in zip(table.index, values, strict=True):
        group, x = place if by else ("", place)
        # a tenth of the middle value sets the digits of all
        numbers = (show(float(v), width=middle / 10) for v in row)
        rows.append((*([plain(group)] if by else []), place_in(problem, float(x)), *numbers))
    what = f"Low and high: where {fit.question.level:.0%} of new rows are expected, covariates as in the rows."
    return _html(heads, rows) + paragraph(what, "quiet")


def checks_table(fit: Fit, *, named: bool) -> str:
    """What was checked, and what was found. named: with the names of the tests, all of them in one table; else those
    that found nothing stand behind a click.
    """
    table = fit.checks(every=False)
    shown: list[tuple[str, ...]] = []
    quiet: list[tuple[str, ...]] = []
    for name, asked, reading, p in zip(table.index, table["asked"], table["reading"], table["p"], strict=True):
        nothing = not named and name != BEND and p >= FOUND
        asks = plain(asked) if named else _METHOD.sub("", plain(asked))
        (quiet if nothing else shown).append((plain(name), asks, plain(reading)))
    heads = [Column("check"), Column("asked"), Column("found")]
    more = f"{len(quiet)} more {'check' if len(quiet) == 1 else 'checks'} found no more than chance would give"
    return _html(heads, shown) + (details(more, _html(heads, quiet)) if quiet else "")


def coefficients_table(fit: Fit) -> str:
    """Coefficients on the fitting scale."""
    heads = [Column("coefficient, on the fitting scale")]
    heads += [Column(name, "number") for name in ("estimate", "standard error", "low", "high")]
    rows = []
    for name, values in zip(fit.coefficients.index, fit.coefficients.to_numpy(float), strict=True):
        # three digits of the standard error: these are for whoever carries them on
        width = float(values[1]) if math.isfinite(values[1]) and values[1] > 0 else None
        rows.append((plain(name), *(show(float(v), width=None if width is None else width / 10) for v in values)))
    return _html(heads, rows)


def constants_table(fit: Fit) -> str:
    """What was learned besides coefficients; "" for nothing."""
    table = fit.constants
    if not len(table):
        return ""
    heads = [Column("constant"), Column("estimate", "number"), Column("low", "number"), Column("high", "number"),
             Column("note")]  # fmt: skip
    rows = []
    for name, row in table.iterrows():
        low, high = float(row["low"]), float(row["high"])
        width = high - low if high > low else None
        numbers = (show(float(v), width=width) if math.isfinite(v) else "" for v in (row["estimate"], low, high))
        rows.append((plain(name), *numbers, plain(row["note"])))
    return _html(heads, rows)


def _html(heads: Sequence[Column], rows: Sequence[tuple[str, ...]]) -> str:
    return as_html(Grid(tuple(heads), tuple(rows), ("",) * len(rows)))


def _ends(effect: object) -> tuple[float, float, float]:
    return effect.estimate, effect.low, effect.high  # type: ignore[attr-defined]


def _ratio(effect: SpanEffect) -> str:
    """A ratio takes no sign."""
    return difference(*_ends(effect.ratio)).removeprefix("+")


def _value_and_interval(row: pd.DataFrame) -> tuple[str, str]:
    value, low, high = (float(row[name].iloc[0]) for name in ("estimate", "low", "high"))
    width = high - low if math.isfinite(high - low) else None
    return show(value, width=width), _interval(low, high)


def _interval(low: float, high: float) -> str:
    return show_interval(low, high) if math.isfinite(low) and math.isfinite(high) else "not defined"


def _with_unit(name: str, unit: str) -> str:
    return f"{name}, {plain(unit)}" if unit else name
