"""Domain guard: what a remedy cannot bring back, found before anybody reads a number."""

from __future__ import annotations

from typing import Literal

import numpy as np

from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families.base import Constants, Link, Scale, Shape
from batten.families.remedy import Remedy

__all__ = [
    "aliased",
    "domain_trouble",
    "edge",
    "meets_constant",
    "no_error_left",
    "not_offered",
    "not_settled",
    "reaches",
    "too_few",
]

#: rows that each penalised curve needs
HELD = 5


def meets_constant(rows: Rows, shape: Shape) -> bool:
    """Whether the shape meets a constant: for one that brings its own level, only a column that it replaces counts."""
    return rows.intercept is not None if shape.own_level else rows.constant


def not_offered(remedy: Remedy) -> Refusal | None:
    """Members that the grammar knows and this version cannot fit yet."""
    if remedy.weighted and (remedy.left.key != "y" or remedy.shape.searched):
        return Refusal(
            "Weights learned from the spread go with y itself, on a shape without searched constants.",
            f"{remedy.key}: a scale or link of y changes its spread already, and a search would move with the weights.",
            "weighted y ~ x, or weighted y on a spline; or this remedy without weights, whose errors are robust.",
        )  # fmt: skip
    if remedy.shape.group == "smooth" and remedy.weighted:
        return Refusal(
            "Weights learned from the spread do not go with a penalised curve.", f"{remedy.key}.",
            "y ~ smooth x, whose errors are robust, or weighted y ~ spline4 x.",
        )  # fmt: skip
    if remedy.shape.group == "smooth" and remedy.left.searched:
        return Refusal(
            "A power of y and the roughness of a curve are not searched together.", f"{remedy.key}.",
            "The same curve with the power given: boxcox(0.5) y ~ smooth x, log y ~ smooth x.",
        )  # fmt: skip
    if remedy.shape.group == "smooth" and isinstance(remedy.left, Link):
        return Refusal(
            "A smooth curve under a link is not offered.", f"{remedy.key}.",
            "log y ~ smooth x, or a spline with few knots under the link: spline4 x.",
        )  # fmt: skip
    return None


def too_few(rows: Rows, remedy: Remedy) -> Refusal | None:
    """A fit needs rows beyond its columns; under a penalty, which holds any number, a handful for each curve."""
    state = remedy.shape.learn(rows.x, constant=meets_constant(rows, remedy.shape))
    start = tuple(remedy.shape.candidates(rows.x, state)[0])
    shape_columns = remedy.shape.columns(rows.x[:1], state, start).shape[1]
    if remedy.shape.penalty(state) is not None:
        shape_columns = min(shape_columns, HELD)
    base = rows.base.shape[1] - (1 if remedy.shape.own_level and rows.intercept is not None else 0)
    needed = base + shape_columns * rows.modifier.shape[1] + len(remedy.shape.searched) + len(remedy.left.searched)
    if rows.count > needed + 1:
        return None
    return Refusal(
        wrong="Too few rows for this remedy.",
        seen=f"{rows.count} rows for {needed} constants and the error.",
        instead="A shape with fewer constants.",
    )


def no_error_left(remedy: Remedy, n: int, df: float) -> Refusal | None:
    """A penalised curve may come out so free that it runs through every row."""
    if df >= 1:
        return None
    return Refusal(
        wrong="The curve runs through the rows and leaves nothing over for the error.",
        seen=f"{remedy.key} takes {n - df:.1f} degrees of freedom of {n} rows.",
        instead="A spline with few knots: spline3 x.",
    )


def reaches(
    scale: Scale, c: Constants, eta: tuple[float, float], residual: tuple[float, float]
) -> Literal["", "fits", "errors"]:
    """What leaves the scale's limits: fitted values, or fitted values plus errors beyond an open end; "" for neither.

    eta, residual: lowest and highest. A closed end is kept to; an open one, where the inverse is infinite, must not be
    reached.
    """
    low, high = scale.limits(c)
    if not eta[0] > low or not eta[1] < high:
        return "fits"
    passed = [low] if eta[0] + residual[0] <= low else []
    passed += [high] if eta[1] + residual[1] >= high else []
    with np.errstate(all="ignore"):
        kept = all(np.isfinite(scale.inverse(np.array([edge]), c)[0]) for edge in passed)
    return "" if kept else "errors"


def domain_trouble(scale: Scale, c: Constants, eta: Array, residual: Array) -> Refusal | None:
    """Whether fitted values, or fitted values plus a residual, leave what the scale can undo.

    A closed lower boundary (sqrt, Box-Cox with a positive power) takes residuals beyond it, at the boundary; an open
    one (1/y, a negative power) does not: the mean would not exist (Poirier 1978 on Box-Cox).
    """
    how = reaches(scale, c, (float(eta.min()), float(eta.max())), (float(residual.min()), float(residual.max())))
    if not how:
        return None
    low, high = scale.limits(c)
    outside = int(((eta <= low) | (eta >= high)).sum())
    if how == "fits":
        worst = eta.min() if np.isfinite(low) else eta.max()
        return Refusal(
            wrong=f"Fitted values leave what {scale.key} can undo.",
            seen=f"{outside} of {len(eta)} fitted values have no y to go back to ({worst:.4g} on the fitted scale).",
            instead="log y or a log link, whose fitted values can always be brought back.",
        )
    return Refusal(
        wrong=f"The mean cannot be brought back from {scale.key}.",
        seen="A fitted value plus a residual seen in these rows has no finite value of y: only a median would exist.",
        instead="log y or a log link, whose mean always exists.",
    )


def not_settled(shape: Shape) -> Refusal:
    """A searched constant of the shape that runs to the edge."""
    return Refusal(
        wrong=f"These rows do not settle the constant of {shape.key}.",
        seen=f"The best {' and '.join(shape.searched)} lies at the edge of what can be searched.",
        instead="A spline (spline4 x) follows the same bend without that constant.",
    )


def edge(scale: Scale, lam: float) -> Refusal:
    """A power of y that runs to the edge."""
    return Refusal(
        wrong="These rows do not settle the power of y.",
        seen=f"The likelihood still rises at {lam:.3g}, the edge of the search.",
        instead="A named scale: log y, sqrt y or 1/y.",
    )


def aliased(remedy: Remedy, count: int, total: int) -> Refusal:
    """Columns that repeat others."""
    return Refusal(
        wrong="Some columns of this remedy repeat others on these rows.",
        seen=f"{count} of {total} columns of {remedy.key} are combinations of the rest.",
        instead="A simpler shape, or covariates that do not repeat the predictor.",
    )
