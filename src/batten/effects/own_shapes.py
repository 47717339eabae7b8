"""Whether groups share one shape: the remedy fitted with a shape of its own for each of them.

The test is a robust Wald test that all groups have the same coefficients along the focal predictor (constants that were
searched are shared by all groups); its size is how far apart the groups' span effects lie.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import f as fisher

from batten.diagnose.bend import knots_for
from batten.effects.contrast import SpanEffect, span_effect
from batten.effects.tell import Names, Sentence, Told
from batten.engine.rows import Array, Rows
from batten.errors import Refusal
from batten.families.remedy import Remedy
from batten.families.shapes.spline import Spline
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.spread import given_rows

__all__ = ["OwnShapes", "own_shapes", "own_shapes_sentence"]

#: share of a column's length that must lie outside the columns before it
NEW = 1e-9


@dataclass(frozen=True)
class OwnShapes:
    """spans: each group's span effect under its own shape. f, df, p: Wald test that the shapes are the same."""

    labels: tuple[str, ...]
    spans: tuple[SpanEffect, ...]
    f: float
    df: tuple[int, int]
    p: float


def own_shapes(
    est: Estimate, groups: dict[str, Array], span: tuple[float, float], *, of: str, level: float, errors: str
) -> OwnShapes | Refusal:
    """groups: label -> 1.0 in the group's rows, else 0.0 (n,). A refusal where some group cannot carry the shape."""
    marks = np.column_stack(list(groups.values()))
    given = given_rows(est)
    rows = _crossed(given, marks)
    own = est if rows is given else estimate(rows, est.remedy)
    if isinstance(own, Refusal):
        return own
    members = [mark > 0 for mark in marks.T]
    spans = [
        span_effect(
            own, span, of=of, level=level, errors=errors, base=rows.base[some], modifier=rows.modifier[some]
        ) for some in members
    ]  # fmt: skip
    f, df = _wald(_tested(own), np.array([rows.modifier[some].mean(axis=0) for some in members]), errors)
    return OwnShapes(tuple(groups), tuple(spans), f, df, float(fisher.sf(f, *df)))


def _tested(own: Estimate) -> Estimate:
    """The fit whose coefficients are tested: for penalised curves splines with the usual knots, which nothing holds
    back."""
    if own.roughness is None:
        return own
    plain = estimate(own.rows, Remedy(own.remedy.left, Spline(knots_for(own.n))))
    return own if isinstance(plain, Refusal) else plain


def _crossed(rows: Rows, marks: Array) -> Rows:
    """The rows with the groups among the covariates and as modifiers, as far as they are not there already."""
    base = _with_new(rows.base, marks)
    modifier = _with_new(rows.modifier, marks)
    if modifier.shape[1] == rows.modifier.shape[1]:
        return rows
    return replace(rows, base=base, modifier=modifier)


def _with_new(columns: Array, more: Array) -> Array:
    """The columns with those of `more` that are no combinations of the ones before them."""
    for new in more.T:
        left = new - columns @ np.linalg.lstsq(columns, new, rcond=None)[0] if columns.shape[1] else new
        if left @ left > NEW * (new @ new):
            columns = np.column_stack([columns, new])
    return columns


def _wald(est: Estimate, modifiers: Array, errors: str) -> tuple[float, tuple[int, int]]:
    """F of equal focal coefficients at each group's modifiers (G, m)."""
    width = est.shape.columns(est.rows.x[:1], est.state, est.theta).shape[1]
    focal = slice(len(est.coef) - width * modifiers.shape[1], len(est.coef))
    pull = np.kron(modifiers[1:] - modifiers[0], np.eye(width))
    gap = pull @ est.coef[focal]
    covariance = pull @ est.covariance(errors)[focal, focal] @ pull.T
    size = np.sqrt(np.diagonal(covariance))
    df = (len(gap), int(est.df_error))
    if not (size > 0).all() or len(gap) > est.df_error:
        return float("nan"), df
    unit = covariance / np.outer(size, size)
    return float((gap / size) @ np.linalg.solve(unit, gap / size)) / len(gap), df


def own_shapes_sentence(found: OwnShapes | Refusal, by: str, names: Names) -> Sentence:
    """How far apart the groups' span effects lie under shapes of their own, and whether one shape would do."""
    told = Told(names)
    if isinstance(found, Refusal):
        return told.sentence("shapes", f"A shape of its own for each {by} cannot be fitted: {found.seen}")
    values = [s.difference.estimate for s in found.spans]
    low, high = int(np.nanargmin(values)), int(np.nanargmax(values))
    ends = [
        f"{told.number(end, values[k], names.y_unit)} ({found.labels[k]})"
        for end, k in (("lowest", low), ("highest", high))
    ]
    text = (
        f"With a shape of its own for each {by}, the same step of {names.x} goes with {ends[0]} to {ends[1]} "
        f"in the {found.spans[low].of} of {names.y}"
    )
    if not np.isfinite(found.p):
        return told.sentence("shapes", f"{text}; the rows are too few to test whether the shapes differ.")
    verdict = "the shapes differ" if found.p < 1 - names.level else "these rows do not tell the shapes apart"
    told.numbers |= {"f": found.f, "df": found.df[0], "df_rest": found.df[1], "p": found.p}
    chance = "p < 0.001" if found.p < 0.001 else f"p = {found.p:.3f}"
    return told.sentence("shapes", f"{text}; {verdict} (F({found.df[0]}, {found.df[1]}) = {found.f:.3g}, {chance}).")
