"""The tab of one remedy."""

from __future__ import annotations

from functools import cached_property

import ipywidgets as widgets

from batten.compare.shortlist import shortlist
from batten.exam.examination import Examination
from batten.notebook.panels.desk import Desk, sheet
from batten.notebook.panels.pages import Pages
from batten.notebook.panels.remedy_panels import CodeOf, EffectOf, FitOf, HowOf, LeftOf
from batten.notebook.panels.span import SpanFields
from batten.notebook.panels.try_value import TryValue
from batten.report.cautions import cautions
from batten.report.lettering import plain
from batten.report.markup import esc, paragraph

__all__ = ["RemedyTab"]


class RemedyTab:
    """Its name and cautions, and the panels fit, what is left, effect, try a value, code.

    The panels are made when the tab is first opened: some forty models, which the page would have to make as well.
    """

    def __init__(self, desk: Desk, key: str, span: SpanFields) -> None:
        self.key, self._desk, self._span = key, desk, span
        self.heading = sheet()
        self.box = widgets.VBox([self.heading])

    @cached_property
    def pages(self) -> Pages:
        """The panels."""
        desk, key = self._desk, self.key
        effect, code = EffectOf(key, self._span), CodeOf(key, cell_id=desk.cell_id)
        made = Pages(desk, (FitOf(key), LeftOf(key), effect, TryValue(desk, key), code, HowOf(key)))
        self.box.children = [self.heading, made.box]
        return made

    def draw(self, exam: Examination) -> None:
        self.heading.value = self._words(exam)
        self.pages.draw(exam)

    def _words(self, exam: Examination) -> str:
        role = next((role for role, key in shortlist(exam.comparison) if key == self.key), "")
        name = plain(exam[self.key].words)
        tail = f' <span class="batten-quiet">{esc(role)}</span>' if role not in ("", name) else ""
        head = f"<h3>{esc(name)} <code>{esc(self.key)}</code>{tail}</h3>"
        return head + "".join(paragraph(words, "caution") for words in cautions(exam, self.key))
