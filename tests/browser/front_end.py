"""A notebook in a real browser, and the few things a person does there.

Everything waits for a condition, never for a time. Used by the browser tests and by look.py.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path
from typing import Any, NamedTuple
from uuid import uuid4

import nbformat
from jupyter_server_process import Server
from playwright.sync_api import Browser, BrowserContext, Locator, Page, Playwright, expect

CHROMIUM = os.environ.get("BATTEN_CHROMIUM", "/usr/bin/chromium")
FRONTS = ("lab", "notebook")
PLUGIN = "batten-insert"
PATIENCE = 30_000  # milliseconds that any one condition may take, on a busy machine

expect.set_options(timeout=PATIENCE)

_FLAGS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]


def launch(playwright: Playwright) -> Browser:
    return playwright.chromium.launch(executable_path=CHROMIUM, args=_FLAGS)


def new_context(browser: Browser, *, width: int = 1200, height: int = 900) -> BrowserContext:
    """Make a browser session with leave to use the clipboard; its tabs share one cache, so only the first loads all."""
    context = browser.new_context(viewport={"width": width, "height": height})
    context.grant_permissions(["clipboard-read", "clipboard-write"])
    context.set_default_timeout(PATIENCE)
    return context


class Cell(NamedTuple):
    """A cell as the document holds it, on screen or not."""

    id: str
    type: str
    source: str


# The panel in front, or nothing while the page is loading.
_PANEL = "const panel = window.jupyterapp?.shell?.currentWidget; const notebook = panel?.content;"

# For a tenth of a second the indicator says idle while the toolbar still says "No Kernel"; what is run then is lost.
_READY = (
    "() => {"
    + _PANEL
    + """
    const session = panel?.sessionContext;
    const indicator = panel?.node?.querySelector('.jp-Notebook-ExecutionIndicator')
        ?? document.querySelector('.jp-Notebook-ExecutionIndicator');
    const name = document.querySelector('.jp-Toolbar-kernelName')?.textContent.trim();
    return Boolean(notebook?.model && panel.context.isReady && session.isReady)
        && session.session?.kernel?.connectionStatus === 'connected' && session.session.kernel.status === 'idle'
        && indicator?.dataset.status === 'idle' && Boolean(name) && name !== 'No Kernel';
}"""
)

_DRAWN = """() => {
    const views = [...document.querySelectorAll('[data-mime-type="application/vnd.jupyter.widget-view+json"]')];
    const waiting = [...document.querySelectorAll('.batten-waiting')].some(part => part.checkVisibility());
    return views.every(view => view.querySelector('.jupyter-widgets')) && [...document.images].every(i => i.complete)
        && !waiting;
}"""


class FrontEnd:
    """One browser tab with one notebook in it, in JupyterLab ("lab") or Notebook ("notebook")."""

    def __init__(self, page: Page, server: Server, *, front: str = "lab") -> None:
        self.page, self.server, self.front, self.name = page, server, front, ""

    # opening

    def open(self, notebook: Path | Sequence[str]) -> FrontEnd:
        """Put a notebook (a file, or the sources of its code cells) on the server under a new name and open it.

        A name used before would bring back the kernel of the earlier notebook.
        """
        if isinstance(notebook, Path):
            content = nbformat.read(notebook, as_version=4)
        else:
            content = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(source) for source in notebook])
        # Without a kernel's name the front end asks for one.
        content.metadata.setdefault("kernelspec", {"name": "python3", "display_name": "Python 3", "language": "python"})
        self.name = f"{uuid4().hex[:12]}.ipynb"
        nbformat.write(content, self.server.root / self.name)
        return self.visit(self.name)

    def visit(self, name: str) -> FrontEnd:
        """Open a notebook that is on the server already, as a second tab or a reload does."""
        self.name = name
        place = "lab/tree" if self.front == "lab" else "notebooks"
        self.page.goto(f"{self.server.url}/{place}/{name}?reset")
        return self.wait_until_idle()

    def close(self) -> None:
        """End the notebook's kernel and close the tab."""
        self.page.evaluate(f"() => {{ {_PANEL} return panel?.sessionContext?.shutdown(); }}")
        self.page.close()

    def without_plugin(self) -> FrontEnd:
        """From the next opening on, the page cannot load batten's plugin."""
        self.page.route(f"**/extensions/{PLUGIN}/**", lambda route: route.abort())
        return self

    def with_mute_plugin(self) -> FrontEnd:
        """From the next opening on, the plugin takes requests and never answers."""

        def strip(route: Any) -> None:
            script = route.fetch().text()
            assert "comm.close(answer);" in script
            route.fulfill(body=script.replace("comm.close(answer);", ""), content_type="text/javascript")

        self.page.route(f"**/extensions/{PLUGIN}/**", strip)
        return self

    # waiting

    def wait_until_idle(self) -> FrontEnd:
        """Wait until the notebook is loaded and its kernel is connected and idle."""
        self.page.wait_for_function(_READY)
        return self

    def wait_until_drawn(self) -> None:
        """Wait until the kernel has done all that was asked before, and every widget and picture is on screen."""
        self._begin("panel.sessionContext.session.kernel.requestExecute({code: '', silent: true}).done")
        self._finish("an empty request to the kernel")
        self.page.wait_for_function(_DRAWN)

    def wait_for_cells(self, count: int) -> list[Cell]:
        self.page.wait_for_function(
            f"n => {{ {_PANEL} return notebook.model.sharedModel.cells.length === n; }}", arg=count
        )
        return self.cells()

    def wait_until_active(self, cell: int, *, mode: str) -> None:
        """Wait until a cell is the active one, in "command" or "edit" mode, and has the keyboard."""
        condition = """return notebook.activeCellIndex === i && notebook.mode === mode
            && notebook.activeCell.node.contains(document.activeElement);"""
        self.page.wait_for_function(f"([i, mode]) => {{ {_PANEL} {condition} }}", arg=[cell, mode])

    def wait_for_text(self, text: str, *, cell: int) -> None:
        """Wait until the outputs of a cell hold `text`."""
        expect(self.outputs(cell)).to_contain_text(text)

    # reading

    def cells(self) -> list[Cell]:
        read = "return notebook.model.sharedModel.cells.map(c => [c.id, c.cell_type, c.source]);"
        return [Cell(*cell) for cell in self.page.evaluate(f"() => {{ {_PANEL} {read} }}")]

    def sources(self) -> list[str]:
        return [cell.source for cell in self.cells()]

    def is_in_view(self, cell: int) -> bool:
        """Tell whether the top of a cell lies inside the part of the notebook that is on screen."""
        read = """const top = notebook.widgets[i].node.getBoundingClientRect().top;
            const frame = (notebook.outerNode ?? notebook.node).getBoundingClientRect();
            return top >= frame.top - 1 && top < frame.bottom;"""
        return bool(self.page.evaluate(f"i => {{ {_PANEL} {read} }}", cell))

    def has_output(self, cell: int) -> bool:
        return bool(
            self.page.evaluate(f"i => {{ {_PANEL} return notebook.model.cells.get(i).outputs?.length; }}", cell)
        )

    def cell(self, index: int) -> Locator:
        return self.page.locator(f'.jp-Notebook-cell[data-windowed-list-index="{index}"]')

    def outputs(self, cell: int | None = None) -> Locator:
        """Locate the output areas of one cell, or all."""
        return self.page.locator(".jp-OutputArea") if cell is None else self.cell(cell).locator(".jp-OutputArea")

    def output_text(self, cell: int) -> str:
        self.scroll_to(cell)
        return "\n".join(self.outputs(cell).all_inner_texts())

    # running

    def run_cell(self, index: int, *, wait: bool = True) -> None:
        """Run one cell. With `wait` off, return while it is running."""
        self._activate_in_model(index)
        self._command("notebook:run-cell", wait=wait)

    def run_all(self) -> None:
        self._command("notebook:run-all-cells")

    def restart_and_run_all(self) -> None:
        self._start("notebook:restart-run-all")
        self.page.locator(".jp-Dialog .jp-mod-accept").click()
        self._finish("notebook:restart-run-all")

    # editing

    def activate(self, index: int) -> None:
        """Click beside a cell's text, which makes it the active one."""
        self.scroll_to(index)
        self.cell(index).locator(".jp-InputPrompt").click()

    def move_cell(self, index: int, *, direction: str) -> None:
        self._activate_in_model(index)
        self._command(f"notebook:move-cell-{direction}")

    def delete_cell(self, index: int, *, wait: bool = True) -> None:
        self._activate_in_model(index)
        self._command("notebook:delete-cell", wait=wait)

    def undo(self) -> None:
        self._command("notebook:undo-cell-action")

    def save(self) -> None:
        self._command("docmanager:save")

    def press(self, key: str) -> None:
        self.page.keyboard.press(key)

    def scroll_to(self, index: int) -> None:
        self.page.evaluate(f"i => {{ {_PANEL} return notebook.scrollToItem(i, 'smart'); }}", index)

    # the widget

    def button(self, name: str, *, cell: int | None = None) -> Locator:
        """Locate a visible button in the outputs; hidden tabs keep theirs."""
        return self.outputs(cell).get_by_role("button", name=name, exact=True).locator("visible=true")

    def click_button(self, name: str, *, cell: int | None = None) -> None:
        self.button(name, cell=cell).click()

    def tab(self, name: str, *, cell: int | None = None) -> Locator:
        return self.outputs(cell).get_by_role("tab", name=name, exact=True).locator("visible=true")

    def click_tab(self, name: str, *, cell: int | None = None) -> None:
        """Select a tab of the widget and wait until it is drawn."""
        tab = self.tab(name, cell=cell)
        tab.click()
        expect(tab).to_have_attribute("aria-selected", "true")
        self.wait_until_drawn()

    def clipboard(self) -> str:
        return str(self.page.evaluate("() => navigator.clipboard.readText()"))

    def screenshot(self, path: Path, *, cell: int | None = None) -> Path:
        """Save a picture of one cell's outputs, or of the whole window."""
        path.parent.mkdir(parents=True, exist_ok=True)
        if cell is not None:
            self.scroll_to(cell)
        self.wait_until_drawn()
        (self.page if cell is None else self.outputs(cell).first).screenshot(path=path)
        return path

    # commands

    def _activate_in_model(self, index: int) -> None:
        self.page.evaluate(f"i => {{ {_PANEL} notebook.activeCellIndex = i; notebook.mode = 'command'; }}", index)

    def _command(self, command: str, *, wait: bool = True) -> None:
        self._start(command)
        if wait:
            self._finish(command)

    def _start(self, command: str) -> None:
        self._begin(f"window.jupyterapp.commands.execute('{command}')")

    def _begin(self, promise: str) -> None:
        """Begin something in the page and leave its end where `_finish` can see it."""
        keep = """const kept = window.battenTest = {};
            promise.then(value => { kept.end = value === false ? 'failed' : 'done'; },
                         error => { kept.end = String(error); });"""
        self.page.evaluate(f"() => {{ {_PANEL} const promise = {promise}; {keep} }}")

    def _finish(self, what: str) -> None:
        end = self.page.wait_for_function("() => window.battenTest.end").json_value()
        if end != "done":
            raise AssertionError(f"{what} {end}:\n" + "\n".join(self.outputs().all_inner_texts()))
        self.wait_until_idle()
