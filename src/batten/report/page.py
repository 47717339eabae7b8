"""The examination as HTML: a page that needs no other file, and the fragment that a notebook keeps.

Every text passes through `esc`, figures are data inside <img>, and without the style sheet (which some viewers strip)
headings, tables and lists still read in order.
"""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from batten.compare.grid import STRAIGHT
from batten.errors import BattenError
from batten.report.cautions import CARE, SUBTITLE, cautions, choosing_note, left_out_words
from batten.report.figures import Picture, fit_figure, img_html, ladder_figure, left_figure, line_against_choice
from batten.report.figures import spans_figure as spans_of
from batten.report.fit_tables import checks_table, coefficients_table, constants_table, lookup_table
from batten.report.how import how_computed
from batten.report.lettering import plain
from batten.report.markup import details, esc, paragraph, part
from batten.report.style import CSS
from batten.report.tables import full_table, refused_table, shortlist_table
from batten.report.words import choice_words, days_words, headline, otherwise, refused_words, span_words, trial_words
from batten.report.write_up import write_up

if TYPE_CHECKING:
    from batten.exam.examination import Examination

__all__ = ["page", "save_page", "static_html"]


def page(exam: Examination) -> str:
    """A whole HTML document."""
    problem, fit = exam.problem, exam.chosen
    title = f"{plain(problem.response)} on {plain(problem.focus)}"
    body = "\n".join([
        *_first_screen(exam, title="h1", part="h2"),
        part(f"The choice: {plain(fit.words)}", _choice(exam)),
        part("What is left", _figure(left_figure(fit, exam[STRAIGHT], choice=True)) + checks_table(fit, named=True)),
        part("All that were tried", _tried(exam, figures=True)),
        part("How this was computed", _list(how_computed(exam))),
        part("Methods and results, as text", _paragraphs(write_up(exam, exam.choice.key))),
        part("The chosen remedy as a script", _script(exam)),
        paragraph(CARE, "quiet"),
    ])  # fmt: skip
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{esc(title)}</title>\n<style>{_PAGE_CSS}{CSS}</style>\n</head>\n"
        f'<body>\n<main class="batten-report">\n{body}\n</main>\n</body>\n</html>\n'
    )


def static_html(exam: Examination, *, figure: str = "") -> str:
    """What a notebook keeps for readers without a kernel: the first screen, and the rest behind clicks.

    Without headings, which would stand in the notebook's own table of contents. figure: the first one's HTML, where it
    has been drawn already.
    """
    body = "\n".join([
        *_first_screen(exam, title="p", part="p", figure=figure),
        details(f"All {len(exam)} tried", _tried(exam, figures=False)),
        details("How this was computed", _list(how_computed(exam)) + paragraph(CARE, "quiet")),
        details(f"The chosen remedy as a script: {exam.choice.key}", _script(exam)),
    ])  # fmt: skip
    return f'<div class="batten-report">\n<style>{CSS}</style>\n{body}\n</div>'


def save_page(exam: Examination, path: str | Path) -> None:
    """Write the page to a file, in UTF-8."""
    Path(path).write_text(page(exam), encoding="utf-8")


#: only for the page by itself; a notebook brings its own ground
_PAGE_CSS = """
body { background: #fff; margin: 2.5em auto; max-width: 68em; padding: 0 1.5em; }
"""


def _first_screen(exam: Examination, *, title: str, part: str, figure: str = "") -> list[str]:
    """Verdict, figure, rows, span, reasons, cautions. title, part: tags of the headline and of the reasons' heading."""
    rows = f"{exam.problem.rows.count:,} rows. {left_out_words(exam.problem)}".strip()
    mind = " ".join(words for words in (days_words(exam), SUBTITLE, choosing_note(exam)) if words)
    span = f"<p>{esc(span_words(exam))}</p>\n" + paragraph(mind, "quiet")
    return [
        f'<{title} class="batten-headline"><strong>{esc(headline(exam))}</strong></{title}>',
        paragraph(f"{trial_words(exam)} {rows}"),
        figure or _figure(line_against_choice(exam)),
        f'<div class="batten-span">\n{span}\n</div>',
        shortlist_table(exam),
        *(f'<div class="batten-caution">{paragraph(words)}</div>' for words in cautions(exam)),
        f'<{part} class="batten-title"><strong>Why {esc(choice_words(exam))}</strong></{part}>',
        _list([*exam.choice.reasons, otherwise(exam), *exam.problem.announcements]),
    ]


def _choice(exam: Examination) -> str:
    """The chosen fit: its figure, what it says, its constants, and values to look up."""
    fit = exam.chosen
    said = [plain(sentence) for sentence in fit.sentences()]
    return "\n".join([
        _figure(fit_figure(fit, choice=True)),
        _list(said),
        details("Values to look up", lookup_table(fit, exam.question.by)),
        details("Coefficients, on the fitting scale", coefficients_table(fit) + constants_table(fit)),
    ])  # fmt: skip


def _tried(exam: Examination, *, figures: bool) -> str:
    """The whole table, the two overviews, and what cannot be used."""
    parts = []
    if figures:
        parts += [_figure(spans_of(exam)), _figure(ladder_figure(exam))]
        parts.append(details(f"Table of all {len(exam)}", full_table(exam)))
    else:
        parts.append(full_table(exam))
    refused = refused_words(exam)
    if refused:
        parts += [paragraph(f"{refused[:-1]}; what to use instead:"), refused_table(exam)]
    return "\n".join(parts)


def _script(exam: Examination) -> str:
    try:
        source = exam.code()
    except BattenError as error:
        return paragraph(f"No script: {error.one_line()}")
    return f'<pre class="batten-code">{esc(source)}</pre>'


def _figure(figure: Picture) -> str:
    return f'<figure class="batten-figure">{img_html(figure)}</figure>'


def _list(items: Iterable[str]) -> str:
    lines = "\n".join(f"<li>{esc(plain(item))}</li>" for item in items if item)
    return f"<ul>\n{lines}\n</ul>"


def _paragraphs(text: str) -> str:
    return "\n".join(paragraph(block) for block in text.split("\n\n"))
