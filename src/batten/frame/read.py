"""From a formula and a table to a problem: the door through which all data come in."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from batten.engine.rows import Rows
from batten.errors import data as errors
from batten.errors.formula import unknown_focus
from batten.frame import hints
from batten.frame.choice import chosen_rows
from batten.frame.columns import Column, check_numbers, look
from batten.frame.extras import Beside, Extras
from batten.frame.formula import Formula, namespace, parse
from batten.frame.learning import Learned, learn_design
from batten.frame.plan import Plan, expression_complaints, make_plan
from batten.frame.problem import Problem
from batten.frame.profile import profile_at
from batten.frame.roles import Roles, choose_roles, read_factors
from batten.frame.rownotes import Complaint, RowNotes
from batten.frame.slots import Slot
from batten.frame.tables import Table, open_table

__all__ = ["read"]

#: below this many clusters intervals by cluster are not to be trusted
FEW_CLUSTERS = 10


def read(
    formula: str,
    data: Any,
    *,
    focus: str | None = None,
    rows: str | None = None,
    weights: str | None = None,
    weights_kind: str | None = None,
    cluster: str | None = None,
    exposure: str | None = None,
    units: Mapping[str, str] | None = None,
    at: Mapping[str, Any] | None = None,
    env: Mapping[str, Any] | None = None,
    frame_name: str = "data",
) -> Problem:
    """Read one analysis: who is who in the formula, which rows are complete, and the numbers of the design.

    formula: in the grammar of statsmodels' formula interface. data: pandas, polars, Arrow or a dict of columns; copied,
    never changed. rows: an expression as for DataFrame.query. weights, cluster, exposure: column names. units: unit by
    column name. at: covariate values that replace the rows' own in averages. env: names that functions in the formula
    may use; numpy (np) and Python's own are always there.
    """
    parsed, names, table = parse(formula), namespace(env), open_table(data)
    beside = Beside(weights, weights_kind, cluster, exposure)
    _check_names(table, beside, focus, units or {})
    factors = read_factors(parsed, table.names, names)
    columns = _look(table, [*(c for e in factors.values() for c in e.columns), *beside.columns.values()])
    roles = choose_roles(parsed, factors, columns, focus)
    check_numbers(columns[roles.response], "response")
    beside.check_numbers(columns)
    plan = make_plan(parsed, factors, roles, columns, names)
    sample = RowNotes(len(table))
    if rows is not None:
        sample.add((~chosen_rows(rows, table, env), f"not in --rows {rows}"))
    _leave_out_incomplete(sample, plan, roles, columns, beside)
    numbers, learned, extras = _numbers(plan, roles, columns, beside, sample)
    asked = _Asked(parsed, roles, plan, columns, table, beside, extras, dict(units or {}))
    problem = asked.problem(numbers, learned, sample, frame_name)
    return replace(problem, profile=profile_at(problem, at)) if at else problem


def _check_names(table: Table, beside: Beside, focus: str | None, units: Mapping[str, str]) -> None:
    """Every column named outside the formula must be there."""
    beside.check_kind()
    for option, name in beside.columns.items():
        if name not in table.counts:
            raise errors.unknown_option(option, name, table.names)
    if focus is not None and focus not in table.counts:
        raise unknown_focus(focus, [str(name) for name in table.names])
    for name in units:
        if name not in table.counts:
            raise errors.unit_of_unknown(name, table.names)


def _look(table: Table, names: Iterable[str]) -> dict[str, Column]:
    return {str(name): look(str(name), values) for name, values in table.frame(names).items()}


def _leave_out_incomplete(
    sample: RowNotes, plan: Plan, roles: Roles, columns: Mapping[str, Column], beside: Beside
) -> None:
    """Rows that miss something are left out by name; of rows not chosen nothing more is said."""
    chosen = ~sample.bad
    for rows, words in _complaints(plan, roles, columns, beside):
        sample.add((rows & chosen, words))
    for rows, words in expression_complaints(plan, columns, ~sample.bad):
        sample.add((rows, words))


def _complaints(plan: Plan, roles: Roles, columns: Mapping[str, Column], beside: Beside) -> Iterator[Complaint]:
    for slot in (Slot(roles.response, "numbers"), *plan.slots.values()):
        yield from slot.complaints(columns[slot.column])
    yield from beside.complaints(columns)


def _numbers(
    plan: Plan, roles: Roles, columns: Mapping[str, Column], beside: Beside, sample: RowNotes
) -> tuple[Rows, Learned, Extras]:
    """The analysis sample as numbers; refused when it is too small or does not vary."""
    rows = ~sample.bad
    if not rows.any():
        raise errors.empty(len(rows), sample.summary())
    extras = beside.extras(columns, rows)
    y = np.asarray(columns[roles.response].numbers)[rows]
    standing_for = len(y) if extras.times is None else int(extras.times.sum())
    if standing_for < 5:
        raise errors.too_few_rows(standing_for, 0, len(rows), sample.summary())
    if beside.exposure is not None:
        y = y / extras.exposure
    if y.min() == y.max():
        raise errors.constant(roles.response, "response", float(y[0]), len(y))
    learned = learn_design(plan, columns, rows)
    if learned.x.min() == learned.x.max():
        raise errors.constant(roles.focus, "focal predictor", float(learned.x[0]), len(y))
    coefficients = learned.base.shape[1] + learned.modifier.shape[1]
    if standing_for <= coefficients:
        raise errors.too_few_rows(standing_for, coefficients, len(rows), sample.summary())
    numbers = Rows(
        y=y, x=learned.x, base=learned.base, modifier=learned.modifier, intercept=learned.intercept,
        constant=learned.constant, weights=extras.relative_weight, cluster=extras.cluster,
    )  # fmt: skip
    return (numbers if extras.times is None else numbers.take(extras.written_out)), learned, extras


@dataclass(frozen=True)
class _Asked:
    """All that was asked and found, to be put into words."""

    formula: Formula
    roles: Roles
    plan: Plan
    columns: Mapping[str, Column]
    table: Table
    beside: Beside
    extras: Extras
    units: dict[str, str]

    def problem(self, numbers: Rows, learned: Learned, sample: RowNotes, frame_name: str) -> Problem:
        roles, design, response = self.roles, learned.design, self._response()
        index = self.table.index[~sample.bad]
        if self.extras.times is not None:
            index, design = index[self.extras.written_out], design.taken(self.extras.written_out)
        date = self.columns[roles.focus].kind == "dates"
        if date:
            self.units.setdefault(roles.focus, "days")
        arbitrary = hints.zero_is_arbitrary(roles.focus, self.units.get(roles.focus, ""), learned.x, date=date)
        return Problem(
            formula=self.formula.text,
            response=response,
            response_column=roles.response,
            beside=self.beside,
            average_weight=self.extras.average_weight,
            focus=roles.focus,
            covariates=roles.covariates,
            rows=numbers,
            index=index,
            times=self.extras.times,
            left_out=sample.left_out(self.table.index),
            announcements=tuple(self._announcements(learned, sample, arbitrary)),
            units=self.units,
            base_names=design.base_names,
            modifier_names=design.modifier_names,
            zero_is_arbitrary=bool(arbitrary),
            design=design,
            frame_name=frame_name,
        )

    def _response(self) -> str:
        """The name of what is analysed: the response, or the response per unit of exposure."""
        name, exposure = self.roles.response, self.beside.exposure
        if exposure is None:
            return name
        rate = f"{name} per {exposure}"
        if name in self.units and exposure in self.units:
            self.units.setdefault(rate, f"{self.units[name]}/{self.units[exposure]}")
        return rate

    def _announcements(self, learned: Learned, sample: RowNotes, arbitrary: str) -> Iterator[str]:
        """Every choice made that the user should know, and every question to ask."""
        roles, columns, rows = self.roles, self.columns, ~sample.bad
        slots = learned.design.slots.values()
        numeric = {slot.column for slot in slots if slot.use == "numbers"}
        if roles.guessed:
            yield roles.guessed
        if sample.bad.any():
            yield f"{int(sample.bad.sum())} of {len(rows)} rows are left out: {sample.summary()}."
        yield from hints.read_differently(columns, slots, roles.response)
        yield from hints.powers(self.formula, roles.focus)
        yield from self._beside()
        if learned.empty:
            yield "Left out because no rows hold them: " + ", ".join(learned.empty) + "."
        if learned.dropped:
            yield "Left out because other columns say the same: " + ", ".join(learned.dropped) + "."
        grouped = [slot.column for slot in slots if slot.use == "groups"]
        whole = [(name, columns[name].numbers) for name in roles.covariates if name in numeric.difference(grouped)]
        yield from hints.codes_or_amounts(
            learned.x, roles.focus, [(name, v[rows]) for name, v in whole if v is not None]
        )
        if arbitrary:
            yield (
                f"{roles.focus} is {arbitrary}: its zero is arbitrary, so roots, logs and powers of it are off unless "
                "asked for."
            )
        if self.beside.cluster is None:
            used = {roles.response, *numeric, *self.beside.columns.values()}
            yield from hints.dependence(self.table, rows, grouped=grouped, numeric=used)

    def _beside(self) -> Iterator[str]:
        """What weights, clusters and exposure make of the rows."""
        beside, extras = self.beside, self.extras
        if extras.times is not None:
            yield f"{len(extras.times):,} stored rows stand for {int(extras.times.sum()):,} ({beside.weights})."
        if extras.weights is not None:
            yield (
                f"Weighted by {beside.weights}: errors, spreads and intervals for a new row are those of a row of "
                f"average weight ({extras.average_weight:.4g})."
            )
        if extras.exposure is not None:
            yield (
                f"{self.roles.response} is taken per unit of {beside.exposure}, rows weighted by {beside.exposure}: "
                f"errors and spreads are those of a row with average exposure ({extras.average_weight:.4g})."
            )
        if extras.cluster is not None:
            groups = int(extras.cluster.max()) + 1
            few = " That is few: intervals by cluster need about 10." if groups < FEW_CLUSTERS else ""
            yield f"{groups:,} clusters by {beside.cluster}; intervals and folds keep each together.{few}"
