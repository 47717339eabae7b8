"""Remedies and columns in words of a length that fits."""

from __future__ import annotations

from batten.effects.numbers import place
from batten.families import parse
from batten.frame.problem import Problem
from batten.report import numerals
from batten.report.days import counted_from, day_of
from batten.report.lettering import fitted, plain, shortened, width_of
from batten.report.style import TEXT

__all__ = ["brief", "place_in", "remedy_in", "remedy_words", "span_in"]

#: letters of a name below which it tells nothing
LEAST = 8


def brief(problem: Problem, key: str, limit: int) -> str:
    """A remedy in words, each column's name in at most `limit` characters: what tells remedies apart stays."""
    return parse(key).words(shortened(problem.response, limit), shortened(problem.focus, limit))


def remedy_words(problem: Problem, key: str) -> str:
    """A remedy in words, on one line."""
    return parse(key).words(plain(problem.response), plain(problem.focus))


def remedy_in(
    problem: Problem, key: str, inches: float, *, size: float = TEXT, bold: bool = False, role: str = ""
) -> str:
    """A remedy in words that are at most `inches` wide, behind its role; its key where names would be mere stumps."""
    if width_of(f"{role}{brief(problem, key, LEAST)}", size=size, bold=bold) > inches:
        return fitted(f"{role}{key}", inches, size=size, bold=bold)
    return fitted(lambda limit: f"{role}{brief(problem, key, limit)}", inches, size=size, bold=bold)


def place_in(problem: Problem, x: float, unit: str = "") -> str:
    """A value of the focal predictor as typed, a date where it holds dates."""
    start = counted_from(problem)
    return place(x, unit) if start is None else day_of(start, x)


def span_in(problem: Problem, a: float, b: float, limit: int = 40) -> str:
    """Two values of the focal predictor: "10 to 25 kg", "2026-03-01 to 2026-05-31"; its unit in `limit` letters."""
    if counted_from(problem) is None:
        return numerals.span_words(a, b, shortened(problem.unit(problem.focus), limit))
    return f"{place_in(problem, a)} to {place_in(problem, b)}"
