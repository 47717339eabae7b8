"""What widget callbacks have in common: they keep nothing alive, and show what goes wrong where it was asked for."""

from __future__ import annotations

import traceback
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any
from weakref import WeakMethod

import ipywidgets as widgets

from batten.errors import BattenError
from batten.report.markup import details, esc

__all__ = ["Message", "told_in", "weakly"]


class Message:
    """One line in a panel, empty when all is well; show `box`."""

    def __init__(self) -> None:
        self.box = widgets.HTML()
        self.box.add_class("batten-report")
        self.box.add_class("batten-message")

    def say(self, text: str) -> None:
        """Show one line, read out by screen readers; "" clears it."""
        self.box.value = f'<div role="status" class="batten-caution">{esc(text)}</div>' if text else ""

    def fault(self, trace: str) -> None:
        """Show that something unforeseen happened, with the traceback behind a click."""
        shown = details("Something went wrong here; details", f'<pre class="batten-code">{esc(trace)}</pre>')
        self.box.value = f'<div role="status" class="batten-caution">{shown}</div>'


@contextmanager
def told_in(message: Message) -> Iterator[None]:
    """Show what the block raises; clear the message when it comes through."""
    try:
        yield
    except BattenError as error:
        message.say(error.one_line())
    except Exception:  # anything else would end in the server's log, where no analyst looks
        message.fault(traceback.format_exc())
    else:
        message.say("")


def weakly(method: Callable[..., Any]) -> Callable[..., None]:
    """A callback that calls a bound method for as long as its object lives: widgets never forget their callbacks."""
    ref = WeakMethod(method)

    def call(*arguments: Any) -> None:
        alive = ref()
        if alive is not None:
            alive(*arguments)

    return call
