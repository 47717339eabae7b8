"""Span effects per group where the focal predictor stands in an interaction, and how they differ between groups.

On log y a zero interaction means equal ratios, not equal differences, so both are had.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from batten.effects.contrast import SpanEffect, span_effect
from batten.effects.value import Effect, effect_of, undefined
from batten.engine.rows import Array
from batten.fit.averaged import Averaged, interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means

__all__ = ["Group", "GroupEffect", "group_effects"]


@dataclass(frozen=True, eq=False)
class Group:
    """Covariate rows of one group: base (u, q), modifier (u, m); label names it."""

    label: str
    base: Array
    modifier: Array


@dataclass(frozen=True)
class GroupEffect:
    """One group's span effect, and against the first group's: difference in units of y, ratio of ratios."""

    label: str
    span: SpanEffect
    difference: Effect
    ratio: Effect


def group_effects(
    est: Estimate,
    groups: tuple[Group, ...],
    span: tuple[float, float],
    *,
    of: str = "mean",
    level: float = 0.95,
    errors: str = "robust",
) -> tuple[GroupEffect, ...]:
    """Each group's span effect over its own covariate rows; the first is the one the others are held against."""
    found = [
        span_effect(est, span, of=of, level=level, errors=errors, base=g.base, modifier=g.modifier) for g in groups
    ]
    first = None if found[0].note else _ends(est, groups[0], span, of=of, errors=errors)
    none = undefined("the first group")
    out = [GroupEffect(groups[0].label, found[0], none, none)]
    for group, effect in zip(groups[1:], found[1:], strict=True):
        if first is None or effect.note:
            missing = undefined(effect.note or found[0].note)
            out.append(GroupEffect(group.label, effect, missing, missing))
            continue
        both = _joined(first, _ends(est, group, span, of=of, errors=errors))
        change = np.array([[1.0], [-1.0], [-1.0], [1.0]])
        gap = both.combine(change)
        ratio = undefined("no ratio: an interval reaches zero")
        if effect.ratio.defined and found[0].ratio.defined:
            logs = both.log().combine(change)
            ratio = effect_of(logs.value, interval(logs, level)).through(math.exp)
        out.append(GroupEffect(group.label, effect, effect_of(gap.value, interval(gap, level)), ratio))
    return tuple(out)


def _ends(est: Estimate, group: Group, span: tuple[float, float], *, of: str, errors: str) -> Averaged:
    return averaged_means(est, np.array(span), of=of, errors=errors, base=group.base, modifier=group.modifier)


def _joined(one: Averaged, two: Averaged) -> Averaged:
    """Two sets of values of one estimate beside each other; rows of their roots belong to the same rows of the data."""
    left, bias = None, None
    if one.left_out is not None and two.left_out is not None:
        left = np.hstack([one.left_out, two.left_out])
    if one.bias is not None and two.bias is not None:
        bias = np.hstack([one.bias, two.bias])
    value, by_row = np.concatenate([one.value, two.value]), np.hstack([one.by_row, two.by_row])
    return Averaged(value, by_row, left, one.df, bias=bias)
