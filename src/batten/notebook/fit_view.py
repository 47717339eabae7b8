"""One fit as the last line of a cell: what it says, and its figure. Tables are a method away."""

from __future__ import annotations

import textwrap

from batten.exam import Fit
from batten.report.figures import fit_figure, img_html
from batten.report.lettering import plain
from batten.report.markup import esc, paragraph
from batten.report.style import CSS

__all__ = ["fit_html", "fit_text"]

MORE = "In numbers: fit.coefficients, fit.constants, fit.contrast(), fit.checks(), fit.predict(frame)."


def fit_html(fit: Fit) -> str:
    """Title, figure and sentences."""
    said = "\n".join(f"<li>{esc(sentence)}</li>" for sentence in _sentences(fit))
    return (
        f'<div class="batten-report">\n<style>{CSS}</style>\n<h2 class="batten-headline">{esc(_title(fit))}</h2>\n'
        f'<figure class="batten-figure">{img_html(fit_figure(fit))}</figure>\n<ul>\n{said}\n</ul>\n'
        f"{paragraph(MORE, 'quiet')}\n</div>"
    )


def fit_text(fit: Fit, *, width: int) -> str:
    """Title and sentences."""
    lines = [textwrap.fill(s, width, initial_indent="- ", subsequent_indent="  ") for s in _sentences(fit)]
    return "\n".join([textwrap.fill(_title(fit), width), "", *lines, "", textwrap.fill(MORE, width)])


def _title(fit: Fit) -> str:
    return f"{plain(fit.label)}, {fit.rows:,} rows"


def _sentences(fit: Fit) -> list[str]:
    return [plain(sentence) for sentence in fit.sentences()]
