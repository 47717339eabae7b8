"""From typed factors to a plan: which column is read in which way, and the terms in safe names."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from batten.errors import data as data_errors
from batten.errors import formula as errors
from batten.frame.columns import Bools, Column
from batten.frame.design import FOCUS
from batten.frame.expression import Expression
from batten.frame.formula import Formula, Grouping, Recipe, grouping, without_memory
from batten.frame.roles import Roles
from batten.frame.rownotes import Complaint
from batten.frame.slots import Slot

__all__ = ["Plan", "expression_complaints", "make_plan"]


@dataclass(frozen=True)
class Plan:
    """terms: factors' codes in safe names, () the intercept, no term twice. factors: what each code stands for.
    slots: by safe name, not yet learned. asked: the coding asked for, for slots of groups. names: the namespace."""

    terms: tuple[tuple[str, ...], ...]
    factors: Mapping[str, Expression]
    slots: Mapping[str, Slot]
    asked: Mapping[str, Grouping]
    names: Mapping[str, Any]

    def is_expression(self, code: str) -> bool:
        return code not in self.slots


def make_plan(
    formula: Formula,
    factors: Mapping[str, Expression],
    roles: Roles,
    columns: Mapping[str, Column],
    names: Mapping[str, Any],
) -> Plan:
    """Give every factor its safe code, and every way a column is read its slot."""
    maker = _Maker(roles.focus, columns, names)
    terms: dict[frozenset[str], tuple[str, ...]] = {}
    for term in formula.terms:
        codes = tuple(dict.fromkeys(maker.code(factors[text]) for text in term))
        terms.setdefault(frozenset(codes), codes)
    return Plan(tuple(terms.values()), maker.factors, maker.slots, maker.asked, names)


class _Maker:
    """Hands out safe names: batten_x for the focal predictor, batten_1, batten_2, ... for the other slots."""

    def __init__(self, focus: str, columns: Mapping[str, Column], names: Mapping[str, Any]) -> None:
        self.focus, self.columns, self.names = focus, columns, names
        self.factors: dict[str, Expression] = {}
        self.slots: dict[str, Slot] = {FOCUS: Slot(focus, "numbers")}
        self.asked: dict[str, Grouping] = {}
        self._groups: dict[tuple[Any, ...], str] = {}

    def code(self, factor: Expression) -> str:
        code = self._code(factor)
        self.factors.setdefault(code, factor)
        return code

    def _code(self, factor: Expression) -> str:
        if factor.bare == self.focus:
            return FOCUS
        if factor.bare is not None:
            return self._bare(self.columns[factor.bare])
        if factor.group is not None and len(factor.columns) == 1:
            asked = self._asked_for(factor)
            return self._group(factor.group, asked, text=factor.text if asked.contrast is not None else "")
        return factor.written({name: self._slot(Slot(name, "as it is")) for name in factor.columns})

    def _asked_for(self, factor: Expression) -> Grouping:
        try:
            return grouping(factor.arguments(), self.names)
        except Exception as error:  # the user's own Python
            raise errors.not_worked_out(factor.text, f"{type(error).__name__}: {error}") from None

    def _bare(self, column: Column) -> str:
        """Numbers and dates as numbers, text and categories as groups; what could be either is asked about."""
        if column.stray or column.kind == "mixture":
            stray = column.stray or tuple(v for v in column.values[~column.missing].unique() if isinstance(v, str))
            raise data_errors.mixture(column.name, stray)
        if column.kind == "other":
            raise data_errors.stores(column.name, "covariate", column.stored)
        if column.kind in ("numbers", "dates"):
            return self._slot(Slot(column.name, "numbers"))
        return self._group(column.name, Grouping(), text="")

    def _group(self, name: str, asked: Grouping, *, text: str) -> str:
        """One slot for one column and coding; codings other than treatment are told apart by how they are typed."""
        key = (name, asked.reference, asked.levels, text)
        if key not in self._groups:
            self._groups[key] = self._new(Slot(name, "groups", levels=asked.levels or ()))
            self.asked[self._groups[key]] = asked
        return self._groups[key]

    def _slot(self, slot: Slot) -> str:
        for code, known in self.slots.items():
            if known == slot:
                return code
        return self._new(slot)

    def _new(self, slot: Slot) -> str:
        code = f"batten_{len(self.slots)}"
        self.slots[code] = slot
        return code


def expression_complaints(plan: Plan, columns: Mapping[str, Column], rows: Bools) -> Iterator[Complaint]:
    """Among rows that are complete, those where an expression (np.log(z)) is no finite number."""
    names = without_memory(plan.names)
    raw = {name: slot for name, slot in plan.slots.items() if slot.use == "as it is"}
    data = {name: slot.values(columns[slot.column], rows) for name, slot in raw.items()}
    for code, factor in plan.factors.items():
        if plan.is_expression(code):
            recipe = Recipe(code, names, levels=None, width=0)
            lost = np.zeros(len(rows), dtype=bool)
            lost[np.flatnonzero(rows)] = _unusable(recipe, data, int(rows.sum()))
            yield lost, f"{factor.label} is not a finite number"


def _unusable(recipe: Recipe, data: Mapping[str, Any], count: int) -> Bools:
    """Rows (n,) whose value is missing or infinite, whatever type the values have."""
    try:
        values = np.asarray(recipe.evaluate(data))
    except Exception:  # the text may need what bs() and the like return; learning will say what is wrong
        return np.zeros(count, dtype=bool)
    if values.ndim == 0 or len(values) != count:
        return np.zeros(count, dtype=bool)
    lost = np.asarray(~np.isfinite(values) if values.dtype.kind in "iuf" else pd.isna(values))
    return np.asarray(lost.any(axis=tuple(range(1, lost.ndim))))
