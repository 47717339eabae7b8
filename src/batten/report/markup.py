"""Small pieces of HTML. Names and texts of the user pass through `esc`, and nothing else makes markup of them."""

from __future__ import annotations

import html
from collections.abc import Iterable, Sequence

__all__ = ["details", "esc", "paragraph", "table"]


def esc(text: object) -> str:
    """Any text as HTML shows it letter by letter; safe inside quoted attributes too."""
    return html.escape(str(text), quote=True)


def paragraph(text: str, kind: str = "") -> str:
    """A paragraph of plain text. kind: class name without the prefix."""
    return f'<p class="batten-{kind}">{esc(text)}</p>' if kind else f"<p>{esc(text)}</p>"


def details(summary: str, inside: str) -> str:
    """A part that opens on a click; `inside` is HTML."""
    return f"<details><summary>{esc(summary)}</summary>\n{inside}\n</details>"


def table(
    head: Sequence[str], rows: Iterable[Sequence[str]], *, numbers: Sequence[bool], marks: Iterable[str] = ()
) -> str:
    """A table of HTML cells; the first cell of a row heads it.

    numbers: which columns hold numbers. marks: class name (without the prefix) of each row, "" for none.
    """
    kinds = [' class="batten-number"' if number else "" for number in numbers]
    top = "".join(f'<th scope="col"{kind}>{esc(word)}</th>' for word, kind in zip(head, kinds, strict=True))
    rows = list(rows)
    body = []
    for row, mark in zip(rows, [*marks] or [""] * len(rows), strict=True):
        first = f'<th scope="row"{kinds[0]}>{row[0]}</th>'
        rest = "".join(f"<td{kind}>{cell}</td>" for cell, kind in zip(row[1:], kinds[1:], strict=True))
        body.append(f'<tr class="batten-{mark}">{first}{rest}</tr>' if mark else f"<tr>{first}{rest}</tr>")
    lines = "\n".join(body)
    return (
        f'<div class="batten-scroll"><table class="batten-table">\n<thead><tr>{top}</tr></thead>\n'
        f"<tbody>\n{lines}\n</tbody></table></div>"
    )
