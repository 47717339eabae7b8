"""A line that says how far long work has come: shown after two seconds, gone when the work is done."""

from __future__ import annotations

import shutil
import sys
import time
from typing import Any
from uuid import uuid4

from IPython.display import publish_display_data

__all__ = ["Progress", "publish"]

#: seconds before the first line, and between two of them
DELAY, STEP = 2.0, 0.3
_NOTHING = {"text/plain": "", "text/html": ""}


class Progress:
    """Call it with done, total, label. In a notebook the line is an output whose place the result takes over (`place`),
    so that no other output of the cell has to be cleared; in a terminal it is wiped off its row.

    Use as a context: whatever ends the work, also an interruption, ends the line.
    """

    def __init__(self, *, kernel: bool) -> None:
        self._kernel = kernel
        self._start = self._last = time.monotonic()
        self._id = uuid4().hex
        self._shown = False

    def __enter__(self) -> Progress:
        return self

    def __exit__(self, *_: object) -> None:
        self.end()

    def end(self) -> None:
        """Take the line away."""
        if self._shown and self._kernel:
            self._publish(_NOTHING)
        elif self._shown:
            _write("\r\x1b[K")
        self._shown = False

    def __call__(self, done: int, total: int, label: str) -> None:
        now = time.monotonic()
        if now - self._start < DELAY or (self._shown and now - self._last < STEP):
            return
        self._last = now
        line = f"Trying remedies, {done} of {total} steps done: {label}"
        if self._kernel:
            self._publish({"text/plain": line})
        elif not sys.stdout.isatty():
            return
        else:
            _write(f"\r{line[: shutil.get_terminal_size().columns - 1]}\x1b[K")
        self._shown = True

    def place(self, data: dict[str, Any]) -> None:
        """Publish a result, in the line's place if there is one."""
        self._publish(data)
        self._shown = False
        self._id = uuid4().hex

    def _publish(self, data: dict[str, Any]) -> None:
        publish(data, transient={"display_id": self._id}, update=self._shown)


def publish(data: dict[str, Any], **more: Any) -> None:
    """One output of the running cell."""
    publish_display_data(data, **more)  # type: ignore[no-untyped-call]


def _write(text: str) -> None:
    sys.stdout.write(text)
    sys.stdout.flush()
