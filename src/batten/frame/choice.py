"""The choice of rows, an expression as for DataFrame.query."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
from pandas.errors import UndefinedVariableError

from batten.errors import data as errors
from batten.frame.columns import Bools
from batten.frame.tables import Table

__all__ = ["chosen_rows"]


def chosen_rows(expression: str, table: Table, env: Mapping[str, Any] | None) -> Bools:
    """Rows (n,) for which the expression holds; where it is missing it does not. `@name` is looked up in env."""
    named = [name for name in table.counts if str(name) in expression]
    frame = table.frame(named)
    try:
        answer = frame.eval(expression, engine="python", local_dict=dict(env or {}), global_dict={})
    except UndefinedVariableError as error:
        name = (re.findall(r"'(.+?)'", str(error)) or [""])[0]
        raise errors.rows_not_read(expression, str(error), table.names, name) from None
    except Exception as error:  # whatever pandas makes of a text that people type
        raise errors.rows_not_read(expression, str(error).strip("'\"") or type(error).__name__, table.names) from None
    if not isinstance(answer, pd.Series) or not pd.api.types.is_bool_dtype(answer.dtype) or len(answer) != len(table):
        raise errors.rows_not_yes_no(expression)
    return np.asarray(answer.astype("boolean").fillna(False), dtype=bool)
