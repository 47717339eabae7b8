"""A field that opens any remedy as its own tab: one of those tried, or a key typed in."""

from __future__ import annotations

from collections.abc import Callable
from weakref import WeakMethod

import ipywidgets as widgets

from batten.errors.widget import no_remedy_named
from batten.exam.examination import Examination
from batten.families import parse
from batten.notebook.callbacks import Message, told_in, weakly
from batten.notebook.panels.desk import Desk
from batten.notebook.panels.fields import labelled
from batten.report.naming import remedy_words

__all__ = ["Picker"]

#: between a key and its words in the list
GAP = "  –  "


class Picker:
    """ "Open another remedy [ ]". `show(key)` is called for a remedy that can be used on these rows."""

    def __init__(self, desk: Desk, show: Callable[[str], None]) -> None:
        self._desk, self._show = desk, WeakMethod(show)
        self.message = Message()
        self.field = widgets.Combobox(placeholder="choose, or type a key such as y ~ poly4 x", continuous_update=False)
        self.field.add_class("batten-picker")
        self.button = widgets.Button(description="Open", layout=widgets.Layout(width="auto"))
        self.field.observe(weakly(self._typed), "value")
        self.button.on_click(weakly(self._pressed))
        row = widgets.HBox([labelled("Open another remedy", self.field), self.button])
        row.add_class("batten-field")
        self.box = widgets.VBox([row, self.message.box])

    def draw(self, exam: Examination, *, shown: tuple[str, ...]) -> None:
        """Offer every remedy that has no tab yet, lowest held-out error first."""
        self.field.options = [f"{key}{GAP}{remedy_words(exam.problem, key)}" for key in exam if key not in shown]

    def _typed(self, _change: object) -> None:
        if self.field.value.strip():
            self._pressed()

    def _pressed(self, _button: object = None) -> None:
        with self._desk.lock, told_in(self.message):
            if not self.field.value.strip():
                raise no_remedy_named()
            self._open(parse(self.field.value.partition(GAP)[0]).key)
            self.field.value = ""

    def _open(self, key: str) -> None:
        if key not in self._desk.exam:
            self._desk.change(lambda exam: _with(exam, key))
        show = self._show()
        if show is not None:
            show(key)


def _with(exam: Examination, key: str) -> Examination:
    """The examination with one more remedy; raises its refusal where it cannot be used."""
    more = exam.with_remedy(key)
    more[key]
    return more
