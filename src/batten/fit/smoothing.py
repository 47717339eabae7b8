"""The penalty of a shape on the coefficients of a whole design, one curve for each kind of row."""

from __future__ import annotations

import numpy as np

from batten.engine.penalised import penalty_rows
from batten.engine.rows import Array, Ints, Rows
from batten.families.base import Constants, Shape

__all__ = ["curves_of", "roughness_rows"]


def curves_of(rows: Rows) -> tuple[Array, Ints]:
    """The different curves of the focal predictor: a modifier row of each (u, m), and every row's own curve (n,)."""
    first, _, pattern = rows.patterns
    curves, code = np.unique(rows.modifier[first], axis=0, return_inverse=True)
    return curves, code.reshape(-1).astype(np.intp)[pattern]


def roughness_rows(rows: Rows, shape: Shape, state: Constants) -> Array | None:
    """Rows D (r, p) with D'D the roughness of all curves, to be weighed against the data; None for other shapes.

    All curves of an interaction share one weight, and each counts once, however many rows have it.
    """
    penalty = shape.penalty(state)
    return None if penalty is None else penalty_rows(penalty, curves_of(rows)[0], rows.base.shape[1])
