"""The formula as text, before it is parsed: comments, line breaks, quotation marks, brackets, stray signs."""

from __future__ import annotations

import re

from batten.errors import formula as errors

__all__ = ["check_spelling", "on_one_line"]

_STRING = r"\"(?:\\.|[^\"\\])*\"|'(?:\\.|[^'\\])*'"


def on_one_line(text: str) -> str:
    """Comments removed, lines joined; quoted names are left alone."""
    return re.sub(rf"({_STRING})|(?:#[^\n]*|\\\n|\s)+", lambda m: m.group(1) or " ", text).strip()


def check_spelling(text: str) -> None:
    """Find what keeps a text from being a formula at all, with carets under the place."""
    masked = _masked(text)
    _check_ends(text, masked)
    _check_signs(text, masked)


def _masked(text: str) -> str:
    """The text with everything in quotation marks replaced by x, so that signs can be looked for."""
    return re.sub(_STRING, lambda m: "x" * len(m.group()), text)


def _check_ends(text: str, masked: str) -> None:
    left, tilde, right = masked.partition("~")
    if not tilde:
        raise errors.no_tilde(text)
    if not left.strip():
        raise errors.no_response(text)
    if not right.strip():
        raise errors.no_right_side(text)
    second, hanging = right.find("~"), left.rstrip()
    if second >= 0:
        at = len(left) + 1 + second
        raise errors.unreadable(text, at, at + 1, why="a formula has one ~", do="Join predictors with +.")
    if hanging[-1] in "+-*/:":
        at = len(hanging) - 1
        do = "Add what should follow, or remove the sign."
        raise errors.unreadable(text, at, at + 1, why="nothing follows this sign", do=do)


def _check_signs(text: str, masked: str) -> None:
    """What Python's tokenizer reports differently from version to version: quotes, brackets, stray signs."""
    opened: list[int] = []
    pairs = {")": "(", "]": "[", "}": "{"}
    for i, sign in enumerate(masked):
        if sign in "\"'":
            do = "Close it, or remove it."
            raise errors.unreadable(text, i, i + 1, why="this quotation mark is never closed", do=do)
        if sign in "`$?;\\" or (sign == "!" and masked[i + 1 : i + 2] != "="):
            do = 'A column with an unusual name is written Q("its name").'
            raise errors.unreadable(text, i, i + 1, why="this sign has no meaning in a formula", do=do)
        if sign in "^|" and not opened:
            do = "A power is I(z**2), an interaction a:b or a*b."
            raise errors.unreadable(text, i, i + 1, why="this sign has no meaning in a formula", do=do)
        if sign in "([{":
            opened.append(i)
        elif sign in pairs:
            if not opened or masked[opened[-1]] != pairs[sign]:
                do = "Open it, or remove it."
                raise errors.unreadable(text, i, i + 1, why="this bracket was never opened", do=do)
            opened.pop()
    if opened:
        at = opened[-1]
        raise errors.unreadable(text, at, at + 1, why="this bracket is never closed", do="Close it, or remove it.")
