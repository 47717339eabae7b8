"""A notebook that is executed without a page and saved: what is in the file for whoever opens it later."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any

import nbformat
import pytest
from nbclient import NotebookClient
from widget_reading import tags

VIEW, STATE = "application/vnd.jupyter.widget-view+json", "application/vnd.jupyter.widget-state+json"
CELLS = (
    "%load_ext batten\nimport batten\npumps = batten.sample('pumps')",
    "%%batten pumps --only ladder --only polynomials --folds 4 --repeats 1 --keep exam\nenergy ~ flow + C(pump)",
    "print(*exam.chosen.sentences(), sep='\\n')",
)


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory) -> Any:
    """The file, read back."""
    path = tmp_path_factory.mktemp("saved") / "night run.ipynb"
    notebook = nbformat.v4.new_notebook(cells=[nbformat.v4.new_code_cell(source) for source in CELLS])
    NotebookClient(notebook, timeout=120, kernel_name="python3").execute(
        env={**os.environ, "OMP_NUM_THREADS": "1", "PYTHONPATH": os.environ.get("PYTHONPATH", "")}
    )
    nbformat.write(notebook, path)
    read = nbformat.read(Path(path), as_version=4)
    nbformat.validate(read)
    return read


def html_of(saved: Any) -> list[str]:
    """The HTML that the widget's models hold, in the saved state."""
    models = saved.metadata.widgets[STATE]["state"].values()
    return [m["state"]["value"] for m in models if m["model_name"] == "HTMLModel" and m["state"].get("value")]


def pictures(html: str) -> list[str]:
    return [str(attributes["src"]) for tag, attributes in tags(html) if tag == "img"]


def test_the_widget_comes_first_and_its_static_copy_second(saved: Any) -> None:
    view, static = (output["data"] for output in saved.cells[1].outputs)
    assert saved.metadata.widgets[STATE]["state"][view[VIEW]["model_id"]]["model_name"] == "VBoxModel"
    assert (view["text/html"], view["text/plain"].count("\n")) == ("", 0)
    assert sorted(static) == ["text/html", "text/plain"]
    assert static["text/plain"].startswith(view["text/plain"].split(" (")[0])


def test_the_copy_is_hidden_by_a_style_of_the_living_widget_only(saved: Any) -> None:
    static = saved.cells[1].outputs[1]["data"]["text/html"]
    (token,) = re.findall(r'^<div class="(batten-static-[0-9a-f]{32})">', static)
    assert f".{token}" not in static
    (sheet,) = [html for html in html_of(saved) if html.startswith("<style>")]
    assert f".{token}{{display:none!important}}" in sheet


def test_widget_and_copy_show_one_picture_and_the_same_sentence(saved: Any) -> None:
    static = saved.cells[1].outputs[1]["data"]["text/html"]
    (shown,) = [picture for html in html_of(saved) for picture in pictures(html)]
    assert pictures(static) == [shown]
    sentence = saved.cells[2].outputs[0]["text"].split("\n")[0]
    assert sentence in re.sub(r"\s+", " ", static)
    assert any(sentence in re.sub(r"\s+", " ", html) for html in html_of(saved))


def test_no_other_panel_was_drawn(saved: Any) -> None:
    assert sum("batten-waiting" in html for html in html_of(saved)) >= 8
