"""One factor of a formula as Python text: the columns it uses, and the same text with the columns renamed.

A column may be called anything: `C`, `np`, `class`, "melt temperature". So columns are never looked up by the text of
the formula; each is renamed to a safe name before anything is evaluated, and labels are made from the user's names.
"""

from __future__ import annotations

import ast
import re
import unicodedata
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import ModuleType
from typing import Any

from batten.errors import formula as errors

__all__ = ["Expression", "read_expression"]

_DOTTED = re.compile(r"[^\W\d]\w*(\.[^\W\d]\w*)*")


@dataclass(frozen=True)
class Expression:
    """A factor as the formula has it.

    text: as typed, spacing as patsy normalises it. columns: names of the columns used, in order of appearance.
    bare: the column, when the text is that and nothing else (`x`, `Q("melt temperature")`).
    group: the column, when the text is C(column) or C(column, ...). calls: other names the text needs (np, my_func).
    """

    text: str
    columns: tuple[str, ...]
    bare: str | None = None
    group: str | None = None
    calls: tuple[str, ...] = ()

    def written(self, names: Mapping[str, str]) -> str:
        """The text with every column replaced by names[column], which may be any Python expression or label."""
        if self.bare is not None:
            return names[self.bare]
        return ast.unparse(_Renamed(self.columns, self.calls, names).visit(_parsed(self.text)))

    @property
    def label(self) -> str:
        """The text for reading: columns unquoted, I() and C() around the whole left out."""
        shown = self.written({c: c for c in self.columns})
        body = _parsed(self.text).body if self.bare is None else None
        wrapped = isinstance(body, ast.Call) and isinstance(body.func, ast.Name) and body.func.id in ("I", "C")
        if isinstance(body, ast.Call) and wrapped and len(body.args) == 1 and not body.keywords:
            return shown[2:-1]
        return self.group if self.group is not None else shown

    def arguments(self) -> str:
        """C(column, ...) with None in the column's place, so that contrast and levels can be read from it."""
        tree = _parsed(self.text)
        call = tree.body
        assert isinstance(call, ast.Call)
        call.args[0] = ast.Constant(None)
        return ast.unparse(tree)


def read_expression(text: str, columns: Iterable[object], namespace: Mapping[str, Any]) -> Expression:
    """Find the columns in one factor's text; refuse names that are neither columns nor in the namespace.

    Text that is no Python raises SyntaxError.
    """
    known = {c for c in columns if isinstance(c, str)}
    if _is_plain_name(text, known, namespace):
        return Expression(text, (text,), bare=text)
    if text in known and _DOTTED.fullmatch(text):
        raise errors.read_as_attribute(text)
    finder = _Finder(known, namespace)
    tree = _parsed(text)
    finder.visit(tree)
    if finder.uncallable:
        raise errors.unknown_function(finder.uncallable[0], text)
    if finder.unknown:
        raise errors.unknown_column(finder.unknown[0], known)
    found = tuple(dict.fromkeys(finder.found))
    if not found:
        raise errors.no_column_in(text, known)
    bare = finder.column(tree.body)
    return Expression(text, found, bare=bare, group=_group(tree.body, finder), calls=tuple(dict.fromkeys(finder.calls)))


def _is_plain_name(text: str, known: set[str], namespace: Mapping[str, Any]) -> bool:
    """A column typed as it is called: also a Python keyword (class), also mass.kg where nothing is called mass."""
    if text not in known or not _DOTTED.fullmatch(text):
        return False
    root = text.partition(".")[0]
    return root == text or not (root in known or root in namespace)


def _parsed(text: str) -> ast.Expression:
    return ast.parse(text, mode="eval")


def _group(body: ast.expr, finder: _Finder) -> str | None:
    """The column of C(column, ...)."""
    if isinstance(body, ast.Call) and isinstance(body.func, ast.Name) and body.func.id == "C" and body.args:
        return finder.column(body.args[0])
    return None


def _quoted(node: ast.AST) -> str | None:
    """The name in Q("name"); None when the node is no call of Q."""
    if not (isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "Q"):
        return None
    if len(node.args) == 1 and isinstance(node.args[0], ast.Constant) and isinstance(node.args[0].value, str):
        return node.args[0].value
    raise errors.quoted_name_needed(ast.unparse(node))


class _Finder(ast.NodeVisitor):
    """Sorts the names of a text into columns, names of the namespace, and unknown ones."""

    def __init__(self, known: set[str], namespace: Mapping[str, Any]) -> None:
        # Python reads identifiers in normal form KC: the micro sign and the Greek mu are one name to it.
        self.plain = {unicodedata.normalize("NFKC", c): c for c in sorted(known)} | {c: c for c in known}
        self.known, self.namespace = known, namespace
        self.found: list[str] = []
        self.calls: list[str] = []
        self.unknown: list[str] = []
        self.uncallable: list[str] = []

    def column(self, node: ast.AST) -> str | None:
        """The column a node stands for, when it is a bare name or a quoted one."""
        if isinstance(node, ast.Name):
            return self.plain.get(node.id)
        quoted = _quoted(node)
        return quoted if quoted in self.known else None

    def visit_Call(self, node: ast.Call) -> None:
        quoted = _quoted(node)
        if quoted is not None:
            (self.found if quoted in self.known else self.unknown).append(quoted)
            return
        root = node.func.value if isinstance(node.func, ast.Attribute) else node.func
        if isinstance(node.func, ast.Name):
            # what is called is a function, whatever the columns are called
            (self.calls if node.func.id in self.namespace else self.uncallable).append(node.func.id)
        elif isinstance(root, ast.Name) and root.id not in self.plain and root.id not in self.namespace:
            self.uncallable.append(root.id)
        else:
            self.visit(node.func)
        for part in (*node.args, *node.keywords):
            self.visit(part)

    def visit_Attribute(self, node: ast.Attribute) -> None:
        root = node.value
        if isinstance(root, ast.Name) and self._is_module(root.id):
            self.calls.append(root.id)
        else:
            self.visit(root)

    def _is_module(self, name: str) -> bool:
        return isinstance(self.namespace.get(name), ModuleType)

    def visit_Name(self, node: ast.Name) -> None:
        if node.id in self.plain:
            self.found.append(self.plain[node.id])
        elif node.id in self.namespace:
            self.calls.append(node.id)
        else:
            self.unknown.append(node.id)


class _Renamed(ast.NodeTransformer):
    """Puts other names in the columns' places; follows the same rules as the finder."""

    def __init__(self, columns: Iterable[str], calls: Iterable[str], names: Mapping[str, str]) -> None:
        self.plain = {unicodedata.normalize("NFKC", c): names[c] for c in columns} | {c: names[c] for c in columns}
        self.calls, self.names = set(calls), names

    def visit_Call(self, node: ast.Call) -> ast.expr:
        quoted = _quoted(node)
        if quoted is not None:
            return ast.Name(self.names[quoted], ast.Load())
        if not isinstance(node.func, ast.Name):
            node.func = self.visit(node.func)
        node.args = [self.visit(a) for a in node.args]
        node.keywords = [self.visit(k) for k in node.keywords]
        return node

    def visit_Attribute(self, node: ast.Attribute) -> ast.expr:
        # `np.log` where a column is called np: the finder listed np among the calls
        if not (isinstance(node.value, ast.Name) and node.value.id in self.calls):
            node.value = self.visit(node.value)
        return node

    def visit_Name(self, node: ast.Name) -> ast.expr:
        return ast.Name(self.plain.get(node.id, node.id), ast.Load())
