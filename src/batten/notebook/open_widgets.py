"""The widgets that are open, by cell: running a cell again closes those of its last run."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from typing import Any

import ipywidgets as widgets
from IPython import get_ipython

__all__ = ["close_all", "register"]

_lock = threading.Lock()
#: cell -> (the run that made them, the widgets)
_open: dict[str, tuple[str | None, list[widgets.Widget]]] = {}


def register(widget: widgets.Widget, cell_id: str | None) -> None:
    """Note a widget of the running cell, and close those that an earlier run of the cell has left.

    A widget keeps its examination alive until it is closed, also after its output is gone from the page.
    """
    if cell_id is None:
        return
    run = _run()
    with _lock:
        earlier, found = _open.get(cell_id, (run, []))
        _open[cell_id] = (run, [*found, widget] if earlier == run else [widget])
    for old in found if earlier != run else []:
        old.close()


def close_all(root: widgets.Widget) -> None:
    """Close a widget with everything in it: closing a box leaves its children, layouts and styles behind."""
    for part in dict.fromkeys(_parts(root)):
        widgets.Widget.close(part)  # not its own close, which may be what calls this


def _parts(root: widgets.Widget) -> Iterator[widgets.Widget]:
    yield root
    for name in ("layout", "style"):
        part = getattr(root, name, None)
        if isinstance(part, widgets.Widget):
            yield part
    for child in getattr(root, "children", ()):
        yield from _parts(child)


def _run() -> str | None:
    """The message that runs the cell now."""
    get_parent: Any = getattr(get_ipython(), "get_parent", None)
    parent = get_parent() if get_parent else None
    return ((parent or {}).get("header") or {}).get("msg_id")
