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

#: rows whose means over all pairs of fitted value and error are taken as they stand
FEW = 300

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

    def as_text(self, column: str) -> bool:
        """Whether a column's numbers are stored as text."""
        return any(f"{column} (stored as text)" in told for told in self.problem.announcements)

    @property
    def link(self) -> bool:
        return self.est.link is not None

    @property
    def kind(self) -> str:
        """How a fitted value becomes a mean: "identity", "exp", "square", "pairs", or the family of a link."""
        if self.est.link is not None:
            return self.est.link.family
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
        """Steps in the searched constants for numeric slopes ("1e-7"), at a break short of the next row above it."""
        x = self.est.rows.x
        low, high = self.est.shape.bounds(x, self.est.state)
        found = []
        for theta, width in zip(self.est.theta[: len(self.searched)], high - low, strict=False):
            size = max(abs(theta), 1e-3 * width)
            if self.est.shape.corners:
                size = min(size, 1e4 * float((x[x > theta] - theta).min()))
            found.append(f"1e{math.floor(math.log10(1e-5 * size))}")
        return tuple(found)

    @property
    def smooth(self) -> bool:
        """Whether the curve is penalised."""
        return self.est.roughness is not None

    @property
    def power(self) -> bool:
        """Whether a power of y was searched."""
        return bool(self.est.remedy.left.searched)

    @property
    def parameters(self) -> str:
        """Name of all that was estimated: the coefficients b, or p with a searched power of y."""
        return "p" if self.power else "b"

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
    def weighted(self) -> bool:
        """Whether rows count by weights, given or learned."""
        return self.est.rows.weights is not None

    @property
    def weigher(self) -> str:
        """The column that weights come from, a weight or an exposure, or ""."""
        beside = self.problem.beside
        return beside.exposure or (beside.weights or "") * (beside.weights_kind == "variance")

    @property
    def clustered(self) -> bool:
        """Whether clusters are left out in the place of rows, as links and powers always ask."""
        return self.est.rows.cluster is not None and (self.robust or self.link or self.power)

    @property
    def grouped(self) -> bool:
        """Whether the script needs to know which rows belong together."""
        shares = not (self.kind == "identity" and self.steady) and self.bounded and not self.deletes
        return self.clustered or (self.est.rows.cluster is not None and shares)

    @property
    def unit(self) -> str:
        """What is left out in turn."""
        return "cluster" if self.clustered else "row"

    @property
    def few(self) -> str:
        """Source of the factor of few clusters in a sum of squares, or ""."""
        return "(1 - 1 / len(without)) * " if self.clustered else ""

    @property
    def own_table(self) -> bool:
        """Whether statsmodels' own standard errors are not the ones in use."""
        if self.link:
            return self.robust or bool(self.searched) or self.weighted
        return bool(self.searched) or self.alone or self.uneven or self.weighted or self.clustered

    @property
    def triangle(self) -> bool:
        """Whether the script decomposes the design itself, where refits by statsmodels do not serve or take long."""
        if self.link:
            # statsmodels takes the slope of an inverse link, which falls, as rising
            own = self.alone or self.weighted or self.clustered
            return own or self.kind == "invlink" or bool(self.searched)
        rough = bool(self.searched) and (self.power or self.est.n > FEW or self.mixed or not self.level_there)
        rough = rough or self.alone or self.uneven or self.weighted or self.clustered
        return rough or not self.ordered or (self.many and self.uses_without)

    @property
    def row_t_name(self) -> str:
        """Name of the t quantile of a further row's interval, which clusters leave alone."""
        return self.t_name if self.est.df_error == self.est.df_residual else f"{self.t_name}_ROW"

    @property
    def row_t_quantile(self) -> float:
        return float(student.ppf(0.5 + self.question.level / 2, self.est.df_residual))

    @property
    def needs_s2(self) -> bool:
        """Whether the error variance on the fitting scale is used."""
        if self.link:
            return not self.robust and (bool(self.searched) or self.weighted)
        return not self.ordered

    @property
    def steady(self) -> bool:
        """Whether the change over the span is the same in all rows, on the fitting scale."""
        modifier = self.est.rows.modifier
        return self.fixed or bool((modifier == modifier[:1]).all())

    @property
    def tested(self) -> bool:
        """Whether the effect is a combination of coefficients for which statsmodels' own covariance serves."""
        own = self.searched or self.deletes or self.smooth or self.alone or self.uneven
        own = own or self.weighted or self.clustered
        return self.kind == "identity" and self.steady and self.ordered and not own

    @property
    def uses_without(self) -> bool:
        """Whether the coefficients without each row are used."""
        predicted = self.ordered and not self.many
        return self.power or (self.robust and (predicted or self.own_table or (self.bounded and not self.tested)))

    @property
    def few_pairs(self) -> bool:
        """Whether the errors of all rows can be added to all fitted values, again for every row left out."""
        return self.est.n <= FEW or (self.single and not self.many)

    @cached_property
    def uneven(self) -> bool:
        """Whether columns differ so much in size that a pseudo-inverse (statsmodels' default) loses digits."""
        return not self.link and self._spread_of_sizes(len(self.est.coef)) > 1e6

    @cached_property
    def level_there(self) -> bool:
        """Whether the fit also has the smallest squares of the linear one around it, so that refits of that serve.

        At a corner of the squares, where a break lies on a row, it has not.
        """
        step = (
            np.linalg.solve(self.est.factored.r, self.est.factored.q.T @ self.est.residual) / self.est.factored.length
        )
        return bool((np.abs(step) <= 1e-11 * np.linalg.norm(self.est.moves(), axis=0)[: len(step)]).all())

    @cached_property
    def mixed(self) -> bool:
        """The same with the columns of searched constants."""
        return self._spread_of_sizes(len(self.est.coef) + len(self.searched)) > 1e6

    def _spread_of_sizes(self, p: int) -> float:
        """Condition of the first p columns as they stand, in their own units."""
        raw = self.est.factored.r[:p, :p] * self.est.factored.length[:p]
        return float(np.linalg.cond(raw))

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
