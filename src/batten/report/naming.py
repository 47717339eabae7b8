"""Remedies and columns in words of a length that fits."""

from __future__ import annotations

from batten.families import parse
from batten.frame.problem import Problem
from batten.report.lettering import fitted, plain, shortened, width_of
from batten.report.style import TEXT

__all__ = ["brief", "remedy_in", "remedy_words"]

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
