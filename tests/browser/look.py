"""Open a notebook in a real front end, run it, and save pictures of its widgets for people to look at.

    python tests/browser/look.py notebooks/tour.ipynb --front lab --theme dark --tab "straight line" --tab choice

One picture of every cell that has outputs, then one per named tab of the first widget that has a tab of that name.
"""

from __future__ import annotations

import argparse
import tempfile
from pathlib import Path

from front_end import FRONTS, FrontEnd, launch, new_context
from jupyter_server_process import running_server
from playwright.sync_api import sync_playwright


def main() -> None:
    options = _parse()
    with (
        tempfile.TemporaryDirectory() as folder,
        running_server(Path(folder), theme=options.theme) as server,
        sync_playwright() as playwright,
    ):
        browser = launch(playwright)
        # Tall, since a picture of an element ends where its scrolling frame does.
        context = new_context(browser, width=options.width, height=2600)
        front_end = FrontEnd(context.new_page(), server, front=options.front)
        front_end.open(options.notebook).run_all()
        prefix = f"{options.front}-{options.theme}"
        print(*_pictures(front_end, options.tabs, folder=options.out, prefix=prefix), sep="\n")
        front_end.close()
        browser.close()


def _parse() -> argparse.Namespace:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("notebook", type=Path)
    parser.add_argument("--front", choices=FRONTS, default="lab")
    parser.add_argument("--tab", dest="tabs", action="append", default=[], help="name of a tab to open; repeatable")
    parser.add_argument("--theme", choices=("light", "dark"), default="light")
    parser.add_argument("--width", type=int, default=1400, help="of the window, in pixels")
    parser.add_argument("--out", type=Path, default=Path("pictures"))
    return parser.parse_args()


def _pictures(front_end: FrontEnd, tabs: list[str], *, folder: Path, prefix: str) -> list[Path]:
    """Save the pictures; return their paths."""
    shown = [i for i in range(len(front_end.cells())) if front_end.has_output(i)]
    paths = [front_end.screenshot(folder / f"{prefix}-cell{i + 1}.png", cell=i) for i in shown]
    for name in tabs:
        cell = next(i for i in shown if front_end.tab(name, cell=i).count())
        front_end.click_tab(name, cell=cell)
        paths.append(front_end.screenshot(folder / f"{prefix}-{name.replace(' ', '-')}.png", cell=cell))
    return paths


if __name__ == "__main__":
    main()
