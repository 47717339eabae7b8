"""The live widget: a header, a tab that compares, a tab per remedy, and a field that opens any other remedy."""

from __future__ import annotations

import ipywidgets as widgets

from batten.compare.shortlist import shortlist
from batten.exam.examination import Examination
from batten.notebook.callbacks import told_in, weakly
from batten.notebook.insertion import KEYS_CLASS
from batten.notebook.look import style_sheet
from batten.notebook.open_widgets import close_all, register
from batten.notebook.panels.compare import Compare
from batten.notebook.panels.desk import Changed, Desk, sheet
from batten.notebook.panels.header import header
from batten.notebook.panels.picker import Picker
from batten.notebook.panels.remedy import RemedyTab
from batten.notebook.panels.span import SpanFields

__all__ = ["ExamBox", "ExamWidget", "widget_for"]

COMPARE = "compare"


def widget_for(exam: Examination, *, cell_id: str | None, token: str, changed: Changed | None = None) -> ExamBox:
    """The widget of an examination, drawn as far as it is seen at first.

    cell_id: the cell that shows it; running that cell again closes the widget. token: class of the static copy, which
    hides where this widget is alive. changed(before, after): told when the widget asks something else.
    """
    made = ExamWidget(exam, cell_id=cell_id, token=token, changed=changed)
    register(made.box, cell_id)
    return made.box


class ExamBox(widgets.VBox):  # type: ignore[misc]  # ipywidgets has no types
    """What is shown. It holds its parts, which hold the examination, until it is closed."""

    parts: ExamWidget | None = None

    @property
    def first_figure(self) -> str:
        """The figure in view at first, as HTML."""
        return self.parts.compare.first.figure if self.parts is not None else ""

    def close(self) -> None:
        """Close everything inside as well, and let the examination go."""
        parts, self.parts = self.parts, None
        if parts is not None:
            parts.close()
        super().close()


class ExamWidget:
    """The tabs, and which of them is drawn."""

    def __init__(self, exam: Examination, *, cell_id: str | None, token: str, changed: Changed | None = None) -> None:
        self.desk = Desk(exam, cell_id=cell_id, changed=changed)
        self.head, self.message = sheet(""), self.desk.message
        self.span = SpanFields(self.desk)
        self.compare = Compare(self.desk, self.span)
        self.remedies: dict[str, RemedyTab] = {}
        self.opened: list[str] = []  # by the picker, in the order they were opened
        self.picker = Picker(self.desk, self.open)
        self.tabs = widgets.Tab()
        self.tabs.add_class("batten-tabs")
        self.tabs.observe(weakly(self._switched), "selected_index")
        style = widgets.HTML(f"<style>{style_sheet(token)}</style>")
        style.layout.display = "none"
        self.box = ExamBox([style, self.head, self.message.box, self.tabs, self.picker.box])
        for name in ("batten-widget", KEYS_CLASS):
            self.box.add_class(name)
        self.box.parts = self
        self.desk.follow(self.refresh)
        self.refresh()

    @property
    def keys(self) -> tuple[str, ...]:
        """The remedies that have a tab, in the order of the tabs."""
        first = [key for _, key in shortlist(self.desk.exam.comparison)]
        return (*first, *(key for key in self.opened if key not in first))

    def refresh(self) -> None:
        """Show the examination in force: titles, header, and whatever is in view."""
        with self.desk.lock, told_in(self.message):
            self._lay_out()
            self.head.value = header(self.desk.exam)
            self.picker.draw(self.desk.exam, shown=self.keys)
            self._draw()

    def open(self, key: str) -> None:
        """Give a remedy a tab of its own and show it."""
        with self.desk.lock:
            if key not in self.keys:
                self.opened.append(key)
                self.refresh()
            self.tabs.selected_index = 1 + self.keys.index(key)

    def shut(self, key: str) -> None:
        """Take an opened remedy's tab away; the tab before it comes into view."""
        with self.desk.lock:
            if key in self.opened:
                place = self.keys.index(key)
                self.opened.remove(key)
                self.tabs.selected_index = place
                self.refresh()

    def close(self) -> None:
        """Close every widget made here, also those that are not in a tab now."""
        with self.desk.lock:
            for root in (self.box, *(tab.box for tab in self.remedies.values()), *self.desk.loose):
                close_all(root)

    def _lay_out(self) -> None:
        """Tabs of the examination in force; the remedy in view stays in view."""
        exam = self.desk.exam
        roles = {key: role for role, key in shortlist(exam.comparison)}
        children, titles = [self.compare.box], [COMPARE]
        for key in self.keys:
            if key not in self.remedies:
                self.remedies[key] = RemedyTab(self.desk, key, self.span, self.shut)
            self.remedies[key].may_be_shut(key not in roles)
            children.append(self.remedies[key].box)
            titles.append(roles.get(key, key))
        if tuple(children) == self.tabs.children:
            self.tabs.titles = titles
            return
        index = self.tabs.selected_index or 0
        seen = self.tabs.children[index] if self.tabs.children else self.compare.box
        with self.tabs.hold_sync():
            self.tabs.selected_index = None
            self.tabs.children, self.tabs.titles = children, titles
            self.tabs.selected_index = children.index(seen) if seen in children else 0

    def _switched(self, _change: object) -> None:
        with self.desk.lock, told_in(self.message):
            self.picker.message.say("")  # about a remedy that could not be opened: it has been read by now
            self._draw()

    def _draw(self) -> None:
        """Draw the tab that is selected by now: of several quick switches not each arrives."""
        index = self.tabs.selected_index
        if index is None:
            return
        tab = self.compare if index == 0 else self.remedies[self.keys[index - 1]]
        tab.draw(self.desk.exam)
