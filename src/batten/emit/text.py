"""Small writing for scripts: literals, comments that cannot break, names that nothing else uses, lines that fit."""

from __future__ import annotations

import contextlib
import io
import keyword
import math
import re
import textwrap
import tokenize
import unicodedata
from collections.abc import Collection
from typing import Any

import numpy as np
import pandas as pd

__all__ = [
    "PLACE", "RESERVED", "WIDTH", "comment", "constant", "docstring", "fstring", "literal", "noted", "number",
    "plain_name", "rounded", "said", "wrapped",
]  # fmt: skip

WIDTH = 120

#: names that formulas, helpers or the script itself give a meaning
RESERVED = frozenset((
    "C", "Q", "I", "np", "pd", "smf", "sm", "x", "y", "z", "e", "b", "bs", "cr", "cc", "te", "poly", "center",
    "standardize", "scale", "log", "exp", "sqrt", "lag", "hashed", "contr", "one", "gap", "frame", "rows", "new",
    "bend", "group", "coded", "as_levels", "natural", "undo", "bent", "mean", "held", "columns", "design",
    "log_y", "root_y", "inverse_y", "square_y",
))  # fmt: skip

#: a letter that no script uses: marks names that belong to the user until the script's own are settled
PLACE = "\ua66e"


def said(text: object, limit: int = 60) -> str:
    """A user's text for a comment or a docstring: one line, printable, no triple quote, not too long."""
    line = " ".join("".join(c if c.isprintable() else " " for c in str(text)).split())
    line = line.replace("\\", "/").replace('"', "'")
    return line if len(line) <= limit else f"{line[: limit - 1]}…"


def literal(value: Any) -> str:
    """Source of a value: exact, the shortest that reads back the same."""
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, pd.Timestamp):
        return f"pd.Timestamp({str(value)!r})"
    if isinstance(value, float):
        return number(value)
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, tuple):
        return f"({', '.join(map(literal, value))}{',' * (len(value) == 1)})"
    if isinstance(value, list):
        return f"[{', '.join(map(literal, value))}]"
    return repr(value)


def _quoted(text: str) -> str:
    """A string in double quotes where it can be; what cannot be printed is escaped."""
    body = "".join(
        c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text.replace("\\", "\\\\")
    )
    if '"' in body and "'" not in body:
        return f"'{body}'"
    return '"' + body.replace('"', '\\"') + '"'


def number(value: float) -> str:
    """A float's shortest exact text; infinite and missing ones by numpy's names."""
    if not math.isfinite(value):
        return "np.nan" if math.isnan(value) else "np.inf" if value > 0 else "-np.inf"
    return repr(float(value))


def rounded(value: float) -> str:
    """Eight digits of a number to assert at 1e-6."""
    return number(float(f"{value:.8g}")) if math.isfinite(value) else number(value)


def fstring(*pieces: str | tuple[str]) -> str:
    """An f-string literal of texts as they stand and (expression,) tuples."""
    body = "".join(f"{{{p[0]}}}" if isinstance(p, tuple) else p.replace("{", "{{").replace("}", "}}") for p in pieces)
    return "f" + _quoted(body)


def comment(text: str) -> list[str]:
    """Comment lines of at most WIDTH."""
    return textwrap.wrap(text, WIDTH, initial_indent="# ", subsequent_indent="#   ", break_long_words=False)


def docstring(text: str) -> list[str]:
    """A function's docstring, on as many lines as it needs."""
    if len(text) + 10 <= WIDTH:
        return [f'    """{text}"""']
    lines = textwrap.wrap(text, WIDTH - 7, break_long_words=False)
    return [f'    """{lines[0]}', *(f"    {line}" for line in lines[1:]), '    """']


def noted(code: str, why: str) -> list[str]:
    """A statement with its reason behind it, or above it where the line would be too long."""
    if len(code) + len(why) + 4 <= WIDTH:
        return [f"{code}  # {why}"]
    indent = len(code) - len(code.lstrip())
    return [" " * indent + line for line in comment(why)] + wrapped(code, indent)


def constant(name: str, value: str, meaning: str) -> list[str]:
    """`NAME = value  # meaning`."""
    return noted(f"{name} = {value}", meaning)


def wrapped(line: str, indent: int = 0) -> list[str]:
    """A statement over as many lines as it needs, broken after the outermost commas that fill a line."""
    places = _breaks(line) if len(line) > WIDTH else {}
    out, start, lead = [], 0, ""
    while len(lead) + len(line) - start > WIDTH:
        room = start + WIDTH - len(lead) + 1
        fits = [p for p in places if start < p <= room] or [p for p in places if p > start][:1]
        if not fits:
            break
        shallow = min(places[p] for p in fits if p - start > (fits[-1] - start) / 2)
        end = max(p for p in fits if places[p] == shallow)
        out.append((lead + line[start:end]).rstrip())
        start, lead = end, " " * (indent + 4)
    return [*out, lead + line[start:]]


def _breaks(line: str) -> dict[int, int]:
    """Where a line may be broken, after a comma and its blank inside brackets, and how deep inside."""
    found, depth = {}, 0
    for token in _tokens(line):
        if token.type == tokenize.OP:
            depth += (token.string in "([{") - (token.string in ")]}")
            if depth and token.string == "," and line[token.end[1] : token.end[1] + 1] == " ":
                found[token.end[1] + 1] = depth
    return found


def _tokens(source: str) -> list[tokenize.TokenInfo]:
    """Tokens of a statement, up to where it breaks off."""
    found: list[tokenize.TokenInfo] = []
    with contextlib.suppress(tokenize.TokenError, IndentationError):
        found.extend(tokenize.generate_tokens(io.StringIO(source).readline))
    return found


def plain_name(text: str, taken: Collection[str], fallback: str) -> str:
    """A lower-case name of letters, digits and underscores for a column, unlike all names taken."""
    ascii_text = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode()
    name = re.sub(r"\W+", "_", ascii_text).strip("_").lower()[:24].strip("_")
    if not name or not re.search("[a-z]", name):
        name = fallback
    if name[0].isdigit():
        name = f"c_{name}"
    if keyword.iskeyword(name) or name in RESERVED:
        name += "_"
    unique, count = name, 2
    while unique in taken or keyword.iskeyword(unique):
        unique, count = f"{name}_{count}", count + 1
    return unique
