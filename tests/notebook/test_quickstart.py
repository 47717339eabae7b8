"""The quickstart runs from top to bottom in a real kernel, and its cells give what a user reads off them."""

from __future__ import annotations

import math
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


def numbers(line: str) -> list[float]:
    return [float(number) for number in re.findall(r"-?\d+(?:\.\d+)?", line)]


def row(outputs: list[Any], name: str) -> tuple[float, float, float]:
    """estimate, low, high of one row of a printed table."""
    [line] = [line for line in text(outputs).splitlines() if line.split()[0] == name]
    estimate, low, high = numbers(line.removeprefix(name))[:3]
    return estimate, low, high


def true_mean(mass: float, alloy: str) -> float:
    """Mean minutes as `batten.sample` documents them: the castings are invented."""
    factor = {"bronze": 1.0, "grey iron": 1.2, "steel": 1.55}[alloy]
    return math.exp(1.2) * mass**0.5 * factor * math.exp(0.18**2 / 2)


def test_the_answers_hold_the_truth_of_the_invented_castings(outputs: dict[str, list[Any]]) -> None:
    """Each 95% interval misses the truth in 1 of 20 such samples; in this one none does."""
    order = {0: (12, 6, "bronze"), 1: (8, 18, "steel"), 2: (3, 45, "grey iron")}
    for place, (_, mass, alloy) in order.items():
        estimate, low, high = row(outputs["castings"], str(place))
        assert low < true_mean(mass, alloy) < high
        assert estimate == pytest.approx(true_mean(mass, alloy), rel=0.05)  # five times its standard error
    _, low, high = row(outputs["order"], "total")
    assert low < sum(count * true_mean(mass, alloy) for count, mass, alloy in order.values()) < high
    _, low, high = row(outputs["span"], "ratio")
    assert low < true_mean(40, "steel") / true_mean(10, "steel") < high
    minutes, _, level, low, high = numbers(text(outputs["slot"]))
    assert (minutes, level) == (30, 95)
    assert true_mean(low, "steel") < 30 < true_mean(high, "steel")


def test_the_report_is_written_and_the_code_announced(outputs: dict[str, list[Any]], folder: Path) -> None:
    assert text(outputs["report"]) == "Written: order_14.html\n"
    assert (folder / "order_14.html").read_text(encoding="utf-8").startswith("<!DOCTYPE html>")
    assert text(outputs["code"]).startswith("In the next cell: ")
