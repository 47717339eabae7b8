"""What stands above the tabs: the verdict, the formula, and the rows with what was left out."""

from __future__ import annotations

from batten.exam.examination import Examination
from batten.frame.problem import Problem
from batten.notebook.panels.desk import bullets
from batten.report.lettering import plain, shortened
from batten.report.markup import details, esc, paragraph
from batten.report.words import headline, trial_words

__all__ = ["header"]

#: labels of left-out rows that are named for each reason
NAMED = 12


def header(exam: Examination) -> str:
    """HTML: one sentence of verdict and choice; formula; rows used, and why others were not."""
    problem = exam.problem
    said = details(_rows(problem), bullets(problem.announcements) + _why(problem) + paragraph(trial_words(exam)))
    return (
        f'<h2 class="batten-headline">{esc(headline(exam))}</h2>'
        f'<p class="batten-quiet"><code>{esc(plain(problem.formula))}</code> on '
        f"<code>{esc(plain(problem.frame_name))}</code></p>{said}"
    )


def _rows(problem: Problem) -> str:
    used, lost = problem.stored, len(problem.left_out)
    if not lost:
        return f"All {used:,} rows used; choices made"
    return f"{used:,} of {used + lost:,} rows used, {lost:,} left out; choices made"


def _why(problem: Problem) -> str:
    """Each reason with the labels of its rows."""
    told = []
    for why, rows in problem.left_out.groupby("why", sort=False):
        labels = [shortened(label, 30) for label in rows.index[:NAMED]]
        more = f" and {len(rows) - NAMED:,} more" if len(rows) > NAMED else ""
        told.append(f"{plain(why)}: row{'s' if len(rows) > 1 else ''} {', '.join(labels)}{more}")
    return paragraph("Rows left out, by the frame's index:") + bullets(told) if told else ""
