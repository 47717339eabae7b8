"""Try a value: what the remedy predicts for one row that is typed in, and at which x a typed prediction is reached."""

from __future__ import annotations

from typing import Any

import ipywidgets as widgets
import pandas as pd

from batten.exam.examination import Examination
from batten.exam.fit import Fit
from batten.frame.problem import Problem
from batten.frame.slots import Slot
from batten.notebook.callbacks import Message, told_in, weakly
from batten.notebook.panels.desk import Desk, sheet
from batten.notebook.panels.fields import NAME, Choices, Dates, Field, Numbers, labelled, number_in
from batten.report.fit_tables import lookup_table, predictions_table
from batten.report.lettering import plain, shortened
from batten.report.markup import paragraph

__all__ = ["TryValue", "fields_for"]

#: digits that a suggested number keeps
DIGITS = 3


class TryValue:
    """One field per column the formula needs, filled in with a row from the middle of the data."""

    name = "try a value"

    def __init__(self, desk: Desk, key: str) -> None:
        self._desk, self._key = desk, key
        problem = desk.exam.problem
        self.fields = fields_for(problem)
        self.wanted = widgets.Text(continuous_update=False, placeholder="a number")
        self.message, self.backwards = Message(), Message()
        self.shown, self.reached = sheet(), sheet("")
        for field in self.fields:
            field.on_change(weakly(self._changed))
        self.wanted.observe(weakly(self._asked_back), "value")
        self.several = widgets.ToggleButton(
            description="Table at round values", layout=widgets.Layout(width="auto")
        )  # fmt: skip
        self.several.observe(weakly(self._asked_for_several), "value")
        self.table, self.trouble = sheet(""), Message()
        self.box = widgets.VBox([
            *(field.box for field in self.fields), self.message.box, self.shown,
            _question(problem, self.wanted), self.backwards.box, self.reached,
            widgets.HBox([self.several]), self.trouble.box, self.table,
        ])  # fmt: skip

    def draw(self, exam: Examination) -> None:
        with told_in(self.message):
            self._predict(exam[self._key])
        if self.wanted.value.strip():
            self._ask_back(exam)
        self._look_up(exam)

    def row(self) -> pd.DataFrame:
        """What is typed, as a frame of one row."""
        return pd.DataFrame({field.name: [field.read()] for field in self.fields})

    def _changed(self, _change: object) -> None:
        with self._desk.lock, told_in(self.message):
            self._predict(self._desk.exam[self._key])

    def _predict(self, fit: Fit) -> None:
        row = self.row()
        mean, median = (fit.predict(row, of=of, interval="estimate") for of in ("mean", "median"))
        new = fit.predict(row, interval="new row")
        notes = dict.fromkeys(note for table in (mean, median, new) for note in table["note"] if note)
        told = "".join(paragraph(f"{note[:1].upper()}{note[1:]}.", "caution") for note in notes)
        self.shown.value = told + predictions_table(fit, mean, median, new)

    def _asked_for_several(self, _change: object) -> None:
        with self._desk.lock:
            self._look_up(self._desk.exam)

    def _look_up(self, exam: Examination) -> None:
        """The table at round values, for as long as its button is down."""
        with told_in(self.trouble):
            asked = self.several.value
            self.table.value = lookup_table(exam[self._key], exam.question.by) if asked else ""

    def _asked_back(self, _change: object) -> None:
        with self._desk.lock:
            self._ask_back(self._desk.exam)

    def _ask_back(self, exam: Examination) -> None:
        with told_in(self.backwards):
            if not self.wanted.value.strip():
                self.reached.value = ""
                return
            problem = exam.problem
            found = exam[self._key].x_for(number_in(self.wanted.value, problem.response))
            self.reached.value = paragraph(f"{plain(problem.focus)}: {found.reading}.")


def fields_for(problem: Problem) -> list[Field]:
    """A field for each column that a row needs, the focal predictor first, with values the rows are used to."""
    used, slots = problem.design.used(problem.index), list(problem.design.slots.values())
    names = [problem.focus, *(name for name in problem.design.needed if name != problem.focus)]
    return [_field(problem, [s for s in slots if s.column == name], used[name]) for name in names]


def _field(problem: Problem, slots: list[Slot], values: pd.Series[Any]) -> Field:
    """Levels where the column is ever used as groups; else a date, a number, or one of its values."""
    name = slots[0].column
    levels = next((list(slot.levels) for slot in slots if slot.use == "groups"), None)
    if levels is None and slots[0].kind == "yes/no":
        levels = [False, True]
    if levels is None and slots[0].kind == "dates":
        return Dates(name, values.sort_values().iloc[len(values) // 2])
    if levels is None and any(slot.numeric for slot in slots):
        return Numbers(name, float(f"{float(values.astype(float).median()):.{DIGITS}g}"), unit=problem.unit(name))
    if levels is None:
        levels = sorted(values.unique().tolist(), key=str)
    usual = next((value for value in values.value_counts().index if value in levels), levels[0])
    return Choices(name, levels[levels.index(usual)], levels)


def _question(problem: Problem, wanted: widgets.Text) -> widgets.HBox:
    """The same asked backwards."""
    y, x = (shortened(name, NAME) for name in (problem.response, problem.focus))
    alike = " (covariates as in the rows)" if problem.covariates else ""
    unit = problem.unit(problem.response)
    ask = f"Backwards: at which {x}{alike} is the mean of {y}{f' ({shortened(unit, 20)})' if unit else ''}"
    return labelled(ask, wanted)
