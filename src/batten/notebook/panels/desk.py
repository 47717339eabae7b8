"""What all parts of one widget share."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterable
from typing import Protocol
from weakref import WeakMethod

import ipywidgets as widgets

from batten.exam.examination import Examination
from batten.notebook.callbacks import Message
from batten.report.figures import Picture, img_html
from batten.report.lettering import plain
from batten.report.markup import esc

__all__ = ["NOT_YET", "Changed", "Desk", "Panel", "bullets", "figure", "sheet", "waiting"]

#: what a part says until it is drawn; also what a saved notebook shows of it
NOT_YET = '<p class="batten-quiet batten-waiting">Being drawn; this needs a live kernel.</p>'

Changed = Callable[[Examination, Examination], None]


class Panel(Protocol):
    """A part with a name, shown as `box`; `draw` fills it for an examination."""

    name: str

    @property
    def box(self) -> widgets.Widget: ...

    def draw(self, exam: Examination) -> None: ...


class Desk:
    """The examination in force, the cell, and one lock round everything that draws or changes it.

    Callbacks may run beside a cell, or beside each other, on any thread. The span, the aim and further remedies make a
    new examination, so what a part has drawn is fresh exactly if it was drawn for this very object. changed(before,
    after) is told of each.
    """

    def __init__(self, exam: Examination, *, cell_id: str | None, changed: Changed | None = None) -> None:
        self.exam, self.cell_id, self.lock = exam, cell_id, threading.RLock()
        self._changed = changed
        self.message = Message()  # for what belongs to no panel
        self.loose: list[widgets.Widget] = []  # made here, and in no box
        self._followers: list[WeakMethod[Callable[[], None]]] = []

    def follow(self, method: Callable[[], None]) -> None:
        """Call a bound method after every change."""
        self._followers.append(WeakMethod(method))

    def change(self, make: Callable[[Examination], Examination]) -> None:
        """Put what `make` makes of the examination in its place; nothing changes where it raises."""
        with self.lock:
            before, self.exam = self.exam, make(self.exam)
            if self._changed is not None:
                self._changed(before, self.exam)
            for ref in self._followers:
                follower = ref()
                if follower is not None:
                    follower()


def sheet(html: str = NOT_YET) -> widgets.HTML:
    """A piece of HTML in the report's look."""
    made = widgets.HTML(html)
    made.add_class("batten-report")
    return made


def bullets(items: Iterable[object]) -> str:
    """A list of plain sentences as HTML, "" for none."""
    lines = "".join(f"<li>{esc(plain(item))}</li>" for item in items if str(item))
    return f"<ul>{lines}</ul>" if lines else ""


def figure(picture: Picture) -> str:
    """A figure as HTML, with its own words for those who cannot see it."""
    return f'<figure class="batten-figure">{img_html(picture)}</figure>'


def waiting(words: str) -> str:
    """What stands in the place of something that is being computed, as HTML."""
    return f'<p class="batten-quiet batten-waiting">{esc(words)}</p>'
