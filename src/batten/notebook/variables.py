"""Data frames among the variables of a session."""

from __future__ import annotations

from collections.abc import Mapping
from numbers import Number
from types import FunctionType, ModuleType
from typing import Any

import numpy as np
import pandas as pd

from batten.errors import InputError
from batten.errors import magic as errors
from batten.exam import Examination, Fit
from batten.frame.tables import open_table

__all__ = ["column_names", "find_frame", "frame_names"]

#: tables whose columns are known at once, by library and class, and the attribute that lists them
_TABLES = {("pandas", "DataFrame"): "columns", ("polars", "DataFrame"): "columns", ("pyarrow", "Table"): "column_names"}

_KINDS: tuple[tuple[Any, str], ...] = (
    (Examination, "an examination"), (Fit, "a fit"), (bool, "a yes/no value"), (Number, "a number"), (str, "text"),
    (pd.Series, "one column (a Series)"), (np.ndarray, "an array"), (ModuleType, "a module"),
    (FunctionType, "a function"), (type(None), "None"),
)  # fmt: skip


def column_names(value: object) -> list[str] | None:
    """Names of a table's columns, those that are text; None for what is no table, or must first be computed."""
    for kind in type(value).__mro__:
        attribute = _TABLES.get((kind.__module__.partition(".")[0], kind.__name__))
        if attribute:
            return [name for name in getattr(value, attribute) if isinstance(name, str)]
    return None


def frame_names(variables: Mapping[str, Any]) -> list[str]:
    """Variables that are data frames, sorted; not what IPython keeps under names with underscores."""
    # a copy: other threads may define variables meanwhile
    return sorted(
        name for name, value in dict(variables).items() if not name.startswith("_") and column_names(value) is not None
    )


def find_frame(name: str, variables: Mapping[str, Any], *, subcommands: tuple[str, ...] = ()) -> Any:
    """The table of that name, or an error that names the tables there are."""
    frames = frame_names(variables)
    if not name:
        raise errors.no_frame_name(frames)
    if not name.isidentifier():
        raise errors.not_a_name(name)
    if name not in variables:
        raise errors.no_variable(name, frames, subcommands=subcommands)
    value = variables[name]
    if isinstance(value, dict) or column_names(value) is not None:
        return value
    if isinstance(value, Mapping):  # not a dict: an examination, say
        raise errors.not_a_frame(name, _kind(value), frames)
    try:
        # a table of another library; a lazy one is computed here, once
        return open_table(value).source
    except InputError:
        raise errors.not_a_frame(name, _kind(value), frames) from None


def _kind(value: object) -> str:
    """What a value is, in words."""
    return next((words for kind, words in _KINDS if isinstance(value, kind)), f"of the type {type(value).__name__}")
