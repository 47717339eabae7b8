"""The line magic: %batten code KEY, %batten table, %batten report FILE, all on the last examination."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from batten.errors import magic as errors
from batten.exam import Examination
from batten.families import parse
from batten.notebook.display import show_table
from batten.notebook.insertion import put_in_next_cell
from batten.notebook.variables import frame_names

__all__ = ["LINE_HELP", "SUBCOMMANDS", "run_line"]


def run_line(line: str, exam: Examination | None, *, shell: Any) -> None:
    """Do what the line says."""
    word, *rest = line.split(maxsplit=1) or [""]
    if not word:
        print(LINE_HELP)
        return
    if word not in SUBCOMMANDS:
        raise errors.unknown_subcommand(word, list(SUBCOMMANDS), is_frame=word in frame_names(shell.user_ns))
    if exam is None:
        raise errors.no_examination()
    SUBCOMMANDS[word].do(exam, _unquoted("".join(rest)), shell)


def _unquoted(text: str) -> str:
    """Everything behind the word, which may hold spaces; quotes around the whole are taken off."""
    text = text.strip()
    return text[1:-1] if len(text) > 1 and text[0] in "\"'" and text[-1] == text[0] else text


def _code(exam: Examination, key: str, shell: Any) -> None:
    name = parse(key).key if key else exam.choice.key
    untried = name not in exam and name not in exam.refused.index
    fit = (exam.with_remedy(name) if untried else exam)[name]
    put_in_next_cell(fit.code())
    print(f"In the next cell: {fit.label}{'; it was not among those tried' if untried else ''}.")


def _table(exam: Examination, rest: str, shell: Any) -> None:
    if rest:
        raise errors.takes_nothing("table", rest)
    show_table(exam, shell=shell)


def _report(exam: Examination, file: str, shell: Any) -> None:
    if not file:
        raise errors.no_file()
    if Path(file).suffix.lower() not in (".html", ".htm"):
        raise errors.not_a_page(file)
    try:
        exam.save_report(str(Path(file).expanduser()))
    except OSError as error:
        raise errors.cannot_write(file, error.strerror or type(error).__name__) from None
    print(f"Written: {file}")


@dataclass(frozen=True)
class Subcommand:
    """form: how it is written. words: for the help. do: takes the examination, the rest of the line, and the shell."""

    form: str
    words: str
    do: Callable[[Examination, str, Any], None]


SUBCOMMANDS = {
    "code": Subcommand("code KEY", "put a remedy's code into the next cell (the choice's without KEY)", _code),
    "table": Subcommand("table", "all remedies that were tried", _table),
    "report": Subcommand("report FILE", "write the report to one web page; FILE ends in .html", _report),
}

LINE_HELP = "\n".join([
    "%batten works on the last examination:", "",
    *(f"  %batten {s.form:<12} {s.words}" for s in SUBCOMMANDS.values()), "",
    "An examination is a cell that begins with %%batten FRAME and holds a formula; %%batten? lists its options.",
])  # fmt: skip
