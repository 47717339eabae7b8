"""Reads remedy keys: "log y ~ spline4 x".

    key    := [weighted] left "~" right
    left   := y | log y | sqrt y | 1/y | y^2 | boxcox[(L)] y | yeojohnson[(L)] y | logit(a,b) y | log1p y | asinh y
            | loglink y | loglink-gamma y | loglink-gaussian y | invlink-gamma y | share y
    right  := x | 1/x | x^NUMBER | x^p | (log|sqrt|polyN|fp1|fp2|binsN|cut|hinge|hinge2|splineN|smooth|CURVE) x
            | (bins|spline|hinge|hinge2|fp1|fp2)(list of numbers) x

Every member reads its own word (`read`), so that a new family needs no change here.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from typing import TypeVar

from batten.errors import keys
from batten.families.base import Constants, Link, Scale, Shape
from batten.families.numbers import number
from batten.families.registry import curves, links, scales, shapes

__all__ = ["read_left", "read_right", "split"]

Member = TypeVar("Member", Scale, Link, Shape)

_BRACKET = re.compile(r"(?P<word>[^()]+?) ?\((?P<numbers>[^()]*)\)")


def split(text: str) -> tuple[bool, str, str]:
    """(weighted, left, right) of a key, spaces tidied."""
    sides = [_tidy(side) for side in text.split("~")]
    if len(sides) != 2 or not all(sides):
        raise keys.key_form(text)
    left, right = sides
    weighted = left.startswith("weighted ")
    return weighted, left.removeprefix("weighted "), right


def read_left(part: str, text: str) -> Scale | Link:
    """The scale or link on the left of a key; `text` is the whole key, for the message."""
    word, numbers = _word(part, "y", text)
    found = _first(scales(), word, numbers) or _first(links(), word, numbers)
    if found is None:
        options = [m.key for m in scales()] + [m.key for m in links()]
        raise keys.unknown_part(text, part, side="response", options=options)
    return found


def read_right(part: str, text: str) -> Shape:
    """The shape or curve on the right of a key."""
    word, numbers = _word(part, "x", text)
    found = _first((*shapes(), *curves()), word, numbers)
    if found is None:
        raise keys.unknown_part(text, part, side="predictor", options=[m.key for m in (*shapes(), *curves())])
    return found


def _tidy(side: str) -> str:
    """One blank between words, none around ^ and /, one before the variable after a bracket."""
    side = re.sub(r"\s*([\^/])\s*", r"\1", " ".join(side.split()))
    return re.sub(r"\)\s*([xy])$", r") \1", side)


def _word(part: str, variable: str, text: str) -> tuple[str, Constants | None]:
    """ "bins(10, 20) x" -> ("bins", (10.0, 20.0)); "log x" -> ("log", None); "1/x" -> ("1/x", None)."""
    body = part.removesuffix(f" {variable}")
    bracket = _BRACKET.fullmatch(body)
    if not bracket or body == part:
        return body, None
    inside = bracket["numbers"].strip()
    numbers = [number(part.strip()) for part in inside.split(",")] if inside else []
    found = tuple(value for value in numbers if value is not None)
    if len(found) < len(numbers):
        raise keys.wrong_numbers(text, "Brackets in a key hold numbers with commas between them.",
                                 instead="Write y ~ bins(10, 20, 40) x.")  # fmt: skip
    return bracket["word"], found


def _first(members: Iterable[Member], word: str, numbers: Constants | None) -> Member | None:
    for member in members:
        found = member.read(word, numbers)
        if found is not None:
            return found
    return None
