"""Problems built by hand, for tests of the facade that need no formula."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from batten.engine.rows import Rows
from batten.exam.fit import Fit
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.question import Question
from batten.frame.problem import NewRows, Problem

__all__ = ["fit_of", "problem_of"]


@dataclass(frozen=True)
class NumericDesign:
    """Codes frames whose covariates are all numeric: [1, covariates]."""

    focus: str
    covariates: tuple[str, ...]
    span: tuple[float, float]

    def new_rows(self, frame: pd.DataFrame) -> NewRows:
        x = frame[self.focus].to_numpy(float)
        base = np.column_stack([np.ones(len(x)), *(frame[c].to_numpy(float) for c in self.covariates)])
        beyond = (x < self.span[0]) | (x > self.span[1])
        notes = tuple(
            "missing value" if np.isnan(v) else "outside the data" if out else ""
            for v, out in zip(x, beyond, strict=True)
        )
        return NewRows(x=x, base=base, modifier=np.ones((len(x), 1)), index=frame.index, notes=notes)


def problem_of(frame: pd.DataFrame, response: str, focus: str, *covariates: str, **units: str) -> Problem:
    x, y = frame[focus].to_numpy(float), frame[response].to_numpy(float)
    base = np.column_stack([np.ones(len(x)), *(frame[c].to_numpy(float) for c in covariates)])
    return Problem(
        formula=f"{response} ~ {' + '.join([focus, *covariates])}", response=response, focus=focus,
        covariates=covariates, rows=Rows(y=y, x=x, base=base, modifier=np.ones((len(x), 1))), index=frame.index,
        left_out=pd.DataFrame({"why": []}), announcements=(), units=units, base_names=("Intercept", *covariates),
        modifier_names=("",), zero_is_arbitrary=False,
        design=NumericDesign(focus, covariates, (float(x.min()), float(x.max()))),  # type: ignore[arg-type]
    )  # fmt: skip


def fit_of(key: str, problem: Problem, **asked: object) -> Fit:
    done = estimate(problem.rows, parse(key))
    assert isinstance(done, Estimate), done
    return Fit(problem, Question(**asked), done)  # type: ignore[arg-type]
