"""A row of buttons and the panel that goes with the one pressed; a panel is drawn when it is first looked at."""

from __future__ import annotations

from collections.abc import Sequence

import ipywidgets as widgets

from batten.exam.examination import Examination
from batten.notebook.callbacks import Message, told_in, weakly
from batten.notebook.panels.desk import Desk, Panel

__all__ = ["Pages"]


class Pages:
    """Panels of which one shows at a time.

    Buttons rather than tabs, since the arrow keys do not move along tabs in every front end. The page itself shows the
    panel that goes with a button, so that switching needs no kernel; the kernel then draws what is selected by now.
    """

    def __init__(self, desk: Desk, panels: Sequence[Panel]) -> None:
        self._desk, self.panels = desk, tuple(panels)
        self._drawn: list[Examination | None] = [None] * len(self.panels)
        self.message = Message()
        self.buttons = widgets.ToggleButtons(options=[panel.name for panel in self.panels])
        self.buttons.add_class("batten-pages")
        for panel in self.panels:
            panel.box.layout.width = "100%"  # a stack lets its panels shrink
        self.stack = widgets.Stack([panel.box for panel in self.panels], selected_index=0)
        desk.loose.append(widgets.jsdlink((self.buttons, "index"), (self.stack, "selected_index")))
        self.buttons.observe(weakly(self._switched), "index")
        self.box = widgets.VBox([self.buttons, self.message.box, self.stack])

    def draw(self, exam: Examination) -> None:
        """Draw the panel that is selected now, unless it shows this examination already."""
        place = self.buttons.index
        with told_in(self.message):  # also clears what another panel has left there
            if self._drawn[place] is not exam:
                self.panels[place].draw(exam)
                self._drawn[place] = exam

    def _switched(self, _change: object) -> None:
        with self._desk.lock:
            self.draw(self._desk.exam)
