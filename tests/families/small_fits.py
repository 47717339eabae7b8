"""Least squares with a member's columns, by a route of its own: the tests hold members against published fits."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from scipy.optimize import least_squares

from batten.families.base import Array, Constants, Shape


class SmallFit(NamedTuple):
    theta: Constants
    coef: Array
    rss: float
    state: Constants


def linear(design: Array, y: Array) -> tuple[Array, float]:
    """Coefficients and residual sum of squares, columns scaled first."""
    length = np.linalg.norm(design, axis=0)
    coef = np.linalg.lstsq(design / length, y, rcond=None)[0]
    return coef / length, float(np.sum((y - design / length @ coef) ** 2))


def fit(shape: Shape, x: Array, y: Array, *, constant: bool = True) -> SmallFit:
    """Grid of the shape's candidates, the five best refined by a general-purpose optimiser on the profile."""
    state = shape.learn(x, constant=constant)

    def design(theta: Array) -> Array:
        columns = shape.columns(x, state, tuple(float(t) for t in theta))
        return np.column_stack([np.ones_like(x), columns]) if constant and not shape.own_level else columns

    def residual(theta: Array) -> Array:
        columns = design(theta)
        return y - columns @ linear(columns, y)[0]

    starts = sorted(shape.candidates(x, state), key=lambda t: linear(design(t), y)[1])[:5]
    if shape.searched and not shape.finite:
        low, high = shape.bounds(x, state)
        inside = np.clip(starts, low + 1e-9 * (high - low), high - 1e-9 * (high - low))
        tight = {"xtol": 1e-15, "ftol": 1e-15, "gtol": 1e-15, "jac": "3-point"}
        solved = [
            least_squares(residual, s, bounds=(low, high), x_scale=np.maximum(np.abs(s), 1e-3), **tight) for s in inside
        ]
        starts = [min(solved, key=lambda s: s.cost).x]
    theta = tuple(float(t) for t in starts[0])
    coef, rss = linear(design(starts[0]), y)
    return SmallFit(theta, coef, rss, state)
