"""Covariates held at asked values: the same rows, with those columns changed and coded again."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd

from batten.engine.rows import Array
from batten.errors import data as errors
from batten.frame.problem import Problem

__all__ = ["profile_at"]

_YES_NO = {"true": True, "yes": True, "1": True, "false": False, "no": False, "0": False}


def profile_at(problem: Problem, at: Mapping[str, Any]) -> tuple[Array, Array]:
    """base (n, q) and modifier (n, m) of the analysis rows with covariates set to the asked values."""
    frame = problem.design.used(problem.index)
    for name, value in at.items():
        if name not in problem.covariates:
            raise errors.at_no_covariate(name, problem.focus, problem.covariates)
        frame[name] = _as_stored(value, frame[name])
    new = problem.new_rows(frame)
    if np.isnan(new.x).any():
        raise errors.at_unusable(at, next(note for note in new.notes if note))
    return new.base, new.modifier


def _as_stored(value: Any, column: pd.Series[Any]) -> Any:
    """A value typed as text (age=30), as the column would have it."""
    if not isinstance(value, str):
        return value
    if pd.api.types.is_bool_dtype(column.dtype):
        return _YES_NO.get(value.lower(), value)
    if pd.api.types.is_numeric_dtype(column.dtype):
        try:
            return float(value)
        except ValueError:
            return value
    if pd.api.types.is_datetime64_any_dtype(column.dtype):
        return pd.to_datetime(value, errors="coerce")
    return value
