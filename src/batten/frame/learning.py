"""Learning the design: levels, centres and knots from the analysis rows, plain labels, aliased columns left out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from typing import Any

import numpy as np
import pandas as pd

from batten.engine.rows import Array
from batten.errors import data as data_errors
from batten.errors import formula as errors
from batten.frame.aliasing import Kept, keep_independent
from batten.frame.columns import Bools, Column, word
from batten.frame.design import FOCUS, Design, Factor, Term, matrices
from batten.frame.evaluate import Values, check_row_by_row, unknown, worked_out
from batten.frame.formula import Block, Grouping, LearningError, Recipe, learn
from batten.frame.plan import Plan
from batten.frame.slots import Slot

__all__ = ["Learned", "learn_design"]

#: largest design held in memory at once, bytes
_LARGEST = 4e9


@dataclass(frozen=True, eq=False)
class Learned:
    """design and its matrices on the analysis rows: x (n,), base (n, q), modifier (n, m). intercept: its position in
    base. constant: whether a constant lies in the span of base. dropped: labels of the aliased columns; empty: of those
    that hold no rows."""

    design: Design
    x: Array
    base: Array
    modifier: Array
    intercept: int | None
    constant: bool
    dropped: tuple[str, ...]
    empty: tuple[str, ...]


def learn_design(plan: Plan, columns: Mapping[str, Column], rows: Bools) -> Learned:
    """Learn everything from the rows that are complete."""
    count = int(rows.sum())
    slots = {
        name: slot.learned(columns[slot.column], rows, plan.asked.get(name, Grouping()))
        for name, slot in plan.slots.items()
    }
    for slot in slots.values():
        _check_size(count, len(slot.levels), slot.column)
    data = {name: slot.values(columns[slot.column], rows) for name, slot in slots.items()}
    recipes, blocks = _coded(plan, data)
    factors = {code: _factor(plan, code, slots) for code in plan.factors}
    widest = max(blocks, key=lambda block: block.width(recipes))
    total = sum(block.width(recipes) for block in blocks)
    _check_size(count, total, " : ".join(factors[code].label for code, _ in widest.factors))
    values = _values(plan, recipes, data, factors, count)
    base, modifier = matrices(blocks, values, count)
    labels = _labels(blocks, recipes, factors)
    intercept = [label for _, label in labels[False]].index(INTERCEPT) if () in plan.terms else None
    kept = keep_independent(data[FOCUS], base, modifier, intercept=intercept)
    terms = _terms(plan, blocks, labels, kept, factors)
    empty = _empty(base, labels[False]) + _empty(modifier, labels[True])
    design = Design(
        terms=terms,
        has_intercept=() in plan.terms,
        focus=slots[FOCUS].column,
        slots=slots,
        recipes=recipes,
        labels={code: factor.label for code, factor in factors.items()},
        blocks=tuple(blocks),
        keep_base=kept.base,
        keep_modifier=kept.modifier,
        base_names=tuple(labels[False][j][1] for j in kept.base),
        modifier_names=tuple(labels[True][j][1] for j in kept.modifier),
        read={slot.column: _as_read(columns[slot.column], rows) for slot in slots.values()},
    )
    return Learned(
        design=design,
        x=data[FOCUS],
        base=_only(base, kept.base),
        modifier=_only(modifier, kept.modifier),
        intercept=kept.intercept,
        constant=kept.constant,
        dropped=tuple(label for term in terms for label in term.dropped if label not in empty),
        empty=empty,
    )


def _only(matrix: Array, keep: Sequence[int]) -> Array:
    return matrix if len(keep) == matrix.shape[1] else np.ascontiguousarray(matrix[:, list(keep)])


def _as_read(column: Column, rows: Bools) -> pd.Series[Any]:
    values = column.values if column.kind != "yes/no" else column.values == 1
    return values[rows].reset_index(drop=True)


def _coded(plan: Plan, data: Mapping[str, Any]) -> tuple[dict[str, Recipe], list[Block]]:
    """Patsy's coding of the terms."""
    for name, asked in plan.asked.items():
        if asked.contrast is not None:
            data[name].contrast = asked.contrast  # where patsy looks for it
    try:
        return learn(plan.terms, {**data, FOCUS: np.ones(len(data[FOCUS]))}, plan.names)
    except LearningError as error:
        said = error.message
        for name in reversed(list(plan.slots)):  # batten_12 before batten_1
            said = said.replace(name, plan.slots[name].column)
        raise errors.not_worked_out(plan.factors[error.code].text, said) from None


def _factor(plan: Plan, code: str, slots: Mapping[str, Slot]) -> Factor:
    expression = plan.factors[code]
    slot = slots.get(code)
    if slot is None:
        return Factor(expression.text, expression.label, "expression", expression)
    if slot.use == "numbers":
        return Factor(expression.text, slot.column, "numeric column", expression)
    contrast = plan.asked[code].contrast
    coding = "treatment" if contrast is None else getattr(contrast, "__name__", type(contrast).__name__)
    return Factor(expression.text, slot.column, "categorical column", expression, slot.levels, coding)


def _check_size(rows: int, columns: int, label: str) -> None:
    """Refuse a design that memory cannot hold, before it is made. label: where most of the columns come from."""
    if rows * columns * 8 > _LARGEST:
        raise data_errors.too_large(rows, columns, label)


def _values(
    plan: Plan, recipes: Mapping[str, Recipe], data: Mapping[str, Any], factors: Mapping[str, Factor], count: int
) -> dict[str, Values]:
    """All factors on the analysis rows; expressions are tried on fewer rows too."""
    values = {}
    for code, recipe in recipes.items():
        label = factors[code].label
        values[code] = worked_out(recipe, data, count, label=label)
        if plan.is_expression(code):
            check_row_by_row(recipe, data, values[code], label=label)
        if unknown(values[code]).any():
            seen = f"It is no number in {int(unknown(values[code]).sum())} of {count} rows."
            raise errors.not_worked_out(label, seen)
    return values


# --- names and terms --------------------------------------------------------------------------------------------------

INTERCEPT = "intercept"

#: (term, label) of every column of base (False) and modifier (True), aliased ones included
Labels = dict[bool, list[tuple[int, str]]]


def _labels(blocks: Sequence[Block], recipes: Mapping[str, Recipe], factors: Mapping[str, Factor]) -> Labels:
    labels: Labels = {False: [], True: []}
    for block in blocks:
        labels[block.has(FOCUS)] += [(block.term, name) for name in _names(block, recipes, factors)]
    return labels


def _names(block: Block, recipes: Mapping[str, Recipe], factors: Mapping[str, Factor]) -> list[str]:
    """Plain labels of a block's columns, the focal predictor left out: "alloy: steel", "age : alloy steel", ""."""
    if not block.factors:
        return [INTERCEPT]
    joint = ": " if len(block.factors) == 1 else " "
    pieces = [_pieces(contrast, factors[code], recipes[code], joint) for code, contrast in block.without(FOCUS)]
    # the first factor varies fastest
    return [" : ".join(reversed(chosen)) for chosen in product(*reversed(pieces))]


def _pieces(contrast: Array | None, factor: Factor, recipe: Recipe, joint: str) -> list[str]:
    if contrast is None:
        return [factor.label] if recipe.width == 1 else [f"{factor.label} {j + 1}" for j in range(recipe.width)]
    levels = recipe.levels or ()
    return [f"{factor.label}{joint}{_level(column, levels, j)}" for j, column in enumerate(contrast.T)]


def _level(column: Array, levels: Sequence[Any], j: int) -> str:
    """The level a contrast column stands for, when it is one level's indicator."""
    single = np.flatnonzero(column)
    return word(levels[single[0]]) if len(single) == 1 and column[single[0]] == 1 else f"contrast {j + 1}"


def _empty(columns: Array, labels: Sequence[tuple[int, str]]) -> tuple[str, ...]:
    """Labels of columns (n, k) that are zero in every row: a level, or a combination of levels, without rows."""
    return tuple(label for (_, label), some in zip(labels, np.atleast_1d(columns.any(axis=0)), strict=True) if not some)


def _joined(focus: str, modifier: str) -> str:
    return f"{focus} : {modifier}" if modifier else focus


def _terms(
    plan: Plan, blocks: Sequence[Block], labels: Labels, kept: Kept, factors: Mapping[str, Factor]
) -> tuple[Term, ...]:
    """The terms in the order of their columns, with the places of those that are kept."""
    order = dict.fromkeys([*(block.term for block in blocks), *range(len(plan.terms))])
    made: dict[tuple[str, ...], Term] = {}
    for t in order:
        codes = plan.terms[t]
        owned, keep = (labels[True], kept.modifier) if FOCUS in codes else (labels[False], kept.base)
        mine = [j for j, (term, _) in enumerate(owned) if term == t]
        columns = tuple(keep.index(j) for j in mine if j in keep)
        x = factors[FOCUS].label
        dropped = tuple(_joined(x, owned[j][1]) if FOCUS in codes else owned[j][1] for j in mine if j not in keep)
        if codes:
            made[codes] = Term(tuple(factors[code] for code in codes), FOCUS in codes, columns, dropped)
    alive = {code for codes, term in made.items() if term.columns for code in codes}
    return tuple(
        replace(term, factors=tuple(replace(factors[code], dropped=code not in alive) for code in codes))
        for codes, term in made.items()
    )
