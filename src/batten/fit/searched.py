"""What the engine searches on: weighted designs, a shape's search, a scale's power."""

from __future__ import annotations

import numpy as np

from batten.engine.linear import design
from batten.engine.power import Power
from batten.engine.rows import Array, Rows
from batten.engine.search import Searched
from batten.families.base import Constants, Scale, Shape

__all__ = ["scale_power", "searched_model", "weighted_design"]


def weighted_design(rows: Rows, shape: Shape, state: Constants, theta: Constants) -> Array:
    """The rows' design (n, p) under a shape's constants, every row times sqrt(w)."""
    return rows.weigh(design(rows, shape.columns(rows.x, state, theta), own_level=shape.own_level))


def searched_model(rows: Rows, shape: Shape, state: Constants) -> Searched:
    """The shape's search on these rows, for variable projection."""
    none = np.empty((rows.count, 0))
    lower, upper = shape.bounds(rows.x, state)
    alone = rows.modifier.shape[1] == 1 and bool((rows.modifier == 1).all())
    bare = Rows(rows.y, rows.x, none, rows.modifier, None, False)

    def columns(t: Array) -> Array:
        found = shape.columns(rows.x, state, tuple(t))
        return rows.weigh(found if alone else design(bare, found))

    def slopes(t: Array) -> Array:
        found = shape.theta_slopes(rows.x, state, tuple(t))
        return np.stack([rows.weigh(s if alone else design(bare, s)) for s in found])

    return Searched(
        fixed=rows.weigh(design(rows, none, own_level=shape.own_level)), columns=columns, slopes=slopes,
        candidates=shape.candidates(rows.x, state),
        rebuild=lambda which: searched_model(rows.take(which), shape, state), lower=lower, upper=upper,
        finite=shape.finite, corners=np.unique(rows.x) if shape.corners else None,
    )  # fmt: skip


def scale_power(scale: Scale, rows: Rows) -> Power:
    """The scale of these rows' responses seen as a one-constant family, for the likelihood search."""
    low, high = scale.search()
    return Power(lambda y, v: rows.weigh(scale.forward(y, (v,))), lambda y, v: scale.log_jacobian(y, (v,)), low, high)
