"""The quickstart runs from top to bottom in a real kernel, and its cells give what a user reads off them."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any

import nbformat
import pytest
from nbclient import NotebookClient

QUICKSTART = Path(__file__).parents[2] / "notebooks" / "quickstart.ipynb"


@pytest.fixture(scope="module")
def written() -> Any:
    """The notebook as it is in the repository."""
    return nbformat.read(QUICKSTART, as_version=nbformat.NO_CONVERT)


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("quickstart")


@pytest.fixture(scope="module")
def outputs(folder: Path) -> dict[str, list[Any]]:
    """Outputs by cell id; a cell that raises fails here."""
    notebook = nbformat.read(QUICKSTART, as_version=4)
    client = NotebookClient(notebook, timeout=300, kernel_name="python3", resources={"metadata": {"path": str(folder)}})
    client.execute(env={**os.environ, "OMP_NUM_THREADS": "1"})
    return {cell.id: cell.get("outputs", []) for cell in notebook.cells}


def text(outputs: list[Any]) -> str:
    return "".join(o.get("text", "") or o.get("data", {}).get("text/plain", "") for o in outputs)


def test_it_is_committed_as_a_valid_notebook_without_outputs_and_short(written: Any) -> None:
    nbformat.validate(written)
    assert (written.nbformat, written.nbformat_minor) == (4, 5)
    assert len(written.cells) < 10
    for cell in written.cells:
        assert cell.metadata == {}
        if cell.cell_type == "code":
            assert (cell.outputs, cell.execution_count) == ([], None)


def test_the_examination_is_shown_as_a_widget_and_as_a_static_copy_that_the_widget_hides(
    outputs: dict[str, list[Any]],
) -> None:
    widget, static = (output["data"] for output in outputs["examine"])
    assert "application/vnd.jupyter.widget-view+json" in widget
    assert widget["text/html"] == ""
    assert "\n" not in widget["text/plain"]
    assert re.match(r'<div class="batten-static-[0-9a-f]{32}"><div class="batten-report">', static["text/html"])
    assert static["text/plain"].startswith(widget["text/plain"].split(" (")[0])


def test_the_numbers_asked_for_are_there_and_near_the_truth_of_the_invented_castings(
    outputs: dict[str, list[Any]],
) -> None:
    """`batten.sample` documents how the castings were made; the intervals below are far wider than their noise."""
    assert re.search(r"difference +1[0-5]\.\d", text(outputs["span"]))
    assert "a mean of 30 min is reached at" in text(outputs["slot"])
    assert [line.split()[0] for line in text(outputs["castings"]).splitlines()[1:]] == ["0", "1", "2"]
    assert re.search(r"total +3\d\d\.\d", text(outputs["order"]))


def test_the_report_is_written_and_the_code_announced(outputs: dict[str, list[Any]], folder: Path) -> None:
    assert text(outputs["report"]) == "Written: order_14.html\n"
    assert (folder / "order_14.html").read_text(encoding="utf-8").startswith("<!DOCTYPE html>")
    assert text(outputs["code"]).startswith("In the next cell: ")
