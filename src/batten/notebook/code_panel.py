"""A panel that shows code, copies it, and puts it into a new cell below."""

from __future__ import annotations

import threading
from collections.abc import Callable
from functools import partial
from html import escape

import ipywidgets as widgets

from batten.errors import BattenError
from batten.errors.notebook import not_inserted
from batten.notebook.insertion import KEYS_CLASS, Answer, current_cell_id, insert_below, new_button_token

__all__ = ["CodePanel"]

PUT = "Put into a new cell"
SENDING = "Sending to the page …"
INSERTED = "Inserted below. Nothing has been run: Shift+Enter in the new cell runs it."
ALREADY = "Inserted already: that cell is still in this notebook. Press again to put in another copy."
NOT_YET = "The code is written when this panel is opened with a live kernel."

# Reads the code from the page itself, so it works with a busy or dead kernel. The clipboard exists on https and on this
# computer only; elsewhere the text is selected, ready for the usual key.
_COPY = """
const button = this, code = this.closest('.PANEL').querySelector('pre');
const say = text => { button.textContent = text; };
const select = () => { getSelection().selectAllChildren(code); say('Selected: now copy it with the keyboard'); };
if (window.isSecureContext && navigator.clipboard)
  navigator.clipboard.writeText(code.textContent).then(() => say('Copied'), select);
else select();
""".replace("PANEL", KEYS_CLASS)

_BUTTON = f'<button type="button" class="jupyter-button" onclick="{escape(_COPY)}">Copy</button>'

# A newline right after <pre> is dropped by the browser; without it, one that begins the code would be. The odd width
# keeps a long line from widening the panel: it scrolls.
_CODE = """<pre tabindex="0" role="region" aria-label="code" style="width:0;min-width:100%;box-sizing:border-box;
margin:0;padding:8px 10px;max-height:32em;overflow:auto;white-space:pre;user-select:text;line-height:1.4;
font-family:var(--jp-code-font-family,monospace);
font-size:calc(.92 * var(--jp-code-font-size,13px));color:var(--jp-content-font-color1,#222);
background:var(--jp-layout-color2,#f4f4f4);border:1px solid var(--jp-border-color2,#ccc)">
{code}</pre>"""


class CodePanel:
    """Code with a button "Put into a new cell"; show `box`.

    `code` may be a function: it is called once, when the panel is drawn (`draw`) or its button pressed. `magic` is the
    line that does the same without the button, shown when the page cannot. `cell_id` is the cell the panel is shown
    in; by default the one that is running now.

    Callbacks and answers may come on any thread and at the same time as cells; the lock is the state "sending".
    """

    def __init__(self, code: str | Callable[[], str], *, magic: str, cell_id: str | None = None) -> None:
        self._write: Callable[[], str] = code if callable(code) else partial(str, code)
        self._code: str | None = None
        self._magic = magic
        self._cell_id = cell_id or current_cell_id()
        self._token = new_button_token()
        self._inserted: str | None = None  # the cell that holds the code, as far as is known
        self._sending = threading.Lock()

        self.button = widgets.Button(description=PUT, layout=widgets.Layout(width="auto"))
        self.button.add_class(self._token)
        self.button.on_click(self.press)
        self.copy = widgets.HTML()
        self.status = widgets.HTML()
        self.shown = widgets.HTML(_status(NOT_YET))
        self.box = widgets.VBox([widgets.HBox([self.button, self.copy]), self.status, self.shown])
        self.box.add_class(KEYS_CLASS)
        if not callable(code):
            self.draw()

    def draw(self) -> str:
        """Write the code if that is still to be done, show it, and return it."""
        if self._code is None:
            self._code = self._write()
            self.shown.value = _CODE.format(code=escape(self._code))
            self.copy.value = _BUTTON
        return self._code

    def press(self, _button: object = None) -> None:
        """Send the code to the page; the button's callback."""
        if not self._sending.acquire(blocking=False):
            return  # the second click of a double click, on its way before the button was disabled
        self.button.disabled = True
        self.status.value = _status(SENDING)
        try:
            insert_below(
                self.draw(),
                cell_id=self._cell_id,
                button_token=self._token,
                on_reply=self._answered,
                unless=self._inserted,
            )
        except BattenError as error:  # the code cannot be written; its three parts say why
            self._ready(*_parts(error))
        except BaseException:
            self._ready()
            raise

    def _answered(self, answer: Answer) -> None:
        if answer.status == "inserted":
            self._inserted = answer.cell_id
            self._ready(INSERTED)
        elif answer.status == "already":
            self._inserted = None  # the next press is meant
            self._ready(ALREADY)
        else:
            self._ready(*_parts(not_inserted(answer.reason, answer.detail, magic=self._magic)))

    def _ready(self, *lines: str) -> None:
        self.status.value = _status(*lines)
        self.button.disabled = False
        self._sending.release()


def _status(*lines: str) -> str:
    return f'<div role="status" style="line-height:1.4">{"<br>".join(map(escape, lines))}</div>'


def _parts(error: BattenError) -> list[str]:
    return [part for part in (error.wrong, error.seen, error.do) if part]
