"""What is said when the notebook page cannot do what a button asked."""

from __future__ import annotations

from batten.errors import BattenError, InputError

__all__ = ["no_session", "not_inserted"]

_NOT_DONE = "The code was not put into a new cell."
_UNKNOWN = "The code may not have been put into a new cell."

# Reason of the answer -> (what is wrong, what was seen).
_REASONS = {
    "no-plugin": (
        _NOT_DONE,
        "This page runs without batten's cell inserter. It comes with batten, but batten must also be installed where "
        "the notebook server runs, and the page reloaded after that.",
    ),
    "timeout": (_UNKNOWN, "The page has not answered so far; if a new cell turns up below this one, all is well."),
    "cell-not-found": (_NOT_DONE, "The cell that holds this panel is no longer in the notebook."),
    "no-kernel": (_NOT_DONE, "This session has no notebook page to put a cell into."),
    "error": (_NOT_DONE, "The page reported a fault."),
}


def not_inserted(reason: str, detail: str = "", *, magic: str = "") -> BattenError:
    """Build the three parts for an answer's reason; `magic` is the line that does the same without the button.

    The result is for showing. A reason that is not listed counts as "error".
    """
    wrong, seen = _REASONS.get(reason, _REASONS["error"])
    do = f"Copy the code, or run {magic} in a cell." if magic else "Copy the code."
    return BattenError(wrong, f"{seen} ({detail})" if detail else seen, do)


def no_session() -> InputError:
    return InputError(
        "There is no cell to put the code into.",
        "This Python runs outside IPython and Jupyter.",
        "Use the text itself: print(exam.code()).",
    )
