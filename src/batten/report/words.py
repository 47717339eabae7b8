"""Sentences of the first screen, put together from results: headline, the span, why this remedy, other yardsticks."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from batten.compare.grid import STRAIGHT
from batten.effects.numbers import place, show
from batten.effects.sentences import span_sentence
from batten.report.days import counted_from, day_of
from batten.report.lettering import plain
from batten.report.naming import remedy_words

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = [
    "choice_words", "days_words", "headline", "otherwise", "refused_words", "span_words", "trial_words", "verdict",
]  # fmt: skip

_VERDICTS = {
    "straight enough": "The straight line is straight enough",
    "too small to matter": "The line bends, but too little to matter",
    "bends, and it matters": "The straight line bends, and it matters",
    "cannot tell with these rows": "These rows cannot tell whether a bend matters",
}


def verdict(exam: Examination) -> str:
    """The straight line's trial in one clause, with the size of its largest gap."""
    trial, problem = exam.straight, exam.problem
    words = _VERDICTS[trial.verdict]
    if math.isnan(trial.gap):  # nothing can bend
        return words
    gap = show(trial.gap, problem.unit(problem.response))
    return f"{words} (the line's mean is off by up to {gap})"


def trial_words(exam: Examination) -> str:
    """The trial in numbers, without the verdict that the headline gives already."""
    words = plain(exam.straight.words)
    opening, _, rest = words.partition(": ")
    return f"{rest[:1].upper()}{rest[1:]}" if rest and opening == _VERDICTS[exam.straight.verdict] else words


def headline(exam: Examination) -> str:
    """One line: the verdict on the straight line, and the choice."""
    key = exam.choice.key
    role = "Planned" if exam.question.planned == key else "Choice"
    keep = "keep the straight line" if key == STRAIGHT and role == "Choice" else remedy_words(exam.problem, key)
    return f"{verdict(exam)}. {role}: {keep}."


def choice_words(exam: Examination) -> str:
    """The choice with its key, and the runner-up."""
    problem, choice = exam.problem, exam.choice
    words = f"{remedy_words(problem, choice.key)} ({choice.key})"
    if choice.runner_up is None:
        return f"{words}."
    return f"{words}; runner-up: {remedy_words(problem, choice.runner_up)} ({choice.runner_up})."


def span_words(exam: Examination, key: str | None = None) -> str:
    """The standing question's answer by one remedy, the choice by default."""
    fit = exam[key or exam.choice.key]
    return plain(span_sentence(fit.span_effect(), fit.names))


def days_words(exam: Examination) -> str:
    """Which dates the span's days are, "" where the focal predictor holds none."""
    problem, (a, b) = exam.problem, exam.question.span
    start = counted_from(problem)
    if start is None:
        return ""
    return (
        f"{plain(problem.focus)} counts days from {day_of(start, 0)}: "
        f"{place(a)} is {day_of(start, a)}, {place(b)} is {day_of(start, b)}."
    )


def otherwise(exam: Examination) -> str:
    """Yardsticks that would choose differently, "" where all agree."""
    if not exam.choice.otherwise:
        return "Every other yardstick would choose the same."
    told = "; ".join(f"{yardstick}: {key}" for yardstick, key in exam.choice.otherwise)
    return f"Other yardsticks would choose otherwise. {told[:1].upper()}{told[1:]}."


def refused_words(exam: Examination) -> str:
    """How many remedies cannot be used, "" for none."""
    count = len(exam.comparison.refused)
    return f"{count} {'remedy' if count == 1 else 'remedies'} cannot be used on these rows." if count else ""
