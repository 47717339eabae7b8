"""Tables as cells of plain text, written as HTML or as aligned text."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass

from batten.report.lettering import plain
from batten.report.markup import esc

__all__ = ["Column", "Grid", "as_html", "as_text"]


#: letters that a column of words keeps
LEAST = 13
#: a word with hyphens, at which heads would break
_HYPHENED = re.compile(r"[^\s-]+(?:-[^\s-]+)+")


@dataclass(frozen=True)
class Column:
    """head: what the column holds, with its unit. kind: "number", "key", "words" (long ones) or "" (short ones).

    under: on a page, its cells stand below those of the nearest column of words before it, which saves width.
    """

    head: str
    kind: str = ""
    under: bool = False


@dataclass(frozen=True)
class Grid:
    """Cells (rows, columns) of plain text. marks: "choice", "line" or "" for each row."""

    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]
    marks: tuple[str, ...]


def as_html(grid: Grid) -> str:
    """One <table>; the first cell of a row heads it."""
    stacks = _stacks(grid.columns)
    titles = [column.head for column in grid.columns]
    heads = "".join(
        f'<th scope="col"{_kind(grid.columns[s[0]])}>{_stacked(s, titles, grid, whole=True)}</th>' for s in stacks
    )
    lines = []
    for row, mark in zip(grid.rows, grid.marks, strict=True):
        tags = ('th scope="row"', "th"), *[("td", "td")] * (len(stacks) - 1)
        cells = "".join(
            f"<{tag}{_kind(grid.columns[s[0]])}>{_stacked(s, row, grid)}</{end}>"
            for s, (tag, end) in zip(stacks, tags, strict=True)
        )
        lines.append(f'<tr class="batten-{mark}">{cells}</tr>' if mark else f"<tr>{cells}</tr>")
    body = "\n".join(lines)
    return (
        f'<div class="batten-scroll"><table class="batten-table">\n<thead><tr>{heads}</tr></thead>\n'
        f"<tbody>\n{body}\n</tbody></table></div>"
    )


def as_text(grid: Grid, *, width: int = 100) -> str:
    """Aligned text of `width` letters a line where the numbers allow it: words break onto further lines."""
    cells = [[plain(cell) for cell in row] for row in grid.rows]
    widths = [_needed(column, [row[j] for row in cells]) for j, column in enumerate(grid.columns)]
    words = [j for j, column in enumerate(grid.columns) if column.kind in ("", "words")]
    while sum(widths) + 2 * (len(widths) - 1) > width and any(widths[j] > LEAST for j in words):
        widths[max(words, key=lambda j: widths[j])] -= 1
    heads = [_lines(c.head, w) for c, w in zip(grid.columns, widths, strict=True)]
    tall = max(len(h) for h in heads)
    # heads stand at the bottom of their row
    out = _block([[""] * (tall - len(h)) + h for h in heads], widths, grid.columns)
    out.append("-" * (sum(widths) + 2 * (len(widths) - 1)))
    for row in cells:
        out += _block([_lines(cell, w) for cell, w in zip(row, widths, strict=True)], widths, grid.columns)
    return "\n".join(line.rstrip() for line in out)


def _needed(column: Column, cells: Sequence[str]) -> int:
    """Letters of a column's widest cell; its head may break at spaces."""
    longest = max(_wide(word) for word in column.head.split(" "))
    return max([longest, min(_wide(column.head), 12), *(_wide(cell) for cell in cells)])


def _block(cells: Sequence[Sequence[str]], widths: Sequence[int], columns: Sequence[Column]) -> list[str]:
    """One row of the table, as many lines as its tallest cell has."""
    tall = max(len(cell) for cell in cells)
    return [_line([cell[i] if i < len(cell) else "" for cell in cells], widths, columns) for i in range(tall)]


def _stacks(columns: Sequence[Column]) -> list[list[int]]:
    """Places of the columns that stand on their own, each with those that stand under it."""
    out: list[list[int]] = []
    for j, column in enumerate(columns):
        if column.under:
            next(stack for stack in reversed(out) if columns[stack[0]].kind == "words").append(j)
        else:
            out.append([j])
    return out


def _stacked(stack: Sequence[int], cells: Sequence[str], grid: Grid, *, whole: bool = False) -> str:
    """One cell, and below it in smaller type those that stand under it. whole: words do not break at hyphens."""
    first = esc(cells[stack[0]])
    if whole:
        first = _HYPHENED.sub(r'<span class="batten-whole">\g<0></span>', first)
    below = (f"<div{_kind(grid.columns[j], 'under')}>{esc(cells[j])}</div>" for j in stack[1:] if cells[j])
    return f"{first}{''.join(below)}"


def _kind(column: Column, more: str = "") -> str:
    names = " ".join(f"batten-{name}" for name in (column.kind, more) if name)
    return f' class="{names}"' if names else ""


def _line(cells: Sequence[str], widths: Sequence[int], columns: Sequence[Column]) -> str:
    out = []
    for cell, width, column in zip(cells, widths, columns, strict=True):
        room = " " * max(0, width - _wide(cell))
        out.append(room + cell if column.kind == "number" else cell + room)
    return "  ".join(out)


def _lines(words: str, width: int) -> list[str]:
    """Words broken at spaces, and inside a word that is longer than the width."""
    out = [""]
    pieces = (long[i : i + width] for long in words.split(" ") for i in range(0, len(long), width))
    for word in pieces:
        if out[-1] and _wide(out[-1]) + 1 + _wide(word) > width:
            out.append(word)
        else:
            out[-1] = f"{out[-1]} {word}".strip()
    return out


def _wide(text: str) -> int:
    """Columns a terminal needs: wide East Asian letters take two, combining marks none."""
    return sum(0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1 for c in text)
