"""Covariate rows of the groups that an answer is asked for: levels of a column, or named values of a number."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from batten.effects.groups import Group
from batten.effects.numbers import place
from batten.engine.rows import Array
from batten.errors import ask
from batten.frame.problem import Problem

__all__ = ["categorical", "covariate_rows", "groups_by", "interaction_groups", "masks_by", "said"]

#: a numeric moderator is shown at these quantiles
QUANTILES = (0.1, 0.5, 0.9)


def interaction_groups(problem: Problem) -> tuple[Group, ...]:
    """Groups of the first column that the focal predictor is multiplied with; () without an interaction."""
    for term in problem.design.terms:
        if term.has_focus:
            for factor in term.factors:
                for column in factor.columns:
                    if column != problem.focus and column in problem.covariates:
                        return groups_by(problem, column)
    return ()


def categorical(problem: Problem, column: str) -> bool:
    """Whether a covariate is read as groups."""
    values = problem.design.used(problem.index)[column]
    return not pd.api.types.is_numeric_dtype(values) or values.nunique() == 2 or _is_grouping(problem, column)


def groups_by(problem: Problem, column: str) -> tuple[Group, ...]:
    """One group per level of a column, each with its own rows; a number at its 10th, 50th and 90th percentile."""
    if column not in problem.covariates:
        raise ask.not_a_covariate(column, problem.covariates)
    if not categorical(problem, column):
        values = problem.design.used(problem.index)[column]
        return tuple(_at_value(problem, column, float(np.quantile(values, q))) for q in QUANTILES)
    rows = problem.rows
    return tuple(
        Group(f"{column} {said(level)}", rows.base[mask], rows.modifier[mask])
        for level, mask in masks_by(problem, column).items()
    )


def said(level: Any) -> str:
    """A level as people write it: numbers that stand for groups are read as floats, and 5.0 is 5."""
    return f"{level:g}" if isinstance(level, float) else str(level)


def masks_by(problem: Problem, column: str) -> dict[Any, np.ndarray[Any, np.dtype[np.bool_]]]:
    """Rows of each level (n,), in the order of the levels; levels without rows are left out."""
    if column not in problem.covariates:
        raise ask.not_a_covariate(column, problem.covariates)
    values = problem.design.used(problem.index)[column]
    levels = values.cat.categories if isinstance(values.dtype, pd.CategoricalDtype) else sorted(values.unique())
    masks = {level: (values == level).to_numpy(dtype=bool) for level in levels}
    return {level: mask for level, mask in masks.items() if mask.any()}


def covariate_rows(problem: Problem, at: dict[str, Any]) -> tuple[Array, Array]:
    """base (n, q) and modifier (n, m) of the rows with the named covariates set to the given values."""
    for column in at:
        if column not in problem.covariates:
            raise ask.not_a_covariate(column, problem.covariates)
    used = problem.design.used(problem.index)
    new = problem.new_rows(used.assign(**at))
    if not np.isfinite(new.base).all() or not np.isfinite(new.modifier).all():
        raise ask.cannot_hold(at, next((note for note in new.notes if note), ""))
    return new.base, new.modifier


def _at_value(problem: Problem, column: str, value: float) -> Group:
    base, modifier = covariate_rows(problem, {column: value})
    return Group(f"{column} {place(value, problem.unit(column))}", base, modifier)


def _is_grouping(problem: Problem, column: str) -> bool:
    """Whether the formula codes the column as groups."""
    factors = [f for term in problem.design.terms for f in term.factors if column in f.columns]
    return any(f.kind == "categorical column" for f in factors)
