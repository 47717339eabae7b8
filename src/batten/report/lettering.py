"""Names as they can be drawn: on one line, in glyphs that exist, never wider than the room there is."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable
from functools import cache

from matplotlib.font_manager import FontProperties, findfont, fontManager
from matplotlib.ft2font import FT2Font, LoadFlags

from batten.report.style import FONT, TEXT

__all__ = [
    "MEASURED", "advance", "drawn", "families", "fitted", "font_of", "plain", "shortened", "titled", "width_of",
    "wrapped",
]  # fmt: skip

#: tried, where installed, for letters that the first font lacks
_FURTHER = (
    "Noto Sans", "Noto Sans CJK SC", "Noto Sans CJK JP", "Noto Sans Devanagari", "Noto Sans Arabic",
    "WenQuanYi Zen Hei", "Microsoft YaHei", "PingFang SC", "Hiragino Sans", "Malgun Gothic", "Arial Unicode MS",
)  # fmt: skip
_MISSING = "□"
#: points at which letters are measured
MEASURED = 100


def plain(text: object) -> str:
    """Any name on one line, without control characters."""
    line = " ".join(str(text).split())
    return "".join(c for c in line if unicodedata.category(c)[0] != "C")


def shortened(text: object, limit: int) -> str:
    """At most `limit` characters, the middle left out: a column's beginning and end tell it apart from others."""
    line = plain(text)
    if len(line) <= limit:
        return line
    head = (limit - 1) * 2 // 3
    return f"{line[:head].rstrip()}…{line[len(line) - (limit - 1 - head) :].lstrip()}"


def fitted(make: Callable[[int], str] | str, inches: float, *, size: float = TEXT, bold: bool = False) -> str:
    """Words that are at most `inches` wide.

    make: a text, or a function of how many characters each name in it may have; the most that fit are taken.
    """
    build = make if callable(make) else lambda limit: shortened(make, limit)
    limit = 90
    while limit > 6 and width_of(build(limit), size=size, bold=bold) > inches:
        limit = min(limit - 1, int(limit * 0.94))
    words = build(limit)
    while width_of(words, size=size, bold=bold) > inches and len(words) > 4:
        words = shortened(words, len(words) - 1)
    return words


def wrapped(text: object, inches: float, lines: int, *, size: float = TEXT, bold: bool = False) -> str:
    """At most `lines` lines of `inches`, broken at spaces where there are any."""
    line = plain(text)
    limit = len(line)
    while len(broken := _broken(shortened(line, limit), inches, size, bold)) > lines and limit > 8:
        limit -= 2
    return "\n".join(broken)


def titled(name: object, unit: object = "", *, limit: int = 60) -> str:
    """An axis title: the name in at most `limit` characters, and its unit in brackets unless the name gives it."""
    told = any(f"{left}{plain(unit)}{right}" in plain(name) for left, right in ("()", "[]"))
    behind = f" ({shortened(unit, 20)})" if str(unit).strip() and not told else ""
    return f"{shortened(name, limit)}{behind}"


def drawn(text: str) -> str:
    """The text with a box for every letter that no font here can draw."""
    return "".join(c if c == "\n" or font_of(c, False) is not None else _MISSING for c in text)


def width_of(text: str, *, size: float = TEXT, bold: bool = False) -> float:
    """Inches that one line of text takes."""
    return sum(advance(c, bold) for c in text) * size / 72


@cache
def families() -> tuple[str, ...]:
    """Font families in the order they are tried."""
    installed = set(fontManager.get_font_names())
    return (FONT, *(name for name in _FURTHER if name in installed))


def _broken(line: str, inches: float, size: float, bold: bool) -> list[str]:
    out = [""]
    for word in line.split(" "):
        for piece in _pieces(word, inches, size, bold):
            longer = f"{out[-1]} {piece}".strip()
            if out[-1] and width_of(longer, size=size, bold=bold) > inches:
                out.append(piece)
            else:
                out[-1] = longer
    return out


def _pieces(word: str, inches: float, size: float, bold: bool) -> list[str]:
    """A word cut where it is wider than a line."""
    out = [""]
    for letter in word:
        if width_of(out[-1] + letter, size=size, bold=bold) > inches:
            out.append("")
        out[-1] += letter
    return out


@cache
def advance(letter: str, bold: bool) -> float:
    """Width of a letter, or of the box drawn for it, as a share of the type size."""
    font = font_of(letter, bold)
    if font is None:
        return 1.0 if letter == _MISSING else advance(_MISSING, bold)
    font.set_size(MEASURED, 72)
    return font.load_char(ord(letter), flags=LoadFlags.NO_HINTING).linearHoriAdvance / 65536 / MEASURED


@cache
def font_of(letter: str, bold: bool) -> FT2Font | None:
    """The first font that has a letter, a copy that nothing else draws with; None where none has."""
    return next((font for font in _fonts(bold) if font.get_char_index(ord(letter))), None)


@cache
def _fonts(bold: bool) -> tuple[FT2Font, ...]:
    weight = "bold" if bold else "normal"
    # copies of our own: the ones that draw are resized at any time, by any thread
    return tuple(FT2Font(findfont(FontProperties(family=name, weight=weight))) for name in families())
