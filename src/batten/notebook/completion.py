"""Completion for the magics: data frames, options and their values on the first line, columns in the formula below it,
and the remedies of the last examination behind %batten code."""

from __future__ import annotations

import json
import keyword
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from IPython.core.completer import SimpleCompletion, context_matcher

from batten.families import FAMILIES, default_grid
from batten.notebook.line import SUBCOMMANDS
from batten.notebook.options import OPTIONS, Option
from batten.notebook.variables import column_names, frame_names

__all__ = ["Offer", "add_completion", "offer", "remove_completion"]

IDENTIFIER = "batten"
#: before IPython's own matchers, which would offer files and globals
PRIORITY = 200

_CELL = re.compile(r"\s*%%batten(?=\s)")
_LINE = re.compile(r"(?:^|=)\s*%batten[ \t]+(?P<rest>.*)$")
_WORD = re.compile(r"""(?:[^\s"']|"(?:\\.|[^"\\])*"?|'[^']*'?)+""")
_CALLED_Q = re.compile(r"""Q\(\s*(?P<quote>["'])(?P<typed>(?:(?!(?P=quote)).)*)$""")
_CLOSING = "\"'`)"


@dataclass(frozen=True)
class Offer:
    """fragment: what stands before the cursor and is replaced. words: (text, type), in order."""

    fragment: str
    words: tuple[tuple[str, str], ...]


def add_completion(shell: Any, magics: Any) -> None:
    """magics: whose `last` is the last examination."""

    @context_matcher(identifier=IDENTIFIER, priority=PRIORITY)  # type: ignore[untyped-decorator]
    def matcher(context: Any) -> dict[str, Any]:
        lines = context.full_text.split("\n")
        line, at = lines[context.cursor_line], context.cursor_position
        before = "\n".join([*lines[: context.cursor_line], line[:at]])
        found = offer(before, after=line[at:], variables=shell.user_ns, keys=magics.last or ())
        if found is None:
            return {"completions": []}
        completions = [SimpleCompletion(text, type=kind) for text, kind in found.words]
        return {"completions": completions, "matched_fragment": found.fragment, "suppress": True, "ordered": True}

    shell.Completer.custom_matchers.append(matcher)


def remove_completion(shell: Any) -> None:
    kept = [m for m in shell.Completer.custom_matchers if getattr(m, "matcher_identifier", "") != IDENTIFIER]
    shell.Completer.custom_matchers[:] = kept


def offer(before: str, *, after: str, variables: Mapping[str, Any], keys: Iterable[str]) -> Offer | None:
    """What can stand at the cursor; None where that is none of our business.

    before, after: the cell's text up to the cursor, and the rest of that line. keys: of the last examination.
    """
    cell = _CELL.match(before)
    line = _LINE.search(before.rpartition("\n")[2])
    if cell:
        first, below, body = before[cell.end() :].partition("\n")
        found = _in_formula(body, _columns(first, variables)) if below else _on_line(first, variables)
    elif line:
        found = _on_line_magic(line["rest"], keys)
    else:
        return None
    return found and Offer(found.fragment, tuple((_without_closing(text, after), kind) for text, kind in found.words))


def _without_closing(text: str, after: str) -> str:
    """Closing quotes and brackets that an editor has put behind the cursor already are not repeated."""
    for length in (2, 1):
        end = text[-length:]
        if after.startswith(end) and not end.strip(_CLOSING):
            return text[:-length]
    return text


# --- below the line ---------------------------------------------------------------------------------------------------


def _in_formula(body: str, columns: list[str]) -> Offer | None:
    line = body.rpartition("\n")[2]
    quoted = _CALLED_Q.search(line)
    if quoted:
        return Offer(quoted[0], tuple((_called_q(c), "column") for c in columns if c.startswith(quoted["typed"])))
    typed = re.search(r"\w*$", line)[0]  # type: ignore[index]
    if "#" in line or line[: len(line) - len(typed)].endswith("."):
        return None
    words = [(c if _plain(c) else _called_q(c), "column") for c in columns if c.startswith(typed)]
    if columns and "C(".startswith(typed):
        words.append(("C(", "function"))
    return Offer(typed, tuple(words))


def _plain(name: str) -> bool:
    return name.isidentifier() and not keyword.iskeyword(name)


def _called_q(name: str) -> str:
    """A column with an unusual name, as a formula takes it; JSON's quoting is Python's too."""
    return f"Q({json.dumps(name, ensure_ascii=False)})"


# --- on the line of %%batten ------------------------------------------------------------------------------------------


def _columns(line: str, variables: Mapping[str, Any]) -> list[str]:
    words, at_end = _words(line)
    frame, _, _ = _read([*words, at_end])
    return column_names(variables.get(frame)) or []


def _on_line(line: str, variables: Mapping[str, Any]) -> Offer | None:
    words, fragment = _words(line)
    frame, given, waiting = _read(words)
    if waiting:
        return _values(waiting, fragment, column_names(variables.get(frame)) or [])
    frames = [] if frame else frame_names(variables)
    options = [o.name for o in OPTIONS.values() if o.repeats or o.name not in given]
    if frames and not fragment.startswith("-"):
        return Offer(fragment, tuple((name, "data frame") for name in frames if name.startswith(fragment)))
    return Offer(fragment, tuple((name, "option") for name in options if name.startswith(fragment)))


def _words(line: str) -> tuple[list[str], str]:
    """Whole words on the line, quotes taken off, and the unfinished word at its end as it stands there."""
    found = list(_WORD.finditer(line))
    fragment = found.pop()[0] if found and found[-1].end() == len(line) else ""
    return [match[0].strip("\"'") for match in found], fragment


def _read(words: list[str]) -> tuple[str, set[str], Option | None]:
    """The data frame's name, the options given, and the option that waits for a value."""
    frame, given, option, wanted = "", set(), None, 0
    for word in words:
        if wanted:
            wanted -= 1
        elif word in OPTIONS:
            option = OPTIONS[word]
            wanted = len(option.takes)
            given.add(word)
        elif not word.startswith("-") and not frame:
            frame = word
    return frame, given, option if wanted else None


def _values(option: Option, fragment: str, columns: list[str]) -> Offer | None:
    quote = fragment[:1] if fragment[:1] in ("'", '"') else ""
    typed = fragment[len(quote) :]
    if quote and typed.endswith(quote):
        return None
    if option.offers == "rows":
        return _in_rows(typed, quote, columns)
    if option.offers == "pairs":
        return Offer(fragment, tuple((_opened(c, quote), "column") for c in columns if c.startswith(typed)))
    words = [(text, kind) for text, kind in _choices(option, columns) if text.startswith(typed)]
    return Offer(fragment, tuple((_quoted(text, quote), kind) for text, kind in words))


def _choices(option: Option, columns: list[str]) -> list[tuple[str, str]]:
    if option.offers == "columns":
        return [(name, "column") for name in columns]
    if isinstance(option.offers, tuple):
        return [(word, "value") for word in option.offers]
    keys = [(key, "remedy") for key in _default_keys()]
    return {"keys": keys, "keys and families": [*((name, "family") for name in FAMILIES), *keys]}[option.offers]


def _default_keys() -> list[str]:
    """Keys that are tried by default on a response from 0 to 1, which has them all."""
    return [r.key for r in default_grid(np.array([0.5, 1.0]), np.array([1.0, 2.0]), zero_is_arbitrary=False)]


def _in_rows(typed: str, quote: str, columns: list[str]) -> Offer:
    """Columns at the end of an expression, which is put in quotes; unusual names stand in backticks."""
    name = re.search(r"`[^`]*$|\w*$", typed)[0]  # type: ignore[index]
    opening = "" if quote or typed != name else '"'
    found = [c for c in columns if c.startswith(name.lstrip("`"))]
    return Offer(name, tuple((opening + (c if _plain(c) else f"`{c}`"), "column") for c in found))


def _quoted(text: str, quote: str) -> str:
    """A value as the line takes it, in quotes where it needs them or they are opened already."""
    if not quote and re.fullmatch(r"[^\s\"'\\]+", text):
        return text
    if quote == "'" and "'" not in text:
        return f"'{text}'"
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'


def _opened(name: str, quote: str) -> str:
    """A column with = behind it; quotes that it needs stay open for the value."""
    text = _quoted(f"{name}=", quote)
    return text[:-1] if text[0] in "\"'" else text


# --- on the line of %batten -------------------------------------------------------------------------------------------


def _on_line_magic(rest: str, keys: Iterable[str]) -> Offer | None:
    word, behind, typed = rest.partition(" ")
    if not behind:
        return Offer(word, tuple((name, "command") for name in SUBCOMMANDS if name.startswith(word)))
    if word != "code":
        return None
    typed = typed.lstrip()
    return Offer(typed, tuple((key, "remedy") for key in keys if key.startswith(typed)))
