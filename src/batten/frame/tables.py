"""The user's table, whatever library made it, as pandas columns; never changed, never kept."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import narwhals as nw
import numpy as np
import pandas as pd

from batten.errors import data as errors

__all__ = ["Table", "open_table"]


@dataclass(frozen=True, eq=False)
class Table:
    """names: of all columns, in order. index: row labels (n,). source: what columns are fetched from."""

    names: tuple[Any, ...]
    index: pd.Index[Any]
    source: Any

    @cached_property
    def counts(self) -> Counter[Any]:
        """How many columns have a name."""
        return Counter(self.names)

    def __len__(self) -> int:
        return len(self.index)

    def frame(self, names: Iterable[Any]) -> pd.DataFrame:
        """Some columns as pandas, with the table's index; a name that stands for several columns is refused."""
        wanted = list(dict.fromkeys(names))
        for name in wanted:
            if self.counts[name] > 1:
                raise errors.duplicate_column(name, self.counts[name])
        if isinstance(self.source, pd.DataFrame):
            return self.source[wanted]
        # an empty selection would lose the number of rows
        return self.source.select(wanted).to_pandas().set_axis(self.index) if wanted else pd.DataFrame(index=self.index)

    def start(self, name: str, rows: int) -> pd.Series[Any]:
        """The first rows of one column."""
        if isinstance(self.source, pd.DataFrame):
            return self.source[name].iloc[:rows]
        first: pd.DataFrame = self.source.select(name).head(rows).to_pandas()
        return first[name]

    def kinds(self) -> dict[Any, str]:
        """Rough kind of every column from its type: "whole", "text", "dates" or ""; names used twice are left out."""
        if isinstance(self.source, pd.DataFrame):
            kinds = [_pandas_kind(dtype) for dtype in self.source.dtypes]
        else:
            kinds = [_narwhals_kind(dtype) for dtype in self.source.schema.values()]
        return {name: kind for name, kind in zip(self.names, kinds, strict=True) if self.counts[name] == 1}


def open_table(data: Any) -> Table:
    """pandas, a dict of columns, or what narwhals reads (polars, Arrow, ...; lazy frames are collected)."""
    if isinstance(data, Mapping):
        data = _from_dict(data)
    if isinstance(data, pd.DataFrame):
        return Table(tuple(data.columns), data.index, data)
    try:
        source = nw.from_native(data)
    except TypeError:
        raise errors.not_a_table(type(data).__name__) from None
    if isinstance(source, nw.LazyFrame):
        source = source.collect()
    return Table(tuple(source.columns), pd.RangeIndex(len(source)), source)


def _from_dict(data: Mapping[Any, Any]) -> pd.DataFrame:
    columns = {name: _unlabelled(values) for name, values in data.items()}
    lengths = [(str(name), len(values)) for name, values in columns.items()]
    if len({length for _, length in lengths}) > 1:
        raise errors.unequal_lengths(lengths)
    return pd.DataFrame(columns)


def _unlabelled(values: Any) -> Any:
    """Labels of pandas columns would be aligned, which could mix rows; a single value is a column of one row."""
    if isinstance(values, pd.Series):
        return values.reset_index(drop=True)
    if isinstance(values, str) or not hasattr(values, "__len__"):
        return [values]
    return values if isinstance(values, list | tuple | pd.api.extensions.ExtensionArray) else np.asarray(values)


def _pandas_kind(dtype: Any) -> str:
    if pd.api.types.is_integer_dtype(dtype):
        return "whole"
    if pd.api.types.is_datetime64_any_dtype(dtype) or isinstance(dtype, pd.PeriodDtype):
        return "dates"
    texts = pd.api.types.is_object_dtype(dtype) or pd.api.types.is_string_dtype(dtype)
    return "text" if texts or isinstance(dtype, pd.CategoricalDtype) else ""


def _narwhals_kind(dtype: Any) -> str:
    if dtype.is_integer():
        return "whole"
    if dtype.is_temporal():
        return "dates" if dtype in (nw.Date, nw.Datetime) else ""
    return "text" if dtype in (nw.String, nw.Categorical, nw.Enum, nw.Object) else ""
