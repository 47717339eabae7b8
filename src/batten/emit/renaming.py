"""Keeps a script's own names apart from those of the user's frame and functions."""

from __future__ import annotations

import ast
import io
import re
import tokenize
from collections.abc import Iterable

__all__ = ["without_names"]


def without_names(source: str, theirs: Iterable[str]) -> str:
    """The script with an underscore added to every name of its own that is among theirs."""
    tree = ast.parse(source)
    names = _own_names(tree) & set(theirs)
    if not names:
        return source
    lines = source.splitlines(keepends=True)
    foreign = _foreign_keywords(tree, lines)
    edits: dict[int, list[tuple[int, int, str]]] = {}
    for token in tokenize.generate_tokens(io.StringIO(source).readline):
        new = _renamed(token, names, lines[token.start[0] - 1] if token.start[0] <= len(lines) else "", foreign)
        if new != token.string:
            edits.setdefault(token.start[0], []).append((token.start[1], token.end[1], new))
    for row, changes in edits.items():
        for start, end, new in reversed(changes):
            lines[row - 1] = lines[row - 1][:start] + new + lines[row - 1][end:]
    return "".join(lines)


def _own_names(tree: ast.Module) -> set[str]:
    """Everything the script assigns, defines or imports."""
    found: set[str] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Name) and isinstance(node.ctx, ast.Store):
            found.add(node.id)
        elif isinstance(node, ast.FunctionDef):
            found.add(node.name)
        elif isinstance(node, ast.arg):
            found.add(node.arg)
        elif isinstance(node, ast.Import | ast.ImportFrom):
            found |= {(alias.asname or alias.name).partition(".")[0] for alias in node.names}
    return found


def _foreign_keywords(tree: ast.Module, lines: list[str]) -> set[tuple[int, int]]:
    """Places (row, character) of keywords that belong to functions of a library."""
    defined = {node.name for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)}
    found = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Call) and not (isinstance(node.func, ast.Name) and node.func.id in defined):
            for word in node.keywords:
                before = lines[word.lineno - 1].encode()[: word.col_offset].decode()
                found.add((word.lineno, len(before)))
    return found


def _renamed(token: tokenize.TokenInfo, names: set[str], line: str, foreign: set[tuple[int, int]]) -> str:
    if token.type == tokenize.NAME and token.string in names:
        keep = token.start in foreign or line[: token.start[1]].endswith(".")
        if line.lstrip().startswith(("import ", "from ")) and f" as {token.string}" not in line:
            return f"{token.string} as {token.string}_" if not keep else token.string
        return token.string if keep else f"{token.string}_"
    if token.type == tokenize.STRING and token.string.startswith("f"):
        new = token.string
        for name in names:
            new = re.sub(rf"(?<!\{{)\{{{re.escape(name)}(?=\W)", f"{{{name}_", new)
        return new
    return token.string
