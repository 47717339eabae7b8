"""A covariate's expression for a script: plain variables for columns, literals for what the formula learned."""

from __future__ import annotations

import ast
import builtins
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import ModuleType
from typing import Any

import numpy as np

from batten.emit.text import PLACE, literal, number
from batten.frame.formula import Recipe

__all__ = ["Written", "has_literal", "write_expression"]

_NATURAL = '''
def natural(z, knots, heights):
    """Natural cubic splines through columns of `heights` at `knots`, straight beyond the outer knots."""
    curve, inside = CubicSpline(knots, heights, bc_type="natural"), np.clip(z, knots[0], knots[-1])
    return curve(inside) + curve(inside, 1) * np.asarray(z - inside)[:, None]
'''


@dataclass
class Written:
    """source: the expression, or "" where it cannot be written. imports: lines. constants: (name, literal, meaning).
    helper: a function it calls, or "". external: names the user's notebook must define."""

    source: str = ""
    imports: list[str] = field(default_factory=list)
    constants: list[tuple[str, str, str]] = field(default_factory=list)
    helper: str = ""
    external: list[str] = field(default_factory=list)


def write_expression(recipe: Recipe, variables: Mapping[str, str], *, name: str, label: str) -> Written:
    """The recipe's code with variables[safe name] for its columns.

    name: the plain name of the result, for constants. label: how the expression is called in comments.
    """
    out = Written()
    writer = _Writer(recipe, variables, out, name=name.upper(), label=label)
    try:
        out.source = ast.unparse(writer.visit(ast.parse(recipe.code.strip(), mode="eval")))
    except _CannotBeWritten:
        return Written()
    return out


def has_literal(recipe: Recipe) -> bool:
    """Whether everything the recipe learned can be written as numbers (tensor products cannot)."""
    return not any(type(v).__module__.startswith("patsy.") and type(v).__name__ == "TE" for v in recipe.names.values())


class _CannotBeWritten(Exception):
    """A learned transform that has no literal form here."""


class _Writer(ast.NodeTransformer):
    def __init__(self, recipe: Recipe, variables: Mapping[str, str], out: Written, *, name: str, label: str) -> None:
        self.recipe, self.variables, self.out, self.name, self.label = recipe, variables, out, name, label

    def visit_Name(self, node: ast.Name) -> ast.expr:
        if node.id in self.variables:
            return ast.Name(self.variables[node.id])
        value = self.recipe.names.get(node.id)
        if isinstance(value, ModuleType):
            self._import(node.id, value.__name__)
        elif isinstance(value, bool | int | float | str | np.number):
            return _parsed(literal(value))
        elif value is not getattr(builtins, node.id, self):
            self.out.external.append(node.id)
            return ast.Name(PLACE + node.id)
        return node

    def _import(self, name: str, path: str) -> None:
        if name != "np":
            self.out.imports.append(f"import {path}" if path == name else f"import {path} as {name}")

    def visit_Call(self, node: ast.Call) -> ast.AST:
        if isinstance(node.func, ast.Name) and node.func.id in ("I", "C") and len(node.args) == 1:
            return self.visit(node.args[0])  # type: ignore[no-any-return]
        learned = self._learned(node.func)
        if learned is None:
            return self.generic_visit(node)
        return _parsed(self._as_literal(learned, ast.unparse(self.visit(node.args[0])), node.keywords))

    def _learned(self, func: ast.expr) -> Any:
        """The transform whose memory a call uses, or None."""
        if isinstance(func, ast.Attribute) and func.attr == "transform" and isinstance(func.value, ast.Name):
            value = self.recipe.names.get(func.value.id)
            if type(value).__module__.startswith("patsy."):
                return value
        return None

    def _as_literal(self, learned: Any, argument: str, keywords: list[ast.keyword]) -> str:
        kind = type(learned).__name__
        if kind == "Center":
            return f"({argument} - {number(-float(learned.transform(np.zeros(1))[0]))})"
        if kind == "Standardize":
            options = {k.arg: ast.literal_eval(k.value) for k in keywords if k.arg}
            return _affine(learned, argument, options)
        if kind == "BS":
            return self._b_splines(learned, argument)
        if kind in ("CR", "CC"):
            return self._cubic_splines(learned, argument, cyclic=kind == "CC")
        raise _CannotBeWritten(kind)

    def _b_splines(self, learned: Any, argument: str) -> str:
        knots, degree = np.asarray(learned._all_knots, dtype=float), int(learned._degree)
        name, count = self._knots(knots), len(knots) - degree - 1
        self.out.imports.append("from scipy.interpolate import BSpline")
        first = "" if count == self.recipe.width else "[:, 1:]"
        return f"BSpline({name}, np.eye({count}), {degree}, extrapolate=False)({argument}){first}"

    def _cubic_splines(self, learned: Any, argument: str, *, cyclic: bool) -> str:
        """Such splines are settled by their heights at the knots, whatever was centred or left out."""
        knots = np.asarray(learned._all_knots, dtype=float)
        heights = np.asarray(learned.transform(knots), dtype=float)
        heights[-1] = heights[0] if cyclic else heights[-1]  # equal but for rounding
        rows = ", ".join(f"({', '.join(map(number, row))},)" for row in heights)
        name, high = self._knots(knots), f"{self.name}_HEIGHTS"
        self.out.constants.append((high, f"({rows})", f"columns of {self.label} at these knots"))
        self.out.imports.append("from scipy.interpolate import CubicSpline")
        if cyclic:
            return f'CubicSpline({name}, {high}, bc_type="periodic")({argument})'
        self.out.helper = _NATURAL
        return f"natural({argument}, {name}, {high})"

    def _knots(self, knots: Any) -> str:
        name = f"{self.name}_KNOTS"
        self.out.constants.append((name, f"({', '.join(map(number, knots))})", f"knots of {self.label}, learned here"))
        return name


def _affine(learned: Any, argument: str, options: Mapping[str, Any]) -> str:
    """(argument - shift) / size, read off the transform itself at two places far apart."""
    far = 2.0**60
    low, high = (float(learned.transform(np.array([at]), **options)[0]) for at in (0.0, far))
    size = far / (high - low)
    return f"({argument} - {number(-low * size)}) / {number(size)}"


def _parsed(source: str) -> ast.expr:
    return ast.parse(source, mode="eval").body
