"""Factors worked out on rows: numbers (n, width) or level codes (n,)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd

from batten.engine.rows import Array, Ints
from batten.errors import InputError
from batten.errors import formula as errors
from batten.frame.columns import Bools, match_levels, plain
from batten.frame.formula import Recipe

__all__ = ["check_row_by_row", "unknown", "worked_out", "worked_out_in_parts"]

Values = Array | Ints


def worked_out(recipe: Recipe, data: Mapping[str, Any], count: int, *, label: str) -> Values:
    """A factor on `count` rows; refused with words when its text fails or gives another number of values."""
    try:
        value = recipe.evaluate(data)
        made = _codes(value, recipe.levels) if recipe.levels is not None else _numbers(value)
    except Exception as error:  # the text is the user's own Python: anything can happen in it
        raise errors.not_worked_out(label, f"{type(error).__name__}: {error}") from None
    if len(made) != count:
        raise errors.wrong_length(label, len(made), count)
    return made


def worked_out_in_parts(recipe: Recipe, data: Mapping[str, Any], count: int, *, label: str) -> Values:
    """As `worked_out`, but rows that fail (a spline outside its knots) become unknown instead of stopping the rest."""
    try:
        return worked_out(recipe, data, count, label=label)
    except InputError:
        if count > 1:
            half = count // 2
            parts = (slice(None, half), half), (slice(half, None), count - half)
            return np.concatenate([worked_out_in_parts(recipe, _cut(data, s), k, label=label) for s, k in parts])
    return np.full((count, recipe.width), np.nan) if recipe.levels is None else np.full(count, -1)


def unknown(values: Values) -> Bools:
    """Rows (n,) where a factor is no finite number or no level."""
    return np.asarray(values < 0 if values.ndim == 1 else ~np.isfinite(values).all(axis=1))


def check_row_by_row(recipe: Recipe, data: Mapping[str, Any], values: Values, *, label: str) -> None:
    """Refuse a factor whose value in a row hangs on the other rows: it would mean something else in a new frame.

    Tried on every second row and on those between (of the first 20,000): no single row that others hang on, such as the
    first or the largest, is in both halves.
    """
    for half in (slice(0, 20_000, 2), slice(1, 20_000, 2)):
        part = values[half]
        again = worked_out(recipe, _cut(data, half), len(part), label=label)
        # a user's function may add in another order on fewer rows; that moves the last digits only
        scale = float(np.nanmax(np.abs(part), initial=0.0))
        if not np.allclose(part, again, rtol=1e-9, atol=1e-12 * scale, equal_nan=True):
            raise errors.depends_on_other_rows(label)


def _cut(data: Mapping[str, Any], rows: slice) -> dict[str, Any]:
    """Some rows of every column; series get a fresh index, as in a frame of their own."""
    return {
        name: values[rows].reset_index(drop=True) if isinstance(values, pd.Series) else values[rows]
        for name, values in data.items()
    }


def _numbers(value: Any) -> Array:
    numbers = np.asarray(value, dtype=np.float64)
    return numbers[:, None] if numbers.ndim == 1 else np.atleast_2d(numbers)


def _codes(value: Any, levels: tuple[Any, ...]) -> Ints:
    codes, found = pd.factorize(pd.Series(value))
    return match_levels(codes, plain(found), levels)
