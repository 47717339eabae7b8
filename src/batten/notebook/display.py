"""Shows an examination: the widget and a static copy in a notebook, text in a terminal. Also an examination or a fit
that is the last line of a cell."""

from __future__ import annotations

import shutil
import textwrap
from collections.abc import Callable
from typing import TYPE_CHECKING, Any
from uuid import uuid4

from batten.exam import Examination, Fit
from batten.notebook.fit_view import fit_html, fit_text
from batten.notebook.insertion import current_cell_id
from batten.notebook.progress import Progress, publish
from batten.report.grid import as_text
from batten.report.page import static_html
from batten.report.style import CSS
from batten.report.tables import full_grid, full_table
from batten.report.text import headline, text_summary

if TYPE_CHECKING:
    from batten.notebook.panels.desk import Changed

__all__ = ["add_formatters", "in_kernel", "remove_formatters", "show", "show_table"]

NEXT = (
    "%batten table, %batten code KEY and %batten report FILE work on this examination;\n"
    "--keep exam binds it to a variable."
)
#: letters on a line, fewer where a terminal has fewer
WIDTH = 100


def in_kernel(shell: Any) -> bool:
    """Whether a page shows what is printed, not a terminal."""
    return getattr(shell, "kernel", None) is not None


def show(exam: Examination, *, shell: Any, progress: Progress, plain: bool, changed: Changed | None = None) -> None:
    """The result of %%batten; plain: as text. changed(before, after): told when the widget asks something else.

    In a notebook two outputs: the widget, with nothing where no widget can be shown, and a static copy, which a style
    inside the living widget hides. A copy in the widget's own output would not be used by a notebook that is opened
    again: there the widget's place says only that its model is gone.
    """
    width = _width(shell)
    if plain or not in_kernel(shell):
        text = text_summary(exam, width=width).rstrip()
        # the focal predictor that was guessed, columns that were dropped, questions about the rows
        said = [textwrap.fill(words, width) for words in exam.problem.announcements]
        progress.end()
        print("\n\n".join([text, *said, NEXT]))
        return
    token = f"batten-static-{uuid4().hex}"
    box = _widget(exam, token, changed)
    if box is not None:
        progress.place({**box._repr_mimebundle_(), "text/plain": headline(exam), "text/html": ""})
    # nobody waits for the copy, which asks every remedy
    html = static_html(exam, figure=box.first_figure if box is not None else "")
    progress.place({
        "text/html": f'<div class="{token}">{html}</div>', "text/plain": text_summary(exam, width=width).rstrip(),
    })  # fmt: skip


def _widget(exam: Examination, token: str, changed: Changed | None) -> Any:
    """The widget; None where there is no ipywidgets."""
    try:
        from batten.notebook.widget import widget_for
    except ModuleNotFoundError as error:
        if (error.name or "").partition(".")[0] == "ipywidgets":
            return None
        raise
    return widget_for(exam, cell_id=current_cell_id(), token=token, changed=changed)


def show_table(exam: Examination, *, shell: Any) -> None:
    """All remedies that were tried, with units."""
    text = as_text(full_grid(exam), width=_width(shell))
    if in_kernel(shell):
        html = f'<div class="batten-report">\n<style>{CSS}</style>\n{full_table(exam)}\n</div>'
        publish({"text/html": html, "text/plain": text})
    else:
        print(text)


def add_formatters(shell: Any) -> None:
    """Let the shell show examinations and fits as the static report does."""
    html, text = _formatters(shell)
    html.for_type(Examination, static_html)
    html.for_type(Fit, fit_html)
    text.for_type(Examination, _printer(lambda exam: text_summary(exam, width=_width(shell)), repr))
    text.for_type(Fit, _printer(lambda fit: fit_text(fit, width=_width(shell)), _short))


def remove_formatters(shell: Any) -> None:
    for formatter in _formatters(shell):
        for kind in (Examination, Fit):
            formatter.pop(kind, None)


def _formatters(shell: Any) -> tuple[Any, Any]:
    by_type = shell.display_formatter.formatters
    return by_type["text/html"], by_type["text/plain"]


def _printer(tell: Callable[[Any], str], short: Callable[[Any], str]) -> Callable[[Any, Any, bool], None]:
    """As IPython's pretty printer calls it; inside a list or a dict the short form does."""

    def show_text(value: Any, printer: Any, cycle: bool) -> None:
        nested = cycle or len(printer.stack) > 1
        printer.text(short(value) if nested else tell(value).rstrip())

    return show_text


def _short(fit: Fit) -> str:
    return f"<Fit {fit.key!r} on {fit.rows} rows>"


def _width(shell: Any) -> int:
    # what Python finds out about the terminal in a kernel is the width of the server's
    return WIDTH if in_kernel(shell) else min(WIDTH, shutil.get_terminal_size((WIDTH, 24)).columns)
