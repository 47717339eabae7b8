"""The tab that compares: the first screen, and what lies one click behind it."""

from __future__ import annotations

import ipywidgets as widgets

from batten.exam.examination import Examination
from batten.notebook.callbacks import told_in, weakly
from batten.notebook.panels.desk import Desk, bullets, figure, sheet, waiting
from batten.notebook.panels.fields import labelled
from batten.notebook.panels.pages import Pages
from batten.notebook.panels.remedy_panels import HowOf, span_block
from batten.notebook.panels.span import SpanFields
from batten.report.cautions import SUBTITLE, cautions, choosing_note
from batten.report.figures import ladder_figure, line_against_choice, spans_figure
from batten.report.markup import details, paragraph
from batten.report.tables import full_table, refused_table, shortlist_table
from batten.report.words import choice_words, otherwise, refused_words

__all__ = ["Compare"]

AIMS = {
    "effect": "the simplest of those tied whose left-over bend does not matter",
    "prediction": "the simplest of those tied with the lowest held-out error",
}


class Compare:
    """A tab: first look, ladder, spans, all that were tried, what cannot be used, how."""

    def __init__(self, desk: Desk, span: SpanFields) -> None:
        self.first = FirstLook(desk, span)
        self.pages = Pages(desk, (self.first, Ladder(), Spans(), Tried(), Refused(), HowOf()))
        self.box = self.pages.box

    def draw(self, exam: Examination) -> None:
        self.pages.draw(exam)


class FirstLook:
    """The line against the choice, the span in one sentence, at most five remedies, and the aim."""

    name = "first look"

    def __init__(self, desk: Desk, span: SpanFields) -> None:
        self._desk = desk
        self.figure = ""  # as HTML
        self.picture, self.table, self.reasons = sheet(), sheet(""), sheet("")
        self.aim = widgets.ToggleButtons(options=list(AIMS), value=desk.exam.question.aim, tooltips=list(AIMS.values()))
        self.aim.observe(weakly(self._chosen), "value")
        row = widgets.HBox([span.box, labelled("Choose for", self.aim)])
        row.add_class("batten-row")
        self.box = widgets.VBox([self.picture, row, self.table, self.reasons])

    def draw(self, exam: Examination) -> None:
        self.figure = figure(line_against_choice(exam))
        self.picture.value = self.figure + span_block(exam)
        mind = paragraph(f"{SUBTITLE} {choosing_note(exam)}", "quiet")
        self.table.value = f'<div class="batten-short">{shortlist_table(exam)}</div>{mind}'
        why = details(f"Why {choice_words(exam)}", bullets([*exam.choice.reasons, otherwise(exam)]))
        self.reasons.value = "".join(paragraph(words, "caution") for words in cautions(exam)) + why

    def _chosen(self, _change: object) -> None:
        aim = self.aim.value
        with self._desk.lock, told_in(self._desk.message):
            if aim != self._desk.exam.question.aim:
                self._desk.change(lambda exam: exam.with_aim(aim))


class Ladder:
    """The map of scales by shapes."""

    name = "map of the ladder"

    def __init__(self) -> None:
        self.box = sheet()

    def draw(self, exam: Examination) -> None:
        self.box.value = figure(ladder_figure(exam))


class Spans:
    """The standing question, put to every remedy."""

    name = "the span under each"

    def __init__(self) -> None:
        self.box = sheet()

    def draw(self, exam: Examination) -> None:
        self.box.value = waiting(f"Asking {len(exam)} remedies …")
        self.box.value = paragraph(SUBTITLE, "quiet") + figure(spans_figure(exam))


class Tried:
    """The whole table."""

    name = "all tried"

    def __init__(self) -> None:
        self.box = sheet()

    def draw(self, exam: Examination) -> None:
        self.box.value = waiting(f"Asking {len(exam)} remedies …")
        head = f"All {len(exam)} tried, lowest held-out error first. The lowest of so many flatters."
        self.box.value = f'{paragraph(head)}<div class="batten-tall">{full_table(exam)}</div>'


class Refused:
    """What cannot be used, and what to use instead."""

    name = "not usable"

    def __init__(self) -> None:
        self.box = sheet()

    def draw(self, exam: Examination) -> None:
        words = refused_words(exam)
        self.box.value = paragraph(words) + refused_table(exam) if words else paragraph("Every remedy could be used.")
