"""The panels about one remedy: fit, what is left, effect, code, how this was computed."""

from __future__ import annotations

import ipywidgets as widgets

from batten.compare.grid import STRAIGHT
from batten.exam.examination import Examination
from batten.exam.fit import Fit
from batten.notebook.code_panel import CodePanel
from batten.notebook.open_widgets import close_all
from batten.notebook.panels.desk import bullets, figure, sheet, waiting
from batten.notebook.panels.span import SpanFields
from batten.report.cautions import CARE, SUBTITLE, choosing_note
from batten.report.figures import fit_figure, left_figure
from batten.report.fit_tables import checks_table, coefficients_table, constants_table, effect_table
from batten.report.how import how_computed
from batten.report.markup import paragraph
from batten.report.words import days_words, span_words

__all__ = ["CodeOf", "EffectOf", "FitOf", "HowOf", "LeftOf", "span_block"]


class FitOf:
    """The rows, the curve and its band; the straight line beside it."""

    name = "fit"

    def __init__(self, key: str) -> None:
        self._key, self.box = key, sheet()

    def draw(self, exam: Examination) -> None:
        fit = exam[self._key]
        drawn = fit_figure(fit, _line(exam), choice=self._key == exam.choice.key)
        self.box.value = figure(drawn) + span_block(exam, self._key)


class LeftOf:
    """Residuals along the predictor, and what can be checked."""

    name = "what is left"

    def __init__(self, key: str) -> None:
        self._key, self.box = key, sheet()

    def draw(self, exam: Examination) -> None:
        fit = exam[self._key]
        drawn = left_figure(fit, _line(exam), choice=self._key == exam.choice.key)
        self.box.value = figure(drawn) + checks_table(fit, named=False)


class EffectOf:
    """The standing question, answered in sentences and in a small table."""

    name = "effect"

    def __init__(self, key: str, span: SpanFields) -> None:
        self._key, self._said = key, sheet()
        self.box = widgets.VBox([span.box, self._said])

    def draw(self, exam: Examination) -> None:
        fit = exam[self._key]
        effects = [fit.span_effect(of=of) for of in ("mean", "median")]
        notes = dict.fromkeys(effect.note for effect in effects if effect.note)
        numbers = "\n".join([
            effect_table(fit, effects),
            *(paragraph(f"{note[:1].upper()}{note[1:]}.") for note in notes),
            paragraph(f"In brackets: {exam.question.level:.0%} intervals. {choosing_note(exam)}", "quiet"),
        ])  # fmt: skip
        first, days, more = paragraph(SUBTITLE, "quiet"), days_words(exam), waiting("Reading the curve …")
        # where the curve turns can take a moment: the numbers need not wait for it
        self._said.value = f"{first}\n{span_block(exam, self._key)}\n{more}\n{numbers}"
        self._said.value = f"{first}\n{bullets([*fit.sentences(), days])}\n{numbers}"


class CodeOf:
    """A script that does the same, to be copied or put into a new cell."""

    name = "code"

    def __init__(self, key: str, *, cell_id: str | None) -> None:
        self._key, self._cell_id = key, cell_id
        self._code = ""
        self.box = widgets.VBox([sheet()])

    def draw(self, exam: Examination) -> None:
        code = exam[self._key].code()
        if code == self._code:
            return  # the panel knows whether it was put into a cell already
        earlier = self.box.children
        panel = CodePanel(code, magic=f"%batten code {self._key}", cell_id=self._cell_id)
        self._code, self.box.children = code, [panel.box]
        for box in earlier:
            close_all(box)


class HowOf:
    """Methods by their names, coefficients and learned constants."""

    name = "how this was computed"

    def __init__(self, key: str | None = None) -> None:
        self._key, self.box = key, sheet()

    def draw(self, exam: Examination) -> None:
        told = bullets(how_computed(exam, self._key))
        if self._key is not None:
            fit = exam[self._key]
            told += coefficients_table(fit) + constants_table(fit) + checks_table(fit, named=True)
        self.box.value = told + paragraph(CARE, "quiet")


def span_block(exam: Examination, key: str | None = None) -> str:
    """The answer to the standing question in one sentence."""
    days = days_words(exam)
    note = paragraph(days, "quiet") if days else ""
    return f'<div class="batten-span">{paragraph(span_words(exam, key))}</div>{note}'


def _line(exam: Examination) -> Fit | None:
    return exam.get(STRAIGHT)
