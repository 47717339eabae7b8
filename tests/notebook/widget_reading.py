"""What a reader sees of a widget: the text of its HTML, of one part or of all."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from html.parser import HTMLParser

import ipywidgets as widgets

from batten.notebook.panels.desk import NOT_YET
from batten.notebook.widget import ExamWidget

__all__ = ["Rounded", "agreeing", "all_html", "parts_of", "placeholder", "printed", "tags", "walk", "words"]

_BLOCKS = {"p", "li", "tr", "br", "h2", "h3", "div", "details", "summary", "pre"}


@dataclass(frozen=True, eq=False)
class Rounded:
    """A number in full; equal to every text that is this number rounded to the digits the text has."""

    value: float

    def __eq__(self, text: object) -> bool:
        if not isinstance(text, str):
            return NotImplemented
        plain = text.replace(",", "").removeprefix("+").replace("−", "-")
        behind = len(plain.partition(".")[2])
        digits = behind or -len(plain) + len(plain.rstrip("0"))  # 123,500 may stand for 123,456
        # half a unit of the last digit, and a hair for the double that lies on the edge
        return abs(float(plain) - self.value) <= 0.5 * 10.0**-digits * (1 + 1e-6)

    __hash__ = None  # type: ignore[assignment]


def agreeing(*values: float) -> tuple[Rounded, ...]:
    """What printed numbers are compared with."""
    return tuple(Rounded(float(value)) for value in values)


def printed(pattern: str, text: str) -> tuple[str, ...]:
    """The groups of the one place where a pattern is found."""
    (found,) = re.finditer(pattern, text, flags=re.MULTILINE)
    return found.groups()


class _Reader(HTMLParser):
    def __init__(self) -> None:
        super().__init__()
        self.text: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        self.text.append("\n" if tag in _BLOCKS else " " if tag in ("td", "th") else "")

    def handle_data(self, data: str) -> None:
        self.text.append(data)


def _read(html: str) -> _Reader:
    reader = _Reader()
    reader.feed(html)
    reader.close()
    return reader


def words(*parts: widgets.Widget | str) -> str:
    """The text of HTML, or of every piece of HTML below a widget, blanks tidied."""
    html = [part if isinstance(part, str) else "\n".join(all_html(part)) for part in parts]
    lines = ("".join(_read(piece).text) for piece in html)
    return "\n".join(line for text in lines for raw in text.split("\n") if (line := re.sub(r"\s+", " ", raw).strip()))


def tags(html: str) -> list[tuple[str, dict[str, str | None]]]:
    """Every tag as a browser would find it, with its attributes."""
    return _read(html).tags


def walk(root: widgets.Widget) -> Iterator[widgets.Widget]:
    yield root
    for child in getattr(root, "children", ()):
        yield from walk(child)


def all_html(root: widgets.Widget) -> list[str]:
    """The HTML below a widget that is not a style sheet."""
    found = (w.value for w in walk(root) if isinstance(w, widgets.HTML))
    return [value for value in found if not value.startswith("<style>")]


def placeholder(root: widgets.Widget) -> bool:
    """Whether nothing of a panel has been drawn."""
    return NOT_YET in all_html(root)


def parts_of(root: widgets.Widget) -> ExamWidget:
    """What answers the clicks of a widget."""
    parts = root.parts
    assert isinstance(parts, ExamWidget)
    return parts
