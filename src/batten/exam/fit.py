"""One fitted remedy as the user holds it: coefficients, predictions, effects, checks, sentences, code."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd

from batten.effects.coefficients import coefficients
from batten.effects.constants import Constant, learned_constants
from batten.effects.contrast import SpanEffect, span_effect
from batten.effects.rounding import Rounding, roundings
from batten.effects.slopes import SlopeAt, average, slopes_along
from batten.effects.value import Effect
from batten.engine.rows import Array
from batten.errors import ask
from batten.families import Remedy
from batten.fit.estimate import Estimate
from batten.fit.predict import predict, total
from batten.fit.question import Question
from batten.frame.problem import Problem

__all__ = ["Fit"]


@dataclass(frozen=True, eq=False)
class Fit:
    """Frozen result of one remedy on one analysis sample; what it returns is a fresh DataFrame or frozen."""

    problem: Problem
    question: Question
    estimate: Estimate

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
        return self.estimate.rows.n

    @property
    def parameters(self) -> int:
        """Counted parameters: coefficients, searched constants and sigma."""
        return self.estimate.parameters

    @property
    def df_residual(self) -> int:
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
            index=pd.Index(self._labels(), name="term"),
        )

    @property
    def constants(self) -> pd.DataFrame:
        """What was learned besides coefficients: estimate, low, high, note.

        Searched constants with their profile sets (no low or high where the set has no end), a curve's own levels, and
        facts fixed beforehand (knots, edges, centres), which have no interval.
        """
        found = self.learned
        rows = []
        for constant in found:
            ends = (end if math.isfinite(end) else math.nan for end in (constant.low, constant.high))
            nice = next((r for r in self.roundings(constant) if r.advised), None)
            price = "" if nice is None else f"{nice.words} costs {nice.loss:.2f} in log-likelihood"
            rows.append((constant.estimate, *ends, _joined(constant.note, price)))
        return pd.DataFrame(
            rows, columns=["estimate", "low", "high", "note"],
            index=pd.Index([constant.name for constant in found], name="constant"),
        )  # fmt: skip

    @cached_property
    def learned(self) -> tuple[Constant, ...]:
        """The same as values, with their profiles."""
        p = self.problem
        return learned_constants(self.estimate, x=p.focus, y=p.response, level=self.question.level)

    def roundings(self, constant: Constant) -> tuple[Rounding, ...]:
        """What each nicer value of a constant costs in log-likelihood and in the span effect."""
        return roundings(self.estimate, constant, self.question.span)

    def predict(
        self, frame: pd.DataFrame, of: str = "mean", interval: str | None = None, level: float | None = None
    ) -> pd.DataFrame:
        """Predictions in units of y for the rows of a frame: estimate, low, high, note; the frame's own index.

        interval: None, "estimate" (for the mean or median itself) or "new row" (for one further row).
        """
        of, level = _target(of), self._level(level)
        if interval not in (None, "estimate", "new row"):
            raise ask.one_of("interval", interval, ("estimate", "new row"))
        new = self.problem.new_rows(frame)
        whole, notes = self._complete(new.x, new.base, new.modifier, new.notes)
        out = np.full((len(new.x), 3), np.nan)
        if whole.any():
            done = predict(
                self.estimate, new.x[whole], new.base[whole], new.modifier[whole],
                of=of, kind=interval, level=level, errors=self.question.errors,
            )  # fmt: skip
            out[whole] = np.column_stack([done.estimate, done.low, done.high])
            for place, note in zip(np.flatnonzero(whole), done.note, strict=True):
                notes[place] = _joined(notes[place], note)
        return pd.DataFrame(
            {"estimate": out[:, 0], "low": out[:, 1], "high": out[:, 2], "note": notes}, index=new.index
        )

    def total(self, frame: pd.DataFrame, level: float | None = None) -> pd.DataFrame:
        """Sum of the means over a frame's rows: estimate, low, high, shared_error, row_error, rows, note.

        shared_error: the fit is the same for all rows; row_error: each row's own spread. Units of y. NaN, with a note,
        where a row cannot be predicted.
        """
        level = self._level(level)
        new = self.problem.new_rows(frame)
        whole, notes = self._complete(new.x, new.base, new.modifier, new.notes)
        numbers, note = [np.nan] * 5, next((n for n in notes if n), "")
        if whole.all():
            t = total(self.estimate, new.x, new.base, new.modifier, level=level, errors=self.question.errors)
            numbers = [t.estimate, t.low, t.high, t.shared_error, t.row_error]
        else:
            note = f"{int((~whole).sum())} of {len(whole)} rows cannot be predicted: {note}"
        names = ["estimate", "low", "high", "shared_error", "row_error"]
        table = pd.DataFrame([numbers], columns=names, index=["total"])
        return table.assign(rows=len(whole), note=note)

    def contrast(self, a: float | None = None, b: float | None = None, of: str = "mean") -> pd.DataFrame:
        """Rows at b against rows at a, covariates alike: difference, ratio, span_slope by estimate, low, high, note."""
        found = self.span_effect(a, b, of=of)
        names = ("difference", "ratio", "span_slope")
        return effect_table({name: getattr(found, name) for name in names}, name="effect")

    def span_effect(self, a: float | None = None, b: float | None = None, of: str = "mean") -> SpanEffect:
        """The same as numbers; a and b default to the question's span."""
        ends = tuple(
            _number(name, default if given is None else given, self.problem.focus)
            for name, given, default in zip(("a", "b"), (a, b), self.question.span, strict=True)
        )
        if ends[0] == ends[1]:
            raise ask.same_ends(ends[0], self.problem.focus)
        base, modifier = self._covariates()
        return span_effect(
            self.estimate, (ends[0], ends[1]), of=_target(of), level=self.question.level,
            errors=self.question.errors, base=base, modifier=modifier,
        )  # fmt: skip

    def slope(self, at: float | Sequence[float] | None = None, of: str = "mean") -> pd.DataFrame:
        """Slopes in units of y per unit of x: estimate, low, high, note, indexed by x, or one row "average".

        at: x values, averaged over covariates (two rows where one is a break); None: the average over the rows.
        """
        of = _target(of)
        asked = {"of": of, "level": self.question.level, "errors": self.question.errors}
        if at is None:
            return effect_table({"average": average(self.estimate, **asked)}, name=self.problem.focus)  # type: ignore[arg-type]
        xs = [_number("at", x, self.problem.focus) for x in (at if np.iterable(at) else [at])]
        base, modifier = self._covariates()
        found = slopes_along(self.estimate, xs, base=base, modifier=modifier, **asked)  # type: ignore[arg-type]
        table = effect_table({k: _sided(s) for k, s in enumerate(found)}, name=self.problem.focus)
        return table.set_axis(pd.Index([s.x for s in found], name=self.problem.focus), axis=0)

    def _labels(self) -> list[str]:
        """Plain names of the coefficients, then of the shape's searched constants."""
        est, base = self.estimate, list(self.problem.base_names)
        if est.shape.own_level and est.rows.intercept is not None:
            del base[est.rows.intercept]
        focal = est.shape.names(self.problem.focus, est.state, est.theta)
        crossed = [
            f"{name} × {modifier}" if modifier else name for modifier in self.problem.modifier_names for name in focal
        ]
        constants = est.shape.constant_words(self.problem.focus, self.problem.response)
        return [*base, *crossed, *constants[: est.moving]]

    def _covariates(self) -> tuple[Array | None, Array | None]:
        """Covariate rows to average over: those of `at`, or None, None for the rows' own."""
        return self.problem.profile or (None, None)

    def _level(self, level: float | None) -> float:
        if level is None:
            return self.question.level
        if not (isinstance(level, int | float) and 0 < level < 1):
            raise ask.not_a_level(level)
        return float(level)

    def _complete(
        self, x: Array, base: Array, modifier: Array, notes: tuple[str, ...]
    ) -> tuple[np.ndarray[Any, np.dtype[np.bool_]], list[str]]:
        """Which rows can be predicted (k,), and the notes, with words where the shape cannot take an x."""
        told = list(notes)
        given = np.isfinite(x) & np.isfinite(base).all(axis=1) & np.isfinite(modifier).all(axis=1)
        with np.errstate(all="ignore"):
            taken = np.isfinite(self.estimate.shape.columns(x, self.estimate.state, self.estimate.theta)).all(axis=1)
        for place in np.flatnonzero(given & ~taken):
            told[place] = _joined(told[place], f"{self.estimate.shape.key} cannot be taken at {x[place]:.6g}")
        return given & taken, told


def effect_table(effects: dict[Any, Effect], *, name: str) -> pd.DataFrame:
    """One row per effect: estimate, low, high, note."""
    return pd.DataFrame(
        [(e.estimate, e.low, e.high, e.note) for e in effects.values()],
        columns=["estimate", "low", "high", "note"],
        index=pd.Index(list(effects), name=name),
    )


def _sided(at: SlopeAt) -> Effect:
    """The slope, with the side told where x is a break."""
    side = f"{at.side} of the break" if at.side else ""
    return Effect(at.slope.estimate, at.slope.low, at.slope.high, _joined(side, at.slope.note))


def _target(of: str) -> str:
    if of not in ("mean", "median"):
        raise ask.one_of("of", of, ("mean", "median"))
    return of


def _number(name: str, given: Any, focus: str) -> float:
    if isinstance(given, bool) or not isinstance(given, int | float | np.number) or not math.isfinite(given):
        raise ask.not_a_number(f"{name} (a value of {focus})", given)
    return float(given)


def _joined(first: str, second: str) -> str:
    return "; ".join(part for part in (first, second) if part)
