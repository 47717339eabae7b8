"""What every section of a script needs to know about one fit, read off once."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.stats import t as student

from batten.emit.covariates import Covariates, write_covariates
from batten.emit.numbers import Numbers, numbers
from batten.emit.text import PLACE, said
from batten.families.base import Code
from batten.families.numbers import plain
from batten.fit.estimate import Estimate
from batten.fit.means import jackknifed
from batten.fit.predict import DELETIONS_ROWS, rows_needed
from batten.fit.question import Question
from batten.frame.problem import Problem

__all__ = ["Parts", "read_parts"]

_RESPONSES = {"y": "y", "log y": "log_y", "sqrt y": "root_y", "1/y": "inverse_y", "y^2": "square_y"}


@dataclass(frozen=True, eq=False)
class Parts:
    """One fit for the writer of its script. x, y: the columns' names for comments."""

    problem: Problem
    question: Question
    est: Estimate
    covariates: Covariates
    shape: Code
    left: Code
    numbers: Numbers
    x: str
    y: str

    @property
    def frame(self) -> str:
        """Stands for the user's frame, at its width, until no name of the script can be taken for it."""
        return PLACE * len(self.problem.frame_name)

    @property
    def link(self) -> bool:
        return self.est.link is not None

    @property
    def kind(self) -> str:
        """How a fitted value becomes a mean: "identity", "exp", "square", "pairs", "log link", "share"."""
        if self.est.link is not None:
            return "log link" if self.est.link.reading == "ratio" else "share"
        return self.est.scale.closed or "pairs"

    @property
    def response(self) -> str:
        """What the fitted response is called in the script's formula."""
        return "y" if self.link else _RESPONSES.get(self.est.remedy.left.key, "z")

    @property
    def columns(self) -> tuple[str, ...]:
        """Plain names of the shape's columns."""
        return tuple(name for name, _ in self.shape.columns)

    @cached_property
    def searched(self) -> tuple[str, ...]:
        """Names of the shape's constants that were searched and move the fitted values smoothly."""
        if self.est.shape.finite:
            return ()
        left = {name: value for name, value, _ in self.shape.constants}
        found = []
        for theta in self.est.theta:
            name = next(name for name, value in left.items() if value == plain(theta))
            del left[name]
            found.append(name)
        return tuple(found)

    @cached_property
    def steps(self) -> tuple[str, ...]:
        """Steps in the searched constants for numeric slopes, as exponents (e-7)."""
        low, high = self.est.shape.bounds(self.est.rows.x, self.est.state)
        sizes = [max(abs(t), 1e-3 * width) for t, width in zip(self.est.theta, high - low, strict=True)]
        return tuple(f"e{math.floor(math.log10(1e-5 * size))}" for size in sizes[: len(self.searched)])

    @property
    def power(self) -> bool:
        """Whether a power of y was searched."""
        return bool(self.est.remedy.left.searched)

    @property
    def robust(self) -> bool:
        return self.question.errors == "robust"

    @property
    def deletes(self) -> bool:
        """Whether the span's interval leaves out each row in turn."""
        return self.robust and jackknifed(self.est)

    @property
    def ordered(self) -> bool:
        """Whether a new row's interval comes from ordered errors (else from the t distribution)."""
        return self.link or (self.robust and self.est.n >= rows_needed(self.question.level))

    @property
    def many(self) -> bool:
        """Whether there are too many rows for a left-out fit to matter to a new row."""
        return self.est.n > DELETIONS_ROWS

    @cached_property
    def rank(self) -> int:
        """Place of an interval's end among the ordered values, counted from either side, from zero."""
        n, level = self.est.n, self.question.level
        level = min(level, 1 - 2 / (n + 1)) if self.link else level
        return int(np.floor((1 - level) / 2 * (n + 1) + 1e-9)) - 1

    @cached_property
    def t_quantile(self) -> float:
        return float(student.ppf(0.5 + self.question.level / 2, self.est.df_error))

    @property
    def t_name(self) -> str:
        """Name of the t quantile in the script, T95."""
        return f"T{100 * self.question.level:.10g}".replace(".", "_")

    @property
    def needs_s2(self) -> bool:
        """Whether the error variance on the fitting scale is used."""
        return not self.link and (not self.robust or not self.ordered)

    @property
    def own_table(self) -> bool:
        """Whether statsmodels' own standard errors are not the ones in use."""
        return self.link or bool(self.searched) or self.power or self.alone or self.uneven

    @cached_property
    def uneven(self) -> bool:
        """Whether columns differ so much in size that a pseudo-inverse (statsmodels' default) loses digits."""
        p = len(self.est.coef)
        raw = self.est.factored.r[:p, :p] * self.est.factored.length[:p]
        return not self.link and bool(np.linalg.cond(raw) > 1e6)

    @cached_property
    def delicate(self) -> bool:
        """Whether single coefficients hang on the last digits, so that only what they add up to can be checked."""
        return bool(np.linalg.cond(self.est.factored.r) > 1e8)

    @property
    def alone(self) -> bool:
        """Whether a row owns a coefficient, so that it cannot be left out (its leverage is 1)."""
        return float(self.est.leverage.max()) > 1 - 1e-7

    @property
    def leverages(self) -> str:
        """Source of the leverages, below 1."""
        return "np.minimum((Q**2).sum(axis=1), 1 - 1e-9)" if self.alone else "(Q**2).sum(axis=1)"

    @property
    def bounded(self) -> bool:
        """Whether the effect over the span has an interval."""
        return math.isfinite(self.numbers.span.difference.high - self.numbers.span.difference.low)

    @property
    def percent(self) -> str:
        return f"{100 * self.question.level:.10g}%"

    @cached_property
    def single(self) -> bool:
        """Whether all rows share one covariate pattern, so that nothing is averaged over covariates."""
        base, modifier = self.problem.profile or (self.est.rows.base, self.est.rows.modifier)
        return bool((base == base[:1]).all() and (modifier == modifier[:1]).all())

    @property
    def fixed(self) -> bool:
        """Whether the covariates averaged over do not depend on which rows are kept."""
        return self.single or self.problem.profile is not None


def read_parts(problem: Problem, question: Question, est: Estimate) -> Parts:
    """Read a fit for its script."""
    x, y = said(problem.focus), said(problem.response)
    shape = est.shape.code(x, est.state, est.theta)
    left = est.link.code(y) if est.link is not None else est.scale.code(y, est.c)
    covariates = write_covariates(
        problem.design, own_level=est.shape.own_level, taken=[*(name for name, _ in shape.columns), "x", "y"]
    )
    return Parts(problem, question, est, covariates, shape, left, numbers(problem, question, est), x, y)
