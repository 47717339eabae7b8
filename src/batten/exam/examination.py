"""One examination: every remedy on one response and one focal predictor, compared and ready to be asked."""

from __future__ import annotations

import threading
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from functools import cached_property
from typing import Any, Literal

import numpy as np
import pandas as pd

from batten.compare.choose import Choice
from batten.compare.grid import STRAIGHT, Comparison, Progress, compare, extend
from batten.diagnose.trial import Trial, try_line
from batten.effects.contrast import SpanEffect, span_effect
from batten.effects.span import round_span
from batten.errors import ask
from batten.errors import data as data_errors
from batten.errors import exam as errors
from batten.exam.fit import Fit
from batten.exam.groups import categorical
from batten.exam.tables import comparison_table, effects_table, refusal_table
from batten.families import default_grid, expand, parse
from batten.fit.guard import not_offered
from batten.fit.question import Question
from batten.frame.problem import Problem
from batten.frame.read import read

__all__ = ["Examination", "examine"]


class Examination(Mapping[str, Fit]):
    """A frozen mapping from key to Fit, in table order. Made by `examine`; pickles and copies."""

    def __init__(self, problem: Problem, question: Question, comparison: Comparison) -> None:
        self._problem, self._question, self._comparison = problem, question, comparison
        self._fits: dict[str, Fit] = {}
        self._spans: dict[str, SpanEffect] = {}
        self._lock = threading.RLock()

    def __getstate__(self) -> dict[str, Any]:
        return {"problem": self._problem, "question": self._question, "comparison": self._comparison}

    def __setstate__(self, state: dict[str, Any]) -> None:
        self.__init__(**state)  # type: ignore[misc]

    def __getitem__(self, key: str) -> Fit:
        name = parse(key).key
        if name not in self._comparison.estimates:
            refusal = self._comparison.refused.get(name)
            parts = None if refusal is None else (refusal.wrong, refusal.seen, refusal.instead)
            raise errors.unknown_key(key, list(self), parts)
        with self._lock:
            if name not in self._fits:
                self._fits[name] = Fit(self._problem, self._question, self._comparison.estimates[name].full)
            return self._fits[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._comparison.estimates)

    def __len__(self) -> int:
        return len(self._comparison.estimates)

    def __repr__(self) -> str:
        p = self._problem
        return (
            f"<Examination of {p.formula!r}: {len(self)} remedies on {p.rows.count} rows, choice {self.choice.key!r}>"
        )

    @property
    def problem(self) -> Problem:
        """Response, focal predictor, covariates, rows used, rows left out and why."""
        return self._problem

    @property
    def question(self) -> Question:
        """What was asked: aim, span, level, tolerance and the rest."""
        return self._question

    @property
    def comparison(self) -> Comparison:
        """The numbers behind the table, for renderers."""
        return self._comparison

    @property
    def choice(self) -> Choice:
        """key, runner_up, tied, reasons, otherwise."""
        return self._comparison.choice

    @property
    def chosen(self) -> Fit:
        """The chosen remedy's fit."""
        return self[self.choice.key]

    @cached_property
    def straight(self) -> Trial:
        """The straight line's trial: verdict, gap, tolerance, test, where it over- and under-predicts, words."""
        c, p = self._comparison, self._problem
        return try_line(
            c.estimates[STRAIGHT], c.reference, c.bends[STRAIGHT],
            x=p.focus, x_unit=p.unit(p.focus), y_unit=p.unit(p.response),
        )  # fmt: skip

    @property
    def refused(self) -> pd.DataFrame:
        """Remedies that cannot be used on these rows: key, wrong, seen, instead, and the rows they cannot take."""
        return refusal_table(self._comparison, self._problem.index)

    def table(self, keys: Iterable[str] | None = None) -> pd.DataFrame:
        """The comparison by key, best held-out error first; errors and gaps in units of y.

        keys: only these rows; the others' differences over the span are then not computed.
        """
        with self._lock:
            if keys is None:
                return self._table.copy()
            asked = {self[key].key for key in keys}
            return self._rows([key for key in self if key in asked])

    @cached_property
    def _table(self) -> pd.DataFrame:
        return self._rows(list(self))

    def _rows(self, keys: list[str]) -> pd.DataFrame:
        q = self._question
        base, modifier = self._problem.profile or (None, None)
        for key in keys:
            if key not in self._spans:
                est = self._comparison.estimates[key]
                self._spans[key] = span_effect(
                    est, q.span, level=q.level, errors=q.errors, base=base, modifier=modifier
                )  # fmt: skip
        return comparison_table(self._problem, self._comparison, {key: self._spans[key] for key in keys})

    def effects(self, a: float | None = None, b: float | None = None, of: str = "mean") -> pd.DataFrame:
        """The same question to every remedy: difference, ratio, span_slope, average_slope with _low, _high; note."""
        if of not in ("mean", "median"):
            raise errors.one_of("of", of, ("mean", "median"))
        ends = self._question.span[0] if a is None else float(a), self._question.span[1] if b is None else float(b)
        if not ends[0] < ends[1]:
            raise errors.same_ends(*ends, self._problem.focus, *_ends(self._problem))
        return effects_table([self[key] for key in self], *ends, of=of)

    def with_remedy(self, key: str) -> Examination:
        """A new examination with one more remedy, on the same rows and folds."""
        more = extend(self._comparison, parse(key), unit=self._problem.unit(self._problem.response))
        made = Examination(self._problem, self._question, more)
        made._spans.update(self._spans)
        return made

    def with_aim(self, aim: Literal["effect", "prediction"]) -> Examination:
        """The same fits and scores, chosen by the other aim."""
        made = self._asked(replace(self._question, aim=aim))
        made._spans.update(self._spans)
        return made

    def with_span(self, a: float, b: float) -> Examination:
        """The same fits, scores and choice, asked about the span from a to b."""
        return self._asked(replace(self._question, span=_span(self._problem, (a, b))))

    def _asked(self, question: Question) -> Examination:
        again = self._comparison.asked(question, unit=self._problem.unit(self._problem.response))
        return Examination(self._problem, question, again)

    def lookup(self, key: str | None = None, by: str | None = None) -> pd.DataFrame:
        """Table of predictions at round x (by group): mean, median, interval for a new row. Units of y."""
        return self[key or self.choice.key].lookup(by=by)

    def code(self, key: str | None = None) -> str:
        """A standalone script of one remedy, the choice by default."""
        return self[key or self.choice.key].code()

    def write_up(self, key: str | None = None) -> str:
        """A paragraph of methods and results about one remedy, the choice by default."""
        from batten.report.write_up import write_up

        return write_up(self, key or self.choice.key)

    def save_report(self, path: str) -> None:
        """Write one HTML page with the verdict, table, figures, sentences and code; needs no other file."""
        from batten.report.page import save_page

        save_page(self, path)

    def reselect(self, resamples: int = 500) -> pd.DataFrame:
        """Repeat the whole search on resamples."""
        raise errors.later("reselect", "Until then read intervals as if the remedy had been fixed in advance.")

    def deciding_rows(self) -> pd.DataFrame:
        """Which rows the choice hangs on."""
        raise errors.later("deciding_rows", "fit.checks() names the rows with the largest leverage and pull.")


def examine(
    formula: str,
    data: Any,
    *,
    focus: str | None = None,
    aim: Literal["effect", "prediction"] = "effect",
    span: tuple[float, float] | None = None,
    level: float = 0.95,
    tolerance: float | None = None,
    expect: Literal["rising", "falling"] | None = None,
    planned: str | None = None,
    weights: str | None = None,
    weights_kind: str | None = None,
    cluster: str | None = None,
    exposure: str | None = None,
    rows: str | None = None,
    by: str | None = None,
    at: Mapping[str, Any] | None = None,
    only: str | tuple[str, ...] | list[str] | None = None,
    units: Mapping[str, str] | None = None,
    errors: Literal["robust", "constant"] = "robust",
    folds: int = 10,
    repeats: int | None = None,
    seed: int = 0,
    progress: Progress | None = None,
    env: Mapping[str, Any] | None = None,
    frame_name: str = "data",
) -> Examination:
    """Fit every remedy for `formula` on `data`, compare them fairly, and choose by the aim.

    formula: as statsmodels' formula interface takes it, with a plain response and a plain focal predictor. data: a data
    frame (pandas, polars, Arrow). focus: the predictor whose shape is in question (first bare numeric one by default).
    span: the two x values compared (rounded quartiles). tolerance: the smallest gap that matters, units of y.
    planned: key of a remedy fixed in advance. only: keys or family names. errors: "robust" (HC3; by cluster where
    `cluster` names a column) or "constant". weights: column of weights, weights_kind "variance" (variance is s2 over
    the weight) or "frequency" (equal rows each stands for). exposure: column that the response is taken per unit of.
    progress(done, total, label) is called along the way. env: names that functions in the formula may use.

    Raises InputError or UnknownNameError, with what is wrong, what was seen and what to do.
    """
    _check_options(
        aim=aim, level=level, tolerance=tolerance, expect=expect, error_kind=errors, folds=folds, repeats=repeats
    )
    if cluster is not None and errors == "constant":
        raise data_errors.constant_with_clusters(cluster)
    problem = read(
        formula, data, focus=focus, rows=rows, weights=weights, weights_kind=weights_kind, cluster=cluster,
        exposure=exposure, units=dict(units or {}), env=env, frame_name=frame_name, at=at,
    )  # fmt: skip
    _check_by(problem, by)
    ends = _span(problem, span)
    keys = (only,) if isinstance(only, str) else tuple(only or ())
    question = Question(
        aim=aim, span=ends, level=level, tolerance=tolerance, expect=expect,
        planned=None if planned is None else parse(planned).key, by=by, at=dict(at or {}), only=keys, errors=errors,
        folds=folds, repeats=repeats, seed=seed,
    )  # fmt: skip
    grid = default_grid(problem.rows.y, problem.rows.x, zero_is_arbitrary=problem.zero_is_arbitrary)
    remedies = expand(keys, grid) if keys else tuple(r for r in grid if not_offered(r) is None)
    unit = problem.unit(problem.response)
    return Examination(problem, question, compare(problem.rows, remedies, question, unit=unit, progress=progress))


def _ends(problem: Problem) -> tuple[float, float]:
    return float(np.min(problem.rows.x)), float(np.max(problem.rows.x))


def _span(problem: Problem, span: tuple[float, float] | None) -> tuple[float, float]:
    if span is None:
        return round_span(problem.rows.x)
    a, b = float(span[0]), float(span[1])
    if not (np.isfinite(a) and np.isfinite(b) and a < b):
        raise errors.same_ends(a, b, problem.focus, *_ends(problem))
    return a, b


def _check_options(
    *,
    aim: str,
    level: float,
    tolerance: float | None,
    expect: str | None,
    error_kind: str,
    folds: int,
    repeats: int | None,
) -> None:
    if aim not in ("effect", "prediction"):
        raise errors.one_of("aim", aim, ("effect", "prediction"))
    if expect not in (None, "rising", "falling"):
        raise errors.one_of("expect", expect, ("rising", "falling"))
    if error_kind not in ("robust", "constant"):
        raise errors.one_of("errors", error_kind, ("robust", "constant"))
    if not 0.5 <= level < 1:
        raise errors.bad_number("level", level, "from 0.5 to below 1, such as 0.95")
    if tolerance is not None and not tolerance > 0:
        raise errors.bad_number("tolerance", tolerance, "above zero, in units of the response")
    if not (isinstance(folds, int) and folds >= 2):
        raise errors.bad_number("folds", folds, "a whole number from 2 up")
    if repeats is not None and not (isinstance(repeats, int) and repeats >= 1):
        raise errors.bad_number("repeats", repeats, "a whole number from 1 up")


def _check_by(problem: Problem, by: str | None) -> None:
    """The question's groups must be a covariate that is read as groups."""
    if by is None:
        return
    if by not in problem.covariates:
        raise ask.not_a_covariate(by, problem.covariates)
    if not categorical(problem, by):
        raise ask.not_groups(by)
