"""The examination as plain text, for terminals and for places that show nothing else."""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING

from batten.report.cautions import SUBTITLE, cautions, choosing_note, left_out_words
from batten.report.lettering import plain
from batten.report.tables import shortlist_text
from batten.report.words import choice_words, headline, otherwise, refused_words, span_words, trial_words

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["headline", "text_summary"]


def text_summary(exam: Examination, *, width: int = 100) -> str:
    """Verdict, choice, the first rows of the table, the span, the reasons, and what to mind."""
    rows = f"{exam.problem.rows.count:,} rows. {left_out_words(exam.problem)}".strip()
    parts = [
        _wrapped(headline(exam), width),
        _wrapped(f"{trial_words(exam)} {rows}", width),
        shortlist_text(exam, width=width),
        _wrapped(span_words(exam), width) + "\n" + _wrapped(f"{SUBTITLE} {choosing_note(exam)}", width),
        _listed(f"Why {choice_words(exam)}", [*exam.choice.reasons, otherwise(exam)], width),
        _listed("To mind:", list(cautions(exam)), width),
        _wrapped(_further(exam), width),
    ]
    return "\n\n".join(part for part in parts if part) + "\n"


def _further(exam: Examination) -> str:
    """Where the rest is."""
    refused = refused_words(exam)
    why = f"{refused[:-1]}: exam.refused says why, and what to use instead. " if refused else ""
    return f"{why}exam.table() shows all {len(exam)} that were tried; exam.code() writes the chosen one as a script."


def _wrapped(text: str, width: int, *, first: str = "", then: str = "") -> str:
    return "\n".join(textwrap.wrap(plain(text), width, initial_indent=first, subsequent_indent=then))


def _listed(title: str, items: list[str], width: int) -> str:
    if not items:
        return ""
    lines = [_wrapped(item, width, first="- ", then="  ") for item in items if item]
    return "\n".join([_wrapped(title, width), *lines])
