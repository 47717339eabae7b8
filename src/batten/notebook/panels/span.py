"""The standing question's two values of the focal predictor, to be changed for all parts of the widget at once."""

from __future__ import annotations

import ipywidgets as widgets

from batten.exam.examination import Examination
from batten.frame.problem import Problem
from batten.notebook.callbacks import Message, told_in, weakly
from batten.notebook.panels.desk import Desk
from batten.notebook.panels.fields import NAME, Days, Numbers
from batten.report.days import counted_from
from batten.report.lettering import shortened

__all__ = ["SpanFields"]


class SpanFields:
    """ "mass_kg from [11] to [25] kg". One object, shown wherever the span is asked about: its places stay in step."""

    def __init__(self, desk: Desk) -> None:
        self._desk, problem = desk, desk.exam.problem
        self.first = desk.exam.question.span
        self.message, self._writing = Message(), False
        a, b = self.first
        name = shortened(problem.focus, NAME)
        self.low = _field(problem, a, label=f"Span: {name} from")
        self.high = _field(problem, b, label="to", unit=problem.unit(problem.focus))
        self.back = widgets.Button(description="Back", tooltip="Back to the first span")
        self.back.layout.width = "auto"
        for field in (self.low, self.high):
            field.on_change(weakly(self._changed))
        self.back.on_click(weakly(self._restored))
        row = widgets.HBox([self.low.box, self.high.box, self.back])
        row.add_class("batten-field")
        self.box = widgets.VBox([row, self.message.box])
        self._show(desk.exam)

    def _changed(self, _change: object) -> None:
        with self._desk.lock:
            if self._writing:
                return
            with told_in(self.message):
                span = self.low.read(), self.high.read()
                if span != self._desk.exam.question.span:
                    self._desk.change(lambda exam: exam.with_span(*span))
                    self._show(self._desk.exam)

    def _restored(self, _button: object) -> None:
        with self._desk.lock, told_in(self.message):
            if self._desk.exam.question.span != self.first:
                self._desk.change(lambda exam: exam.with_span(*self.first))
            self._show(self._desk.exam)

    def _show(self, exam: Examination) -> None:
        """Write the span in force into the fields; the first one has nothing to go back to."""
        self._writing = True  # between the two, the fields hold a span that nobody asked for
        for field, value in zip((self.low, self.high), exam.question.span, strict=True):
            field.set(value)
        self._writing = False
        self.back.layout.display = "none" if exam.question.span == self.first else ""


def _field(problem: Problem, value: float, *, label: str, unit: str = "") -> Numbers | Days:
    """A number, or a date where the focal predictor holds dates."""
    start = counted_from(problem)
    if start is not None:
        return Days(problem.focus, value, start=start, label=label)
    return Numbers(problem.focus, value, label=label, unit=unit)
