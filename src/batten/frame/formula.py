"""One formula: parsed and coded by patsy, the engine statsmodels uses by default; the only module that imports it.

Patsy decides what the operators mean, which contrasts make the terms non-redundant, and what center(), bs() and the
like remember. Everything it finds out is handed on as plain values that pickle.
"""

from __future__ import annotations

import builtins
import importlib
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from types import ModuleType
from typing import Any

import numpy as np
import patsy
import patsy.builtins
from patsy.eval import EvalEnvironment, EvalFactor, ast_names
from patsy.infix_parser import ParseNode
from patsy.parse_formula import parse_formula

from batten.engine.rows import Array
from batten.errors import formula as errors
from batten.frame.spelling import check_spelling, on_one_line

__all__ = [
    "Block",
    "Formula",
    "Grouping",
    "LearningError",
    "Recipe",
    "grouping",
    "learn",
    "namespace",
    "parse",
    "without_memory",
]

_BOX = type(patsy.builtins.C(None))

# what patsy objects to -> why it cannot be read, and what to do
_OBJECTIONS = (
    ("the expression ended", "nothing follows this sign", "Add what should follow, or remove the sign."),
    ("expected a noun", "no column stands before this sign", "Add the column that is missing, or remove the sign."),
    ("expected an operator", "no sign joins this to what stands before it", "Join predictors with +."),
    ("intercept term cannot", "a bare 1 can be added or removed, not combined", "Arithmetic goes inside I(): I(1/z)."),
    ("requires a positive", "a bare power must be a whole number", "Arithmetic goes inside I(): I(z**0.5)."),
    ("Unary minus", "a minus takes away a term or the intercept", "Arithmetic goes inside I(): I(-z)."),
    ("numbers besides", "a bare number other than 0 and 1 is no term", "Arithmetic goes inside I(): I(2*z)."),
)


@dataclass(frozen=True)
class Formula:
    """A parsed formula, not yet looked up in any data.

    text: on one line, without comments. left: what stands before the ~. response: the factors in it; `plain_response`
    is False when signs or several terms stand there. terms: factors of each term after the ~; () is the intercept.
    places: where each factor stands in the text. powers: bare powers of one column, `x**2`, which mean just `x`.
    """

    text: str
    left: str
    response: tuple[str, ...]
    plain_response: bool
    terms: tuple[tuple[str, ...], ...]
    places: Mapping[str, tuple[int, int]]
    powers: tuple[str, ...]

    def rewritten(self, response: str, names: Mapping[str, str | None]) -> str:
        """The formula with some factors renamed (None: left out); terms that become equal are kept once."""
        kept: dict[frozenset[str], tuple[str, ...]] = {}
        for term in self.terms:
            factors = [names.get(f, f) for f in term]
            if term and None not in factors:
                distinct = tuple(dict.fromkeys(str(f) for f in factors))
                kept.setdefault(frozenset(distinct), distinct)
        right = [":".join(term) for term in kept.values()]
        if () not in self.terms:
            right.insert(0, "0")
        return f"{response} ~ " + " + ".join(right)


def parse(text: str) -> Formula:
    """Read the formula's grammar; errors point at the place with carets."""
    text = on_one_line(text)
    check_spelling(text)
    try:
        tree = parse_formula(text)
        right = patsy.ModelDesc.from_formula(ParseNode("~", None, [tree.args[-1]], tree.origin)).rhs_termlist
    except patsy.PatsyError as error:
        raise _translated(text, error) from None
    leaves = list(_leaves(tree))
    places = {EvalFactor(leaf.token.extra).code: (leaf.origin.start, leaf.origin.end) for leaf in reversed(leaves)}
    return Formula(
        text=text,
        left=tree.args[0].origin.relevant_code(),
        response=tuple(dict.fromkeys(EvalFactor(leaf.token.extra).code for leaf in _leaves(tree.args[0]))),
        plain_response=tree.args[0].type == "PYTHON_EXPR",
        terms=tuple(tuple(f.code for f in term.factors) for term in right),
        places=places,
        powers=tuple(dict.fromkeys(_bare_powers(tree.args[1]))),
    )


def _translated(text: str, error: patsy.PatsyError) -> Exception:
    """Patsy's objection in plain words, with carets under its place."""
    place = (error.origin.start, error.origin.end) if error.origin is not None else (0, len(text))
    for sign, why, do in _OBJECTIONS:
        if sign in error.message:
            return errors.unreadable(text, *place, why=why, do=do)
    return errors.unreadable(text, *place, why=error.message, do="Correct it there.")


def _leaves(node: ParseNode) -> Iterable[ParseNode]:
    """The factors below a node, left to right."""
    if node.type == "PYTHON_EXPR":
        yield node
    for arg in node.args:
        yield from _leaves(arg)


def _bare_powers(node: ParseNode) -> Iterable[str]:
    if node.type == "**" and node.args[0].type == "PYTHON_EXPR":
        yield node.origin.relevant_code()
    for arg in node.args:
        yield from _bare_powers(arg)


# --- coding -----------------------------------------------------------------------------------------------------------


def namespace(env: Mapping[str, Any] | None) -> dict[str, Any]:
    """Names a formula may use beside columns: Python's own, numpy as np, patsy's, then the caller's.

    What the grammar itself needs (C, I, Q) is not hidden by variables of the caller, nor patsy's functions by variables
    that are none.
    """
    own = {name: getattr(patsy.builtins, name) for name in patsy.builtins.__all__}
    grammar = {name: own[name] for name in ("C", "I", "Q")}
    given = {name: value for name, value in (env or {}).items() if name not in own or callable(value)}
    return {**vars(builtins), "np": np, **own, **given, **grammar}


@dataclass(frozen=True)
class Grouping:
    """What C(column, ...) asks for. reference: first level (treatment coding). levels: in this order, or None.

    contrast: patsy's object for any other coding, else None.
    """

    reference: Any = None
    levels: tuple[Any, ...] | None = None
    contrast: Any = None


def grouping(code: str, names: Mapping[str, Any]) -> Grouping:
    """Read C(None, contrast, levels=...)."""
    value = eval(code, dict(names))
    levels = None if value.levels is None else tuple(value.levels)
    contrast = value.contrast
    if contrast is None or contrast is patsy.Treatment:
        return Grouping(levels=levels)
    if isinstance(contrast, patsy.Treatment):
        return Grouping(contrast.reference, levels)
    return Grouping(None, levels, contrast)


class LearningError(Exception):
    """A factor that patsy could not work out: its code, and what was said."""

    def __init__(self, code: str, message: str) -> None:
        super().__init__(code, message)
        self.code, self.message = code, message


@dataclass(frozen=True, eq=False)
class Recipe:
    """How one factor is worked out on any rows, with what it learned.

    code: Python in safe column names. names: the functions and learned transforms it calls. levels: of a group, else
    None. width: columns of a numeric factor (0 for a group).
    """

    code: str
    names: Mapping[str, Any]
    levels: tuple[Any, ...] | None
    width: int

    def evaluate(self, data: Mapping[str, Any]) -> Any:
        """The factor's values on some rows, as its code gives them."""
        with np.errstate(all="ignore"):  # values that are no numbers are found, counted and named by the caller
            value = eval(self.code, {**self.names, **data})
        return value.data if isinstance(value, _BOX) else value

    def __getstate__(self) -> dict[str, Any]:
        """Modules go by name and patsy's learned transforms as their class and numbers: neither pickles by itself."""
        return {**vars(self), "names": {name: _packed(value) for name, value in self.names.items()}}

    def __setstate__(self, state: dict[str, Any]) -> None:
        vars(self).update({**state, "names": {name: _unpacked(value) for name, value in state["names"].items()}})


def _packed(value: Any) -> Any:
    if isinstance(value, ModuleType):
        return ("module", value.__name__)
    if type(value).__module__.startswith("patsy."):
        return ("learned", type(value), dict(vars(value)))
    return ("as it is", value)


def _unpacked(packed: Any) -> Any:
    kind, value, *rest = packed
    if kind == "module":
        return importlib.import_module(value)
    if kind == "learned":
        made = value.__new__(value)
        vars(made).update(rest[0])
        return made
    return value


@dataclass(frozen=True, eq=False)
class Block:
    """Columns that belong to one term: the product of its factors, the first factor's columns varying fastest.

    term: position in the terms given to `learn`. factors: codes, each with its contrast (levels, columns) or None when
    it is numeric.
    """

    term: int
    factors: tuple[tuple[str, Array | None], ...]

    def has(self, code: str) -> bool:
        return any(own == code for own, _ in self.factors)

    def width(self, recipes: Mapping[str, Recipe]) -> int:
        """Number of columns."""
        return math.prod(recipes[own].width if c is None else c.shape[1] for own, c in self.factors)

    def without(self, code: str) -> tuple[tuple[str, Array | None], ...]:
        return tuple(pair for pair in self.factors if pair[0] != code)


def learn(
    terms: Sequence[tuple[str, ...]], data: Mapping[str, Any], names: Mapping[str, Any]
) -> tuple[dict[str, Recipe], list[Block]]:
    """Let patsy code the terms (factors in safe names) on the analysis rows; blocks come in patsy's column order.

    A text that fails raises LearningError with its code.
    """
    made = {code: EvalFactor(code) for term in terms for code in term}
    codes = {factor: code for code, factor in made.items()}
    as_patsy = [patsy.Term([made[code] for code in term]) for term in terms]
    try:
        info = _design_info(as_patsy, data, names)
    except Exception:
        for code, factor in made.items():  # which factor it was, patsy does not always say
            try:
                _design_info([patsy.Term([factor])], data, names)
            except Exception as error:
                said = error.message if isinstance(error, patsy.PatsyError) else f"{type(error).__name__}: {error}"
                raise LearningError(code, said.removeprefix("Error evaluating factor: ")) from None
        raise
    recipes = {codes[factor]: _recipe(found) for factor, found in info.factor_infos.items()}
    blocks = []
    for term, subterms in info.term_codings.items():
        for subterm in subterms:
            pieces = [(codes[f], subterm.contrast_matrices.get(f)) for f in subterm.factors]
            parts = tuple((code, None if c is None else np.asarray(c.matrix, dtype=float)) for code, c in pieces)
            blocks.append(Block(as_patsy.index(term), parts))
    return recipes, blocks


def _design_info(terms: Sequence[Any], data: Mapping[str, Any], names: Mapping[str, Any]) -> Any:
    with np.errstate(all="ignore"):  # values that are no numbers are found, counted and named by the caller
        return patsy.design_matrix_builders([terms], lambda: iter([data]), EvalEnvironment([dict(names)]))[0]


def _recipe(found: Any) -> Recipe:
    state = found.state
    known = state["eval_env"].namespace
    names = {name: known[name] for name in ast_names(state["eval_code"]) if name in known}
    return Recipe(
        code=state["eval_code"],
        names={**names, **state["transforms"]},
        levels=None if found.categories is None else tuple(found.categories),
        width=found.num_columns or 0,
    )


def without_memory(names: Mapping[str, Any]) -> dict[str, Any]:
    """The same names with center(), bs() and the like passing their argument through: to find rows that are no number
    before anything is learned from them."""
    return {
        name: (lambda x, *_, **__: x) if hasattr(value, "__patsy_stateful_transform__") else value
        for name, value in names.items()
    }
