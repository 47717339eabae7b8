"""The comparison as tables: the few of the first screen, all that were tried, and those that cannot be used."""

from __future__ import annotations

from typing import TYPE_CHECKING

from batten.compare.grid import STRAIGHT
from batten.compare.shortlist import shortlist
from batten.effects.numbers import counted
from batten.frame.problem import Problem
from batten.report import numerals
from batten.report.entries import Entry, Refused, entries, lowest, refused
from batten.report.grid import Column, Grid, as_html, as_text
from batten.report.naming import brief, span_in

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = [
    "full_grid", "full_table", "refused_grid", "refused_table", "shortlist_grid", "shortlist_table", "shortlist_text",
]  # fmt: skip

REMEDY = "remedy"
#: letters of a column's name inside a cell
NAME = 40


def shortlist_table(exam: Examination) -> str:
    """At most five remedies as HTML: line, choice, runner-up, best readable, best flexible."""
    return as_html(shortlist_grid(exam))


def shortlist_text(exam: Examination, *, width: int = 100) -> str:
    """The same for a terminal, remedies by the keys that can be typed."""
    grid = shortlist_grid(exam)
    kept = [j for j, column in enumerate(grid.columns) if column.head != REMEDY]
    rows = tuple(tuple(row[j] for j in kept) for row in grid.rows)
    return as_text(Grid(tuple(grid.columns[j] for j in kept), rows, grid.marks), width=width)


def full_table(exam: Examination) -> str:
    """Every remedy tried, lowest held-out error first, as HTML."""
    return as_html(full_grid(exam))


def refused_table(exam: Examination) -> str:
    """What cannot be used on these rows, why, and what to use instead, as HTML."""
    return as_html(refused_grid(exam))


def shortlist_grid(exam: Examination) -> Grid:
    """The rows of the first screen."""
    roles, best = shortlist(exam.comparison), lowest(exam)
    rows = entries(exam, [key for _, key in roles])
    columns = (Column("role"), *_columns(exam))
    cells = [(role, *_cells(exam, rows[key], best)) for role, key in roles]
    return Grid(columns, tuple(cells), tuple(_mark(key, exam) for _, key in roles))


def full_grid(exam: Examination) -> Grid:
    """All rows, with two more columns."""
    rows = entries(exam)
    more = Column("held-out rows within 10%", "number"), Column("constants", "number"), Column("note", under=True)
    best = lowest(exam)
    cells = [
        (*_cells(exam, e, best), numerals.percent(e.within_10), counted(e.parameters), e.note) for e in rows.values()
    ]
    return Grid((*_columns(exam), *more), tuple(cells), tuple(_mark(key, exam) for key in rows))


def refused_grid(exam: Examination) -> Grid:
    """Refused remedies in plain words."""
    problem = exam.problem
    heads = ("what is wrong", "what was seen", "instead")
    columns = Column(REMEDY, "words"), Column("key", "key", under=True), *(Column(head, "words") for head in heads)
    cells = [_refusal(problem, r) for r in refused(exam)]
    return Grid(columns, tuple(cells), ("",) * len(cells))


def _refusal(problem: Problem, r: Refused) -> tuple[str, ...]:
    return brief(problem, r.key, NAME), r.key, r.wrong, r.seen, r.instead


def _columns(exam: Examination) -> tuple[Column, ...]:
    """The columns that every table of remedies has."""
    problem = exam.problem
    unit = problem.unit(problem.response)
    mean = f"{unit} (mean)" if unit else "(mean)"
    span = span_in(problem, *exam.question.span)
    joint = ", " if unit else " "
    return (
        Column(REMEDY, "words"),
        Column("key", "key", under=True),
        Column(f"held-out error{joint}{mean}", "number"),
        Column(f"behind the lowest{joint}{unit}".rstrip(), "number"),
        Column(f"difference {span}{joint}{mean}", "number"),
        Column("left-over bend"),
    )


def _cells(exam: Examination, entry: Entry, best: float) -> tuple[str, ...]:
    tied = " (tied)" if entry.tied else ""
    gap = "lowest" if entry.gap == 0 else f"{numerals.behind(entry.gap, best)}{tied}"
    return (
        brief(exam.problem, entry.key, NAME), entry.key, numerals.error(entry.rmse, best), gap,
        entry.difference_words() if entry.defined else "no number", entry.leftover,
    )  # fmt: skip


def _mark(key: str, exam: Examination) -> str:
    return "choice" if key == exam.choice.key else "line" if key == STRAIGHT else ""
