"""One fitted remedy as the user holds it: coefficients, predictions, effects, checks, sentences, code."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd

from batten.effects.checks import checks
from batten.effects.coefficients import coefficients
from batten.effects.constants import Constant, learned_constants
from batten.effects.contrast import SpanEffect, span_effect
from batten.effects.covariances import covariance, kinds
from batten.effects.groups import GroupEffect, group_effects
from batten.effects.inverse import Inverse, x_for
from batten.effects.lookup import lookup, round_places
from batten.effects.own_shapes import OwnShapes, own_shapes, own_shapes_sentence
from batten.effects.partial import partial
from batten.effects.percents import percents
from batten.effects.rounding import Rounding, roundings
from batten.effects.sentences import sentences
from batten.effects.slopes import average, slopes_along
from batten.effects.summary import summary
from batten.effects.tell import Names, Sentence
from batten.effects.turn import Turn, turning_point
from batten.engine.rows import Array
from batten.errors import Refusal
from batten.errors import data as data_errors
from batten.errors import exam as errors
from batten.exam.answers import (
    check_table,
    effect_table,
    group_table,
    lookup_table,
    partial_table,
    percent_table,
    slope_table,
    summary_table,
)
from batten.exam.given import complete, joined, known, labels_of, number, sparse_words, target
from batten.exam.groups import covariate_rows, groups_by, interaction_groups, masks_by, said
from batten.families import Remedy
from batten.fit.carried import no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.predict import predict, total
from batten.fit.question import Question
from batten.frame.problem import NewRows, Problem

__all__ = ["Fit"]


@dataclass(frozen=True, eq=False)
class Fit:
    """Frozen result of one remedy on one analysis sample; what it returns is a fresh DataFrame or frozen."""

    problem: Problem
    question: Question
    estimate: Estimate

    def __repr__(self) -> str:
        return f"<Fit of {self.problem.formula!r} by {self.key!r}: {self.rows} rows>"

    @property
    def remedy(self) -> Remedy:
        return self.estimate.remedy

    @property
    def key(self) -> str:
        """The remedy's key, "log y ~ x"."""
        return self.remedy.key

    @property
    def words(self) -> str:
        """The remedy in words, "log of minutes on mass_kg"."""
        return self.remedy.words(self.problem.response, self.problem.focus)

    @property
    def label(self) -> str:
        """Words and key on one line, for titles."""
        return f"{self.words} ({self.key})"

    @property
    def rows(self) -> int:
        """Rows the fit stands for."""
        return self.estimate.rows.count

    @property
    def parameters(self) -> float:
        """Counted parameters: coefficients, searched constants and sigma; effective ones under a penalty."""
        return self.estimate.parameters

    @property
    def df_residual(self) -> float:
        return self.estimate.df_residual

    @property
    def sigma(self) -> float:
        """Residual standard deviation on the fitting scale."""
        return self.estimate.sigma

    @property
    def log_likelihood(self) -> float:
        """In units of y; NaN where there is none (pseudo-likelihoods)."""
        value = self.estimate.log_likelihood
        return math.nan if value is None else value

    @property
    def aicc(self) -> float:
        return self.estimate.aicc

    @property
    def coefficients(self) -> pd.DataFrame:
        """estimate, std_error, low, high on the fitting scale; the curve's searched constants stand last."""
        found = coefficients(self.estimate, level=self.question.level, errors=self.question.errors)
        return pd.DataFrame(
            {"estimate": found.estimate, "std_error": found.error, "low": found.low, "high": found.high},
            index=pd.Index(labels_of(self.problem, self.estimate), name="term"),
        )

    @property
    def constants(self) -> pd.DataFrame:
        """What was learned besides coefficients: estimate, low, high, note.

        Searched constants with their profile sets (no low or high where the set has no end), a curve's own levels, and
        facts fixed beforehand (knots, edges, centres), which have no interval.
        """
        rows = []
        for constant, nice in self._advised:
            ends = (end if math.isfinite(end) else math.nan for end in (constant.low, constant.high))
            price = "" if nice is None else f"{nice.words} costs {nice.loss:.2f} in log-likelihood"
            rows.append((constant.estimate, *ends, joined(constant.note, price)))
        return pd.DataFrame(
            rows, columns=["estimate", "low", "high", "note"],
            index=pd.Index([constant.name for constant in self.learned], name="constant"),
        )  # fmt: skip

    @cached_property
    def learned(self) -> tuple[Constant, ...]:
        """The same as values, with their profiles."""
        p = self.problem
        return learned_constants(self.estimate, x=p.focus, y=p.response, level=self.question.level)

    @cached_property
    def _advised(self) -> tuple[tuple[Constant, Rounding | None], ...]:
        """Each constant with the nicer value advised for it."""
        return tuple((c, next((r for r in self.roundings(c) if r.advised), None)) for c in self.learned)

    def roundings(self, constant: Constant) -> tuple[Rounding, ...]:
        """What each nicer value of a constant costs in log-likelihood and in the span effect."""
        p = self.problem
        return roundings(self.estimate, constant, self.question.span, x=p.focus, y=p.response)

    def predict(
        self, frame: pd.DataFrame, of: str = "mean", interval: str | None = None, level: float | None = None
    ) -> pd.DataFrame:
        """Predictions in units of y for the rows of a frame: estimate, low, high, note; the frame's own index.

        interval: None, "estimate" (for the mean or median itself) or "new row" (for one further row).
        """
        of, level = target(of), self._level(level)
        if interval not in (None, "estimate", "new row"):
            raise errors.one_of("interval", interval, ("estimate", "new row"))
        new = self.problem.new_rows(frame)
        whole, notes = complete(self.estimate, new)
        out = np.full((len(new.x), 3), np.nan)
        if whole.any():
            done = predict(
                self.estimate, new.x[whole], new.base[whole], new.modifier[whole],
                of=of, kind=interval, level=level, errors=self.question.errors, weight=known(new.weight, whole),
            )  # fmt: skip
            out[whole] = np.column_stack([done.estimate, done.low, done.high])
            carried = no_mean_interval(self.estimate) if of == "mean" and interval == "estimate" else ""
            if carried:
                out[:, 1:] = np.nan
            for row, note in zip(np.flatnonzero(whole), done.note, strict=True):
                notes[row] = joined(joined(notes[row], note), carried)
        return pd.DataFrame(
            {"estimate": out[:, 0], "low": out[:, 1], "high": out[:, 2], "note": notes}, index=new.index
        )

    def total(self, frame: pd.DataFrame, level: float | None = None) -> pd.DataFrame:
        """Sum of the means over a frame's rows: estimate, low, high, shared_error, row_error, rows, note.

        With an exposure each row's mean per unit counts times its exposure, which the frame must have.

        shared_error: the fit is the same for all rows; row_error: each row's own spread. Units of y. NaN, with a note,
        where a row cannot be predicted.
        """
        level = self._level(level)
        new = self.problem.new_rows(frame)
        whole, notes = complete(self.estimate, new)
        numbers, note = [np.nan] * 5, next((n for n in notes if n), "")
        if whole.all():
            amount = self._amount(new)
            t = total(
                self.estimate, new.x, new.base, new.modifier,
                level=level, errors=self.question.errors, amount=amount, weight=known(new.weight, whole),
            )  # fmt: skip
            numbers = [t.estimate, t.low, t.high, t.shared_error, t.row_error]
        else:
            note = f"{int((~whole).sum())} of {len(whole)} rows cannot be predicted: {note}"
        names = ["estimate", "low", "high", "shared_error", "row_error"]
        table = pd.DataFrame([numbers], columns=names, index=["total"])
        return table.assign(rows=len(whole), note=note)

    def _amount(self, new: NewRows) -> Array | None:
        name = self.problem.beside.exposure
        if name is not None and (new.exposure is None or not np.isfinite(new.exposure).all()):
            raise data_errors.exposure_missing(name)
        return new.exposure

    def contrast(self, a: float | None = None, b: float | None = None, of: str = "mean") -> pd.DataFrame:
        """Rows at b against rows at a, covariates alike: difference, ratio, span_slope by estimate, low, high, note.

        The note also tells where many rows have none like them near an end of the span.
        """
        found = self.span_effect(a, b, of=of)
        names = ("difference", "ratio", "span_slope")
        table = effect_table({name: getattr(found, name) for name in names}, name="effect")
        sparse = sparse_words(self.problem, (found.a, found.b))
        table["note"] = [joined(note, sparse) for note in table["note"]]
        return table

    def span_effect(self, a: float | None = None, b: float | None = None, of: str = "mean") -> SpanEffect:
        """The same as numbers; a and b default to the question's span."""
        given = self.question.span[0] if a is None else a, self.question.span[1] if b is None else b
        low, high = (number(name, end, self.problem.focus) for name, end in zip("ab", given, strict=True))
        if not low < high:
            x = self.problem.rows.x
            raise errors.same_ends(low, high, self.problem.focus, float(x.min()), float(x.max()))
        base, modifier = self._covariates()
        return span_effect(
            self.estimate, (low, high), of=target(of), level=self.question.level,
            errors=self.question.errors, base=base, modifier=modifier,
        )  # fmt: skip

    def slope(self, at: float | Sequence[float] | None = None, of: str = "mean") -> pd.DataFrame:
        """Slopes in units of y per unit of x: estimate, low, high, note, indexed by x, or one row "average".

        at: x values, averaged over covariates (two rows where one is a break); None: the average over the rows.
        """
        of = target(of)
        asked = {"of": of, "level": self.question.level, "errors": self.question.errors}
        if at is None:
            return effect_table({"average": average(self.estimate, **asked)}, name=self.problem.focus)  # type: ignore[arg-type]
        several = at if np.iterable(at) and not isinstance(at, str) else [at]
        xs = [number("at", x, self.problem.focus) for x in several]
        base, modifier = self._covariates()
        found = slopes_along(self.estimate, xs, base=base, modifier=modifier, **asked)  # type: ignore[arg-type]
        return slope_table(found, focus=self.problem.focus)

    def by_group(self, by: str | None = None, of: str = "mean") -> pd.DataFrame:
        """The span effect per group: difference, ratio and their intervals, and against the first group; note.

        by: a covariate (a number at its 10th, 50th and 90th percentile); default the question's `by`, then the column
        that the focal predictor is multiplied with.
        """
        return group_table(self.group_effects(by, of=of))

    def group_effects(self, by: str | None = None, of: str = "mean") -> tuple[GroupEffect, ...]:
        """The same as numbers; () without groups."""
        column = by or self.question.by
        groups = groups_by(self.problem, column) if column else interaction_groups(self.problem)
        if not groups:
            return ()
        q = self.question
        return group_effects(self.estimate, groups, q.span, of=target(of), level=q.level, errors=q.errors)

    def x_for(self, y: float, of: str = "mean", at: dict[str, Any] | None = None) -> Inverse:
        """Every x inside the data whose mean (or median) is y, and every x that cannot be told from that.

        at: covariate values to hold; the others stay as the rows have them. Returns estimates, pieces, surely_below,
        surely_above, reached and a reading in words.
        """
        p, q = self.problem, self.question
        base, modifier = covariate_rows(p, at) if at else self._covariates()
        return x_for(
            self.estimate, number("y", y, p.response), of=target(of), level=q.level, errors=q.errors, base=base,
            modifier=modifier, unit=p.unit(p.focus), y_unit=p.unit(p.response),
        )  # fmt: skip

    def turning_point(self) -> Turn:
        """Where the curve turns: estimate, pieces, located and a reading in words."""
        base, modifier = self._covariates()
        q, unit = self.question, self.problem.unit(self.problem.focus)
        return turning_point(
            self.estimate, level=q.level, errors=q.errors, unit=unit, base=base, modifier=modifier
        )  # fmt: skip

    def lookup(self, by: str | None = None) -> pd.DataFrame:
        """Mean, median and the interval for a new row (low, high) at round x, by group if asked; units of y."""
        p, q = self.problem, self.question
        places = round_places(float(p.rows.x.min()), float(p.rows.x.max()))
        asked = {"level": q.level, "errors": q.errors}
        if by is None:
            return lookup_table(lookup(self.estimate, places, profile=p.profile, **asked), focus=p.focus)  # type: ignore[arg-type]
        parts = {}
        for level in masks_by(p, by):
            held = covariate_rows(p, {by: level})
            parts[level] = lookup_table(lookup(self.estimate, places, profile=held, **asked), focus=p.focus)  # type: ignore[arg-type]
        table: pd.DataFrame = pd.concat(parts, names=[by])
        return table

    def sentences(self, of: str = "mean") -> tuple[Sentence, ...]:
        """What this fit says, the standing question first; each sentence knows its numbers."""
        base, modifier = self._covariates()
        q = self.question
        groups = groups_by(self.problem, q.by) if q.by else interaction_groups(self.problem)
        told = sentences(
            self.estimate, self.names, q.span, of=target(of), errors=q.errors, groups=groups, base=base,
            modifier=modifier, learned=self._advised, turn=self.turning_point(),
        )  # fmt: skip
        if q.by is None:
            return told
        return *told, own_shapes_sentence(self.own_shapes(q.by, of=of), q.by, self.names)

    def own_shapes(self, by: str, of: str = "mean") -> OwnShapes | Refusal:
        """This remedy with a shape of its own for each level of a covariate: span effects, and whether they differ."""
        q = self.question
        groups = {said(level): np.where(rows, 1.0, 0.0) for level, rows in masks_by(self.problem, by).items()}
        return own_shapes(self.estimate, groups, q.span, of=target(of), level=q.level, errors=q.errors)

    def checks(self, every: bool = True) -> pd.DataFrame:
        """What can be checked about this fit: about, asked, test, statistic, df, df_rest, p, size, unit, reading.

        The left-over bend is the one test fixed beforehand; of so many others one in twenty fires by chance. every:
        also the tests that ask a question again in another way.
        """
        p, q = self.problem, self.question
        found = checks(
            self.estimate, self.names, q.span, errors=q.errors, labels=tuple(p.base_names), tolerance=q.tolerance,
            unnamed=tuple(c.name for c in self.learned if not c.named), every=every,
        )  # fmt: skip
        return check_table(found, p.index)

    def partial(self) -> pd.DataFrame:
        """Each row with its covariates at their averages, in units of y: the focal predictor, value, curve, note."""
        return partial_table(partial(self.estimate), self.problem)

    def percents(self) -> pd.DataFrame:
        """Covariates' coefficients in percent, for log y and log links; empty elsewhere."""
        q, labels = self.question, tuple(self.problem.base_names)
        return percent_table(percents(self.estimate, labels, level=q.level, errors=q.errors))

    def summary(self) -> pd.DataFrame:
        """In-sample numbers a report is asked for: value, unit, note; NaN with the reason where there is none."""
        return summary_table(summary(self.estimate, self.names, errors=self.question.errors))

    def covariance(self, kind: str | None = None) -> pd.DataFrame:
        """Covariance of the coefficients, in the order and on the scale of `coefficients`.

        kind: "robust", "constant", "HC0" to "HC3", by cluster "CR0", "CR1", "CR3"; None: as in the question.
        """
        kind = self.question.errors if kind is None else kind
        if kind not in kinds(self.estimate):
            raise errors.one_of("kind", kind, kinds(self.estimate))
        labels = pd.Index(labels_of(self.problem, self.estimate), name="term")
        return pd.DataFrame(covariance(self.estimate, kind), index=labels, columns=labels.rename(None))

    def code(self) -> str:
        """A standalone script that fits this remedy again and asserts the numbers shown here."""
        from batten.emit.script import script

        return script(self.problem, self.question, self.estimate)

    @property
    def names(self) -> Names:
        """Names, units and level for words."""
        p, q = self.problem, self.question
        return Names(
            p.response, p.focus, p.unit(p.response), p.unit(p.focus), covariates=bool(p.covariates),
            at=tuple(q.at.items()), level=q.level,
        )  # fmt: skip

    def _covariates(self) -> tuple[Array | None, Array | None]:
        """Covariate rows to average over: those of `at`, or None, None for the rows' own."""
        return self.problem.profile or (None, None)

    def _level(self, level: float | None) -> float:
        if level is None:
            return self.question.level
        if not (isinstance(level, int | float) and 0 < level < 1):
            raise errors.bad_number("level", level, "between 0 and 1, such as 0.95")
        return float(level)
