"""The options of %%batten: one table that reads the line, writes the help and feeds the completion.

A reader of our own, since argparse takes values such as -1e3 for options and has wordings of its own that change from
version to version.
"""

from __future__ import annotations

import keyword
import math
import shlex
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from batten.errors import magic as errors

__all__ = ["OPTIONS", "Line", "Option", "read_line", "usage"]


@dataclass(frozen=True)
class Option:
    """name: as typed, "--span"; without dashes it is `examine`'s parameter. takes: what follows. words: for the help.

    read: one value from its text. offers: what completion offers as a value: words to choose from, or "columns",
    "keys", "keys and families", "pairs" (column=...), "rows" (an expression in columns). repeats: may be given again.
    """

    name: str
    takes: tuple[str, ...]
    words: str
    read: Callable[[Option, str], Any]
    offers: str | tuple[str, ...] = ()
    repeats: bool = False

    @property
    def form(self) -> str:
        """How it is written: "--span A B"."""
        return " ".join((self.name, *self.takes))

    @property
    def parameter(self) -> str:
        return self.name.removeprefix("--").replace("-", "_")


def _text(option: Option, text: str) -> str:
    return text


def _number(option: Option, text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise errors.bad_number(option.form, text, whole=False)
    return value


def _whole(option: Option, text: str) -> int:
    try:
        return int(text)
    except ValueError:
        raise errors.bad_number(option.form, text, whole=True) from None


def _name(option: Option, text: str) -> str:
    if not text.isidentifier() or keyword.iskeyword(text):
        raise errors.bad_keep(text, "It is not the name of a variable.")
    return text


def _pair(option: Option, text: str) -> tuple[str, str]:
    name, _, value = (part.strip() for part in text.partition("="))
    if not name or not value:
        raise errors.bad_pair(option.form, text)
    return name, value


_TABLE = (
    Option("--focus", ("NAME",), "predictor in question (the first plain numeric one)", _text, "columns"),
    Option("--aim", ("effect|prediction",), "what the model is for (effect)", _text, ("effect", "prediction")),
    Option("--span", ("A", "B"), "two values of it to compare (its quartiles, rounded)", _number),
    Option("--level", ("LEVEL",), "level of the intervals (0.95)", _number),
    Option("--tolerance", ("T",), "smallest gap that matters, in units of the response", _number),
    Option("--expect", ("rising|falling",), "which way the mean must go", _text, ("rising", "falling")),
    Option("--planned", ("KEY",), 'remedy fixed in advance, such as "log y ~ log x"', _text, "keys"),
    Option("--weights", ("NAME",), "column of weights", _text, "columns"),
    Option("--weights-kind", ("variance|frequency",), "what the weights are", _text, ("variance", "frequency")),
    Option("--cluster", ("NAME",), "column that says which rows belong together", _text, "columns"),
    Option("--exposure", ("NAME",), "column that the response is taken per unit of", _text, "columns"),
    Option("--rows", ("EXPRESSION",), 'rows to use, as for DataFrame.query: "mass_kg < 50"', _text, "rows"),
    Option("--by", ("NAME",), "covariate whose groups are told apart", _text, "columns"),
    Option("--at", ("NAME=VALUE",), "hold a covariate at a value (may be repeated)", _pair, "pairs", repeats=True),
    Option("--only", ("KEY_OR_FAMILY",), "try just these remedies (may be repeated)", _text, "keys and families",
           repeats=True),
    Option("--units", ("NAME=UNIT",), "unit of a column (may be repeated)", _pair, "pairs", repeats=True),
    Option("--errors", ("robust|constant",), "how errors are taken to spread (robust)", _text, ("robust", "constant")),
    Option("--folds", ("K",), "parts that are held out in turn (10)", _whole),
    Option("--repeats", ("R",), "how often the parts are dealt anew (10 below 300 rows, then 1)", _whole),
    Option("--seed", ("S",), "seed of the dealing (0)", _whole),
    Option("--keep", ("NAME",), "bind the examination to this variable", _name),
    Option("--plain", (), "print text instead of the widget", _text),
)  # fmt: skip

OPTIONS = {option.name: option for option in _TABLE}


@dataclass(frozen=True)
class Line:
    """What a %%batten line asks for. frame: the variable's name, "" without. given: values by parameter of `examine`,
    and the magic's own `keep` and `plain`."""

    frame: str
    given: dict[str, Any]


def read_line(line: str) -> Line:
    """Read everything behind %%batten. Quotes work as in a shell; a value may begin with a dash."""
    try:
        words = shlex.split(line)
    except ValueError:
        raise errors.open_quote(line) from None
    loose: list[str] = []
    given: dict[str, list[Any]] = {}
    while words:
        word = words.pop(0)
        if word.startswith("-"):
            option, values = _take(word, words)
            if option.parameter in given and not option.repeats:
                raise errors.given_twice(option.name)
            given.setdefault(option.parameter, []).append(values)
        else:
            loose.append(word)
    if len(loose) > 1:
        raise errors.extra_words(loose[1:])
    frame = loose[0] if loose else ""
    asked = {o.parameter: _joined(o, given[o.parameter]) for o in _TABLE if o.parameter in given}
    if frame and asked.get("keep") == frame:
        raise errors.bad_keep(frame, "It is the data frame's own.")
    return Line(frame, asked)


def _take(word: str, words: list[str]) -> tuple[Option, tuple[Any, ...]]:
    """An option and its values, which are taken off `words`; --level=0.9 is read like --level 0.9."""
    name, sign, inline = word.partition("=")
    option = OPTIONS.get(name)
    if option is None:
        raise errors.unknown_option(name, list(OPTIONS))
    if sign and not option.takes:
        raise errors.takes_no_value(name, inline)
    texts = [inline] if sign else []
    while len(texts) < len(option.takes):
        if not words or words[0].partition("=")[0] in OPTIONS:
            raise errors.missing_value(option.form, texts)
        texts.append(words.pop(0))
    return option, tuple(option.read(option, text) for text in texts)


def _joined(option: Option, values: Sequence[tuple[Any, ...]]) -> Any:
    """The values of one option as `examine` takes them."""
    if option.read is _pair:
        pairs = [pair for (pair,) in values]
        for name, _ in pairs:
            if sum(name == other for other, _ in pairs) > 1:
                raise errors.given_twice(f"{option.name} {name}")
        return dict(pairs)
    if option.repeats:
        return tuple(value for (value,) in values)
    first = values[0]
    return first if len(first) > 1 else first[0] if first else True


def usage() -> str:
    """The help that %%batten? shows."""
    width = max(len(option.form) for option in _TABLE)
    lines = [f"  {option.form:<{width}}  {option.words}" for option in _TABLE]
    return "\n".join([
        "Examine a regression that bends: fit the remedies, compare them fairly, choose, explain.", "",
        "%%batten FRAME [options]", "formula", "",
        "FRAME is the name of a data frame. The formula may run over lines and hold # comments:", "",
        "    %%batten castings --focus mass_kg --units minutes=min", "    minutes ~ mass_kg + C(alloy)", "",
        "Names and expressions with spaces go between quotes.", "", *lines,
    ])  # fmt: skip
