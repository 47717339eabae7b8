"""Who is who in a formula: the response, the focal predictor, the covariates."""

from __future__ import annotations

import keyword
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from batten.errors import data as data_errors
from batten.errors import formula as errors
from batten.frame.columns import Column
from batten.frame.expression import Expression, read_expression
from batten.frame.formula import Formula

__all__ = ["Roles", "choose_roles", "read_factors"]

_KIND_WORDS = {
    "numbers": "a function of numbers", "yes/no": "yes/no", "dates": "dates", "text": "text",
    "categories": "categories", "mixture": "numbers and text together", "other": "not numbers",
}  # fmt: skip


@dataclass(frozen=True)
class Roles:
    """response, focus: column names. covariates: the other columns, in order. guessed: what to say when the focal
    predictor was not given, else ""."""

    response: str
    focus: str
    covariates: tuple[str, ...]
    guessed: str


def read_factors(formula: Formula, columns: Iterable[Any], names: Mapping[str, Any]) -> dict[str, Expression]:
    """Every factor of the formula, response included, by its text."""
    known = [c for c in columns if isinstance(c, str)]
    found = {}
    for text in (*formula.response, *(f for term in formula.terms for f in term)):
        try:
            found[text] = read_expression(text, known, names)
        except SyntaxError:
            start, end = formula.places[text]
            typed = formula.text[start:end]
            column = typed if typed in known else ""
            raise errors.no_expression(formula.text, start, end, column=column) from None
    return found


def choose_roles(
    formula: Formula, factors: Mapping[str, Expression], columns: Mapping[str, Column], focus: str | None
) -> Roles:
    """Settle the response and the focal predictor, or say what stands in the way and which formula would do."""
    right = [factors[text] for text in dict.fromkeys(f for term in formula.terms for f in term)]
    if not right:
        raise errors.no_right_side(formula.text)
    meant = _meant(right, columns, focus)
    response = _response(formula, factors, right, meant)
    chosen = _given(right, columns, focus) if focus is not None else _first(formula, right, columns, response, meant)
    if chosen == response:
        raise errors.response_is_focus(chosen)
    changed = [e.text for e in right if chosen in e.columns and e.bare is None]
    if changed:
        raise errors.transformed_focus(chosen, changed, _plain_formula(formula, right, response, chosen))
    if any(response in e.columns for e in right):
        raise errors.response_both_sides(response)
    used = dict.fromkeys(c for e in right for c in e.columns if c != chosen)
    return Roles(response, chosen, tuple(used), "" if focus is not None else _guess(chosen, right, columns))


def _meant(right: list[Expression], columns: Mapping[str, Column], focus: str | None) -> str | None:
    """The focal predictor somebody has in mind, transformed or not: for the formula offered instead."""
    if focus is not None:
        return focus
    return next(iter([*_candidates(right, columns), *_inside(right, columns)]), None)


def _candidates(right: list[Expression], columns: Mapping[str, Column]) -> list[str]:
    """Bare numeric predictors in order of appearance; where there are none, bare dates."""
    bare = [e.bare for e in right if e.bare is not None]
    for kind in ("numbers", "dates"):
        found = [c for c in bare if columns[c].kind == kind]
        if found:
            return found
    return []


def _inside(right: list[Expression], columns: Mapping[str, Column]) -> list[str]:
    """Numeric columns that stand alone inside a function: mass_kg in np.log(mass_kg)."""
    functions = [e.columns for e in right if e.bare is None and e.group is None]
    return [used[0] for used in functions if len(used) == 1 and columns[used[0]].kind == "numbers"]


def _response(formula: Formula, factors: Mapping[str, Expression], right: list[Expression], meant: str | None) -> str:
    left = [factors[text] for text in formula.response]
    if not left:
        raise errors.no_response(formula.text)
    if formula.plain_response and left[0].bare is not None:
        return left[0].bare
    if len(left) > 1:
        raise errors.several_responses(e.text for e in left)
    only = left[0].columns[0] if len(left[0].columns) == 1 else ""
    raise errors.transformed_response(formula.left, _plain_formula(formula, right, only, meant) if only else "")


def _plain_formula(formula: Formula, right: list[Expression], response: str, focus: str | None) -> str:
    """The formula with response and focal predictor untransformed."""
    changed = {e.text: _typed(focus) for e in right if focus in e.columns}
    return formula.rewritten(_typed(response), changed)


def _typed(name: str | None) -> str:
    """A column as it is typed in a formula."""
    assert name is not None
    return name if name.isidentifier() and not keyword.iskeyword(name) else f"Q({name!r})"


def _given(right: list[Expression], columns: Mapping[str, Column], focus: str) -> str:
    """The focal predictor named by the user, when it can be one."""
    numeric = _candidates(right, columns)
    if not any(focus in e.columns for e in right):
        raise errors.focus_not_in_formula(focus, numeric)
    if any(e.bare == focus for e in right):
        column = columns[focus]
        if column.stray:
            raise data_errors.not_numbers(focus, "focal predictor", column.stray, len(column.values))
        if column.kind in ("text", "categories", "mixture"):
            raise errors.focus_is_grouped(focus)
        if column.kind == "other":
            raise data_errors.stores(focus, "focal predictor", column.stored)
    elif all(e.group == focus for e in right if focus in e.columns):
        raise errors.focus_is_grouped(focus)
    return focus


def _first(
    formula: Formula, right: list[Expression], columns: Mapping[str, Column], response: str, meant: str | None
) -> str:
    """The first bare numeric predictor."""
    plain = _candidates(right, columns)
    if plain:
        return plain[0]
    for e in right:
        if e.bare is not None and columns[e.bare].stray:
            column = columns[e.bare]
            raise data_errors.not_numbers(e.bare, "predictor", column.stray, len(column.values))
    kinds = [(e.text, "a group" if e.group else _KIND_WORDS[columns[e.columns[0]].kind]) for e in right]
    changed = meant is not None and any(meant in e.columns and not e.group for e in right)
    raise errors.no_numeric_predictor(kinds, _plain_formula(formula, right, response, meant) if changed else "")


def _guess(chosen: str, right: list[Expression], columns: Mapping[str, Column]) -> str:
    """Announcement of a focal predictor that was not given."""
    others = [c for c in _candidates(right, columns) if c != chosen]
    inside = dict.fromkeys(c for c in _inside(right, columns) if c not in others)
    text = f"Focal predictor: {chosen}, the " + ("first" if others or inside else "only") + " plain numeric predictor"
    if others:
        text += "; others it could be: " + ", ".join(others)
    if inside:
        text += "; written plain it could also be " + ", ".join(inside)
    return text + "."
