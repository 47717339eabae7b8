"""What the wheel puts where JupyterLab and Notebook look for prebuilt extensions."""

from __future__ import annotations

import hashlib
import json
import zipfile
from pathlib import Path

import pytest
from hatchling.builders.wheel import WheelBuilder

ROOT = Path(__file__).parents[2]
PLUGIN = ROOT / "src/batten/notebook/labextension/plugin.js"
PLACE = ".data/data/share/jupyter/labextensions/batten-insert/"


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Build a wheel as `pip install .` does; return its files by name."""
    [path] = WheelBuilder(str(ROOT)).build(directory=str(tmp_path_factory.mktemp("wheel")), versions=["standard"])
    with zipfile.ZipFile(path) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def extension(wheel: dict[str, bytes]) -> dict[str, bytes]:
    return {name.split(PLACE)[1]: content for name, content in wheel.items() if PLACE in name}


def test_the_wheel_holds_a_prebuilt_extension_whose_script_is_named_by_its_content(wheel: dict[str, bytes]) -> None:
    script = PLUGIN.read_bytes()
    entry = f"static/remoteEntry.{hashlib.sha256(script).hexdigest()[:20]}.js"
    files = extension(wheel)
    assert sorted(files) == ["install.json", "package.json", entry]
    assert files[entry] == script
    package = json.loads(files["package.json"])
    assert package["name"] == "batten-insert"
    assert package["jupyterlab"] == {"extension": True, "_build": {"load": entry, "extension": "./extension"}}
    assert json.loads(files["install.json"])["packageName"] == "batten"


def test_the_extension_has_the_version_of_the_package(wheel: dict[str, bytes]) -> None:
    [metadata] = [content.decode() for name, content in wheel.items() if name.endswith("METADATA")]
    version = json.loads(extension(wheel)["package.json"])["version"]
    assert f"\nVersion: {version}\n" in metadata


def test_neither_the_hook_nor_the_sources_of_the_extension_are_importable(wheel: dict[str, bytes]) -> None:
    assert not [name for name in wheel if name.startswith("batten/notebook/labextension")]
