"""The tab of one remedy."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from weakref import WeakMethod

import ipywidgets as widgets

from batten.compare.shortlist import shortlist
from batten.exam.examination import Examination
from batten.notebook.callbacks import weakly
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

    def __init__(self, desk: Desk, key: str, span: SpanFields, shut: Callable[[str], None]) -> None:
        self.key, self._desk, self._span, self._shut = key, desk, span, WeakMethod(shut)
        self.heading, self.cautions = sheet(), sheet("")
        self.shut_button = widgets.Button(description="Close this tab", layout=widgets.Layout(width="auto"))
        self.shut_button.on_click(weakly(self._pressed))
        self._head = widgets.HBox([self.heading, self.shut_button])
        self._head.add_class("batten-head")
        self.box = widgets.VBox([self._head, self.cautions])

    def may_be_shut(self, may: bool) -> None:
        """Whether the tab has a button that takes it away: those that the picker opened do."""
        self.shut_button.layout.display = "" if may else "none"

    def _pressed(self, _button: object) -> None:
        shut = self._shut()
        if shut is not None:
            shut(self.key)

    @cached_property
    def pages(self) -> Pages:
        """The panels."""
        desk, key = self._desk, self.key
        effect, code = EffectOf(key, self._span), CodeOf(key, cell_id=desk.cell_id)
        made = Pages(desk, (FitOf(key), LeftOf(key), effect, TryValue(desk, key), code, HowOf(key)))
        self.box.children = [self._head, self.cautions, made.box]
        return made

    def draw(self, exam: Examination) -> None:
        self.heading.value = self._title(exam)
        self.cautions.value = "".join(paragraph(words, "caution") for words in cautions(exam, self.key))
        self.pages.draw(exam)

    def _title(self, exam: Examination) -> str:
        role = next((role for role, key in shortlist(exam.comparison) if key == self.key), "")
        name = plain(exam[self.key].words)
        other = ", ".join(word for word in role.split(", ") if word != name)
        tail = f' <span class="batten-quiet">{esc(other)}</span>' if other else ""
        return f"<h3>{esc(name)} <code>{esc(self.key)}</code>{tail}</h3>"
