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

    All but a placeholder is made when the tab is first opened: some forty models, which the page would have to make as
    well. shut: takes the tab away, for those that the picker opened.
    """

    def __init__(self, desk: Desk, key: str, span: SpanFields, shut: Callable[[str], None]) -> None:
        self.key, self._desk, self._span, self._shut = key, desk, span, WeakMethod(shut)
        self._may_be_shut = False
        self.heading = sheet()
        self.box = widgets.VBox([self.heading])

    @cached_property
    def pages(self) -> Pages:
        """The panels."""
        desk, key = self._desk, self.key
        effect, code = EffectOf(key, self._span), CodeOf(key, cell_id=desk.cell_id)
        made = Pages(desk, (FitOf(key), LeftOf(key), effect, TryValue(desk, key), code, HowOf(key)))
        head = widgets.HBox([self.heading, self.shut_button])
        head.add_class("batten-head")
        self.box.children = [head, self.cautions, made.box]
        return made

    @cached_property
    def cautions(self) -> widgets.HTML:
        """What must not be overlooked about this remedy."""
        return sheet("")

    @cached_property
    def shut_button(self) -> widgets.Button:
        """Takes the tab away."""
        made = widgets.Button(description="Close this tab", layout=widgets.Layout(width="auto"))
        made.layout.display = "" if self._may_be_shut else "none"
        made.on_click(weakly(self._pressed))
        return made

    def may_be_shut(self, may: bool) -> None:
        """Whether the tab has its button."""
        self._may_be_shut = may
        if "shut_button" in vars(self):
            self.shut_button.layout.display = "" if may else "none"

    def draw(self, exam: Examination) -> None:
        self.heading.value = self._title(exam)
        self.cautions.value = "".join(paragraph(words, "caution") for words in cautions(exam, self.key))
        self.pages.draw(exam)

    def _pressed(self, _button: object) -> None:
        shut = self._shut()
        if shut is not None:
            shut(self.key)

    def _title(self, exam: Examination) -> str:
        role = next((role for role, key in shortlist(exam.comparison) if key == self.key), "")
        name = plain(exam[self.key].words)
        other = ", ".join(word for word in role.split(", ") if word != name)
        tail = f' <span class="batten-quiet">{esc(other)}</span>' if other else ""
        return f"<h3>{esc(name)} <code>{esc(self.key)}</code>{tail}</h3>"
