"""Small pieces of HTML. Names and texts of the user pass through `esc`, and nothing else makes markup of them."""

from __future__ import annotations

import html

__all__ = ["details", "esc", "paragraph", "part"]


def esc(text: object) -> str:
    """Any text as HTML shows it letter by letter; safe inside quoted attributes too."""
    return html.escape(str(text), quote=True)


def paragraph(text: str, kind: str = "") -> str:
    """A paragraph of plain text. kind: class name without the prefix."""
    return f'<p class="batten-{kind}">{esc(text)}</p>' if kind else f"<p>{esc(text)}</p>"


def details(summary: str, inside: str) -> str:
    """A part that opens on a click; `inside` is HTML."""
    return f"<details><summary>{esc(summary)}</summary>\n{inside}\n</details>"


def part(title: str, inside: str) -> str:
    """A titled part of a page; `inside` is HTML."""
    return f"<section>\n<h2>{esc(title)}</h2>\n{inside}\n</section>"
