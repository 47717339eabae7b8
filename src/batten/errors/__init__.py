"""Every message a user can read.

Each message has three parts: what is wrong, what was seen, what to do. They are kept apart so that a magic can print
one line, a table can show them in columns, and a test can read them whole.
"""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches

__all__ = ["BattenError", "InputError", "Refusal", "UnknownNameError", "closest"]


class BattenError(Exception):
    """What is wrong, what was seen, what to do. Base of every error raised on purpose."""

    def __init__(self, wrong: str, seen: str = "", do: str = "") -> None:
        super().__init__(wrong, seen, do)
        self.wrong, self.seen, self.do = wrong, seen, do

    def __str__(self) -> str:
        return "\n".join(part for part in (self.wrong, self.seen, self.do) if part)

    def one_line(self) -> str:
        """The same message on one line, for a notebook's error line."""
        return " ".join(" ".join(str(self).split()).split("\n"))


class InputError(BattenError, ValueError):
    """A value, formula, column or option that cannot be used as it stands."""


class UnknownNameError(BattenError, KeyError):
    """A name that is not there: a column, a remedy's key, a level, a sample."""

    # KeyError shows the repr of its argument; these messages are for reading.
    __str__ = BattenError.__str__


@dataclass(frozen=True)
class Refusal:
    """Why a remedy cannot be used on these rows; a value, shown in the table, never raised."""

    wrong: str
    seen: str
    instead: str


def closest(name: str, options: list[str] | tuple[str, ...]) -> str:
    """Return "Did you mean 'a' or 'b'?" or, when nothing is near, the sorted options."""
    near = get_close_matches(name, [str(o) for o in options], n=2, cutoff=0.6)
    if near:
        return "Did you mean " + " or ".join(repr(n) for n in near) + "?"
    shown = ", ".join(repr(str(o)) for o in sorted(map(str, options))[:12])
    return f"Choose one of {shown}." if shown else ""
