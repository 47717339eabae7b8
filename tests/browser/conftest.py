"""One server and one browser for all browser tests; a fresh tab for each."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from front_end import CHROMIUM, FRONTS, FrontEnd, launch, new_context
from jupyter_server_process import Server, running_server
from playwright.sync_api import BrowserContext, sync_playwright


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker("browser")


@pytest.fixture(scope="session")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Server]:
    with running_server(tmp_path_factory.mktemp("server")) as running:
        yield running


@pytest.fixture(scope="session")
def context() -> Iterator[BrowserContext]:
    if not Path(CHROMIUM).exists() and "CI" not in os.environ:
        pytest.skip(f"There is no browser at {CHROMIUM}; set BATTEN_CHROMIUM.")
    with sync_playwright() as playwright:
        browser = launch(playwright)
        yield new_context(browser)
        browser.close()


@pytest.fixture(params=FRONTS)
def new_tab(
    request: pytest.FixtureRequest, server: Server, context: BrowserContext
) -> Iterator[Callable[[], FrontEnd]]:
    """Return a maker of tabs in one of the two front ends."""
    tabs: list[FrontEnd] = []

    def make() -> FrontEnd:
        tabs.append(FrontEnd(context.new_page(), server, front=request.param))
        return tabs[-1]

    yield make
    for tab in tabs:
        tab.close()


@pytest.fixture
def front_end(new_tab: Callable[[], FrontEnd]) -> FrontEnd:
    """Return a tab in which nothing is open yet."""
    return new_tab()
