"""Remedies and columns in words of a length that fits."""

from __future__ import annotations

from batten.families import parse
from batten.frame.problem import Problem
from batten.report.lettering import fitted, plain, shortened
from batten.report.style import TEXT

__all__ = ["brief", "remedy_in", "remedy_words"]


def brief(problem: Problem, key: str, limit: int) -> str:
    """A remedy in words, each column's name in at most `limit` characters: what tells remedies apart stays."""
    return parse(key).words(shortened(problem.response, limit), shortened(problem.focus, limit))


def remedy_words(problem: Problem, key: str) -> str:
    """A remedy in words, on one line."""
    return parse(key).words(plain(problem.response), plain(problem.focus))


def remedy_in(problem: Problem, key: str, inches: float, *, size: float = TEXT, bold: bool = False) -> str:
    """A remedy in words that are at most `inches` wide."""
    return fitted(lambda limit: brief(problem, key, limit), inches, size=size, bold=bold)
