"""How a script turns the user's columns into the model's: constants, statements, plain names and formula terms."""

from __future__ import annotations

import itertools
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd

from batten.emit.expressions import Written, has_literal, write_expression
from batten.emit.text import literal, plain_name, said
from batten.engine.rows import Array
from batten.frame.columns import look
from batten.frame.design import FOCUS, Design

__all__ = ["Covariates", "read_numbers", "write_covariates"]

Constant = tuple[str, str, str]


@dataclass
class Covariates:
    """What the script needs to know about all columns but the response.

    focus: expression for the focal predictor's numbers. lines: statements before the model's columns are put together.
    entries: (plain name, expression) of covariates' columns. terms: formula terms without the focal predictor.
    modifiers: what the focal predictor is multiplied with, "" for itself. intercept: whether the formula has one.
    helpers: functions called. guarded: some expression may meet values it cannot take. unwritten: labels of expressions
    that have no literal form and stand in the formula as they are.
    """

    focus: str = ""
    start: str = ""
    constants: list[Constant] = field(default_factory=list)
    lines: list[str] = field(default_factory=list)
    entries: list[tuple[str, str]] = field(default_factory=list)
    terms: list[str] = field(default_factory=list)
    modifiers: list[str] = field(default_factory=list)
    intercept: bool = True
    helpers: list[str] = field(default_factory=list)
    imports: list[str] = field(default_factory=list)
    unwritten: list[str] = field(default_factory=list)
    external: list[str] = field(default_factory=list)
    guarded: bool = False


def write_covariates(design: Design, *, own_level: bool, taken: Iterable[str]) -> Covariates:
    """Read the design. own_level: the shape replaces the intercept. taken: names of the shape's columns."""
    return _Writer(design, own_level=own_level, taken=taken).write()


def read_numbers(column: str, frame: str, *, text: bool) -> str:
    """Source of a column as a float series; text: the numbers are stored as text."""
    source = f"{frame}[{literal(column)}]"
    return f'pd.to_numeric({source}, errors="coerce").astype(float)' if text else f"{source}.astype(float)"


class _Writer:
    def __init__(self, design: Design, *, own_level: bool, taken: Iterable[str]) -> None:
        self.design, self.out = design, Covariates()
        self.taken = set(taken)
        self.variables: dict[str, str] = {}
        self.factors: dict[str, list[str]] = {}
        self.tables: dict[str, tuple[str, list[Array]]] = {}
        self.groups = len({code for block in design.blocks for code, contrast in block.factors if contrast is not None})
        self.out.intercept = design.has_intercept and not own_level
        odd = any(not _usual(contrast) for block in design.blocks for _, contrast in block.factors)
        level_gone = self.groups > 0 and own_level and design.has_intercept
        # what has no literal form can only stand in a formula
        self.by_column = (self._dropped() or odd or level_gone) and all(map(has_literal, design.recipes.values()))

    def write(self) -> Covariates:
        self._focus()
        if self.by_column:
            self._columns()
        else:
            self._terms()
        self.out.imports = list(dict.fromkeys(self.out.imports))
        self.out.external = list(dict.fromkeys(self.out.external))
        return self.out

    # --- names and readings -------------------------------------------------------------------------------------------

    def _focus(self) -> None:
        slot = self.design.slots[FOCUS]
        if slot.start is not None:
            self.out.start = "START"
            self.out.constants.append(("START", literal(slot.start), f"{said(slot.column)} counts in days from here"))
        self.out.focus = self._numbers(slot.column, slot.start, "START")

    def _numbers(self, column: str, start: pd.Timestamp | None, name: str) -> str:
        if start is None:
            return read_numbers(column, "frame", text=self._is_text(column))
        stamps = f"pd.to_datetime(frame[{literal(column)}]).dt.tz_localize(None)"
        return f"(({stamps} - {name}) / pd.Timedelta(days=1))"

    def _is_text(self, column: str) -> bool:
        return look(column, self.design.read[column]).stored == "as text"

    def _name(self, text: str) -> str:
        name = plain_name(text, self.taken, f"c{len(self.taken)}")
        self.taken.add(name)
        return name

    def _variable(self, slot_name: str) -> str:
        """A variable of columns() that holds a column as an expression needs it."""
        if slot_name not in self.variables:
            slot = self.design.slots[slot_name]
            sample = self.design.read[slot.column]
            kind = look(slot.column, sample).kind
            source = f"frame[{literal(slot.column)}]"
            if kind == "numbers":
                source = read_numbers(slot.column, "frame", text=self._is_text(slot.column))
            elif kind == "yes/no":
                source += ".astype(bool)"
            name = self._name(slot.column)
            self.variables[slot_name] = name
            self.out.lines.append(f"{name} = {source}")
            # in the table too, so that a row is missing where it is: a comparison would not say so
            self.out.entries.append((name, name))
        return self.variables[slot_name]

    # --- by terms: the formula as the user wrote it, with plain names -------------------------------------------------

    def _terms(self) -> None:
        order: dict[int, list[str]] = {}
        for block in sorted(self.design.blocks, key=lambda b: b.term):
            known = order.setdefault(block.term, [])
            known += [code for code, _ in block.factors if code not in known]
        for codes in order.values():
            parts = [self._factor(code) for code in codes if code != FOCUS]
            product = ":".join(parts)
            if FOCUS in codes:
                self.out.modifiers.append(product)
            elif codes:
                self.out.terms.append(product)

    def _factor(self, code: str) -> str:
        """A factor in the script's formula: a plain name, C(name), or several names in brackets."""
        if code not in self.factors:
            self.factors[code] = self._group(code) if self._levels(code) else self._numeric(code)
        names = self.factors[code]
        return names[0] if len(names) == 1 else f"({' + '.join(names)})"

    def _levels(self, code: str) -> tuple[Any, ...]:
        levels: tuple[Any, ...] | None = self.design.recipes[code].levels
        return levels or ()

    def _label(self, code: str) -> str:
        return said(self.design.labels[code])

    def _group(self, code: str) -> list[str]:
        name = self._name(self._called(code))
        levels = f"{name.upper().strip('_')}_LEVELS"
        meaning = f"levels of {self._label(code)}; the first is the reference"
        self.out.constants.append((levels, literal(list(self._levels(code))), meaning))
        self.out.entries.append((name, f'{self._values(code, name)}.astype("category").cat.set_categories({levels})'))
        return [f"C({name})"]

    def _called(self, code: str) -> str:
        slot = self.design.slots.get(code)
        return slot.column if slot is not None else _brief(self.design.labels[code])

    def _values(self, code: str, name: str) -> str:
        """A series with a group's values."""
        slot = self.design.slots.get(code)
        if slot is not None:
            return f"frame[{literal(slot.column)}]"
        return f"pd.Series({self._expression(code, name).source}, index=frame.index)"

    def _numeric(self, code: str) -> list[str]:
        slot = self.design.slots.get(code)
        name = self._name(self._called(code))
        if slot is not None:
            start = f"{name.upper()}_START"
            if slot.start is not None:
                meaning = f"{said(slot.column)} counts in days from here"
                self.out.constants.append((start, literal(slot.start), meaning))
            self.out.entries.append((name, self._numbers(slot.column, slot.start, start)))
            return [name]
        return self._from_expression(code, name)

    def _from_expression(self, code: str, name: str) -> list[str]:
        written = self._expression(code, name)
        if not written.source:
            return [self._as_typed(code)]
        width = self.design.recipes[code].width
        if width == 1:
            self.out.entries.append((name, written.source))
            return [name]
        self.out.lines.append(f"{name} = np.asarray({written.source}, dtype=float)")
        names = [self._name(f"{name}_{j + 1}") for j in range(width)]
        self.out.entries += [(each, f"{name}[:, {j}]") for j, each in enumerate(names)]
        return names

    def _expression(self, code: str, name: str) -> Written:
        recipe = self.design.recipes[code]
        used = [s for s in self.design.slots if s in recipe.code and s != FOCUS]
        variables = {s: self._variable(s) for s in used}
        written = write_expression(recipe, variables, name=name, label=self._label(code))
        self.out.guarded = True
        self.out.imports += written.imports
        self.out.constants += written.constants
        self.out.external += written.external
        if written.helper:
            self._needs(written.helper)
        return written

    def _as_typed(self, code: str) -> str:
        """An expression in the formula's own words, with plain names; it learns anew from the rows it is given."""
        self.out.unwritten.append(self._label(code))
        factors = {f.label: f for term in self.design.terms for f in term.factors}
        names = {slot.column: self.variables[s] for s, slot in self.design.slots.items() if s in self.variables}
        return factors[self.design.labels[code]].written(names)

    def _needs(self, helper: str) -> None:
        if helper not in self.out.helpers:
            self.out.helpers.append(helper)

    # --- by columns: each column of the design written out ------------------------------------------------------------

    def _columns(self) -> None:
        """For designs a formula would code differently: columns left out, other contrasts, a curve's own level."""
        place = {True: 0, False: 0}
        for block in self.design.blocks:
            focal = block.has(FOCUS)
            keep = self.design.keep_modifier if focal else self.design.keep_base
            pieces = [self._pieces(code, contrast) for code, contrast in block.without(FOCUS)]
            for chosen in itertools.product(*reversed(pieces)):  # the first factor varies fastest
                kept = place[focal] in keep
                place[focal] += 1
                if kept and (focal or block.factors):
                    (self.out.modifiers if focal else self.out.terms).append(":".join(reversed(chosen)))
        self._write_tables()

    def _pieces(self, code: str, contrast: Array | None) -> list[str]:
        if contrast is None:
            if code not in self.factors:
                self.factors[code] = self._numeric(code)
            return self.factors[code]
        name, columns = self.tables.setdefault(code, (self._name(self._called(code)), []))
        places = []
        for column in contrast.T:
            same = [j for j, known in enumerate(columns) if np.array_equal(known, column)]
            if not same:
                columns.append(column)
            places.append(same[0] if same else len(columns) - 1)
        return [f"{name}_{j + 1}" for j in places]

    def _write_tables(self) -> None:
        for code, (name, columns) in self.tables.items():
            table = {
                level: tuple(int(c[i]) if c[i] == int(c[i]) else float(c[i]) for c in columns)
                for i, level in enumerate(self._levels(code))
            }
            body = ", ".join(f"{literal(level)}: {literal(row)}" for level, row in table.items())
            constant = f"{name.upper().strip('_')}_TABLE"
            self.out.constants.append((constant, f"{{{body}}}", f"columns of {self._label(code)} by level"))
            found = f"pd.DataFrame({constant}, dtype=float).T.reindex({self._values(code, name)}.astype(object))"
            self.out.lines.append(f"{name} = {found}.to_numpy()")
            self.out.entries += [(f"{name}_{j + 1}", f"{name}[:, {j}]") for j in range(len(columns))]

    def _dropped(self) -> bool:
        d = self.design
        widths = {True: 0, False: 0}
        for block in d.blocks:
            widths[block.has(FOCUS)] += block.width(d.recipes)
        return widths[True] != len(d.keep_modifier) or widths[False] != len(d.keep_base)


def _usual(contrast: Array | None) -> bool:
    """Whether a coding is what formulas do by themselves: indicators of all levels, or of all but the first."""
    if contrast is None:
        return True
    levels = len(contrast)
    return np.array_equal(contrast, np.eye(levels)) or np.array_equal(contrast, np.eye(levels)[:, 1:])


def _brief(label: str) -> str:
    """A short name for an expression: np.log(depth) -> log_depth."""
    return label.replace("np.", "").replace("**", " power ")
