"""The house: which stratum may import which, and what `import batten` must not load."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

SOURCE = Path(__file__).parent.parent / "src" / "batten"

#: what each stratum may import besides itself (DEVELOPERS.md, "The house")
BELOW = {
    "errors": set(),
    "engine": {"errors"},
    "families": {"errors", "engine"},
    "frame": {"errors", "engine"},
    "fit": {"errors", "engine", "families", "frame"},
    "diagnose": {"errors", "engine", "families", "frame", "fit"},
    "effects": {"errors", "engine", "families", "frame", "fit", "diagnose"},
    "compare": {"errors", "engine", "families", "frame", "fit", "diagnose", "effects"},
    "emit": {"errors", "engine", "families", "frame", "fit", "diagnose", "effects"},
}
BELOW["report"] = set(BELOW) | {"compare", "emit"}
BELOW["exam"] = set(BELOW)
BELOW["notebook"] = set(BELOW)

#: libraries that only some strata may import
HOMES = {
    "patsy": {"frame"},
    "narwhals": {"frame"},
    "pandas": {"frame", "emit", "exam", "report", "notebook"},
    "matplotlib": {"report", "notebook"},
    "IPython": {"notebook"},
    "ipywidgets": {"notebook"},
}


def imports(path: Path) -> set[tuple[str, bool]]:
    """(module, at the top level of the file) of every absolute import that runs."""
    found = set()
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for_types = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and isinstance(node.test, ast.Name) and node.test.id == "TYPE_CHECKING"
        for inner in ast.walk(node)
    }
    for node in ast.walk(tree):
        if id(node) in for_types:
            continue
        names = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module:
            names = [node.module]
        found |= {(name, node in tree.body) for name in names}
    return found


FILES = sorted(p for p in SOURCE.rglob("*.py") if p.parent != SOURCE)


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(SOURCE)))
def test_a_module_imports_its_own_stratum_and_those_to_the_left(path: Path) -> None:
    stratum = path.relative_to(SOURCE).parts[0]
    for name, at_top in imports(path):
        parts = name.split(".")
        if parts[0] == "batten" and len(parts) > 1:
            # the facades hand a finished result to the renderers above them, by name and only when asked
            late = stratum == "exam" and not at_top
            assert parts[1] == stratum or parts[1] in BELOW[stratum] or late, f"{path.name} imports {name}"
        if parts[0] in HOMES:
            assert stratum in HOMES[parts[0]], f"{path.name} imports {name}"


def test_every_folder_has_its_place() -> None:
    folders = {p.name for p in SOURCE.iterdir() if p.is_dir() and not p.name.startswith(("_", "."))}
    assert folders == set(BELOW)


def test_importing_the_package_loads_no_notebook_and_no_drawing() -> None:
    ask = "import sys, batten; print([m for m in ('IPython', 'ipywidgets', 'matplotlib') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", ask], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_no_source_file_grows_past_four_hundred_lines() -> None:
    long = {str(p.relative_to(SOURCE)): n for p in FILES if (n := len(p.read_text().splitlines())) > 400}
    assert not long
