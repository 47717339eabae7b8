"""Put code into a new cell: below a widget by asking the page, or from a running cell by asking the shell.

A button's callback cannot use the shell's way: set_next_input from a callback turns up later, below whatever cell is
run next. So the page is asked over a comm, which a small plugin (labextension/plugin.js) closes with the answer.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any
from uuid import uuid4

from comm import create_comm
from IPython import get_ipython

from batten.errors.notebook import no_session

__all__ = ["KEYS_CLASS", "Answer", "current_cell_id", "insert_below", "new_button_token", "put_in_next_cell"]

# These three are repeated in plugin.js.
TARGET = "batten.insert"
BUTTON_PREFIX = "batten-button-"
KEYS_CLASS = "batten-keys"  # a widget with this class keeps plain keys (arrows, letters, Enter) for its own controls


@dataclass(frozen=True)
class Answer:
    """What became of a request.

    `status` is "inserted", "already" (the cell named by `unless` is still there) or "error". With "error", `reason` is
    no-plugin, timeout, cell-not-found, no-kernel or error, and `detail` what the page said. `index` counts from 0.
    """

    status: str
    reason: str = ""
    detail: str = ""
    index: int | None = None
    cell_id: str | None = None


def insert_below(
    source: str,
    *,
    cell_id: str | None,
    button_token: str,
    on_reply: Callable[[Answer], None],
    timeout: float = 2.0,
    unless: str | None = None,
) -> None:
    """Ask the page to put `source` into a new cell right below the widget's own cell, and return at once.

    Call it in the callback of the button whose class is `button_token`: the page knows in which cell that one was
    clicked, and falls back on `cell_id`, the cell that made the widget. `on_reply` gets exactly one answer, within
    `timeout` seconds, on whichever thread it arrives. Nothing is inserted while the cell `unless` is still there.
    """
    reply = _Once(on_reply)
    if getattr(get_ipython(), "kernel", None) is None:
        reply(Answer("error", "no-kernel"))
        return
    # Waiting here would wait for ever where answers are handled on this very thread; hence a timer. The answer may come
    # on another thread before the next line runs; hence a listener before the opening, and a timer that may be
    # cancelled before it is started.
    timer = threading.Timer(timeout, reply, [Answer("error", "timeout")])
    timer.daemon = True
    comm = create_comm(target_name=TARGET, primary=False)

    def closed(message: Mapping[str, Any]) -> None:
        timer.cancel()
        reply(_read(message["content"].get("data") or {}))

    comm.on_close(closed)
    request = {"source": source, "cell_id": cell_id, "button": button_token, "unless": unless}
    comm.open(data={"op": "insert", "client": _client(), **request})
    timer.start()


def put_in_next_cell(source: str) -> None:
    """Put `source` into a new cell below the running one; in a terminal, into the next prompt. For magics only."""
    shell = get_ipython()
    if shell is None:
        raise no_session()
    shell.set_next_input(source.rstrip("\n"), replace=False)


def current_cell_id() -> str | None:
    """Return the id of the cell that is running; None in a callback, a terminal, or where no page sent it."""
    cell_id = (_request().get("metadata") or {}).get("cellId")
    return cell_id if isinstance(cell_id, str) else None


def new_button_token() -> str:
    """Return a class by which the page tells one button from all others."""
    return BUTTON_PREFIX + uuid4().hex


class _Once:
    """Passes on the first answer and drops the rest: page and timer race, on different threads."""

    def __init__(self, on_reply: Callable[[Answer], None]) -> None:
        self._on_reply, self._lock, self._done = on_reply, threading.Lock(), False

    def __call__(self, answer: Answer) -> None:
        with self._lock:
            first, self._done = not self._done, True
        if first:
            self._on_reply(answer)


def _read(data: Mapping[str, Any]) -> Answer:
    """Read the closing message. A page without the plugin closes the comm with no data at all."""
    if "status" not in data:
        return Answer("error", "no-plugin")
    return Answer(**{name: data[name] for name in Answer.__dataclass_fields__ if data.get(name) is not None})


def _client() -> str | None:
    """Return the session of the page whose message is being handled, so that other tabs stay silent."""
    session = (_request().get("header") or {}).get("session")
    return session if isinstance(session, str) else None


def _request() -> Mapping[str, Any]:
    """Return the message that is being handled; empty outside a kernel."""
    get_parent = getattr(get_ipython(), "get_parent", None)
    return (get_parent() or {}) if get_parent else {}
