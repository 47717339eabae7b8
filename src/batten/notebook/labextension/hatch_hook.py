"""Build hook: lays the page's plugin out as a prebuilt labextension of JupyterLab and Notebook.

The server sends these files with a lifetime of a year, so the script's name holds a hash of its content: a new release
is a new name, and no browser keeps the old one.
"""

from __future__ import annotations

import hashlib
import json
import shutil
import tempfile
from pathlib import Path
from typing import Any

from hatchling.builders.hooks.plugin.interface import BuildHookInterface

NAME = "batten-insert"
SOURCE = Path(__file__).with_name("plugin.js")


def lay_out(folder: Path, *, version: str) -> Path:
    """Write package.json, install.json and static/remoteEntry.HASH.js into `folder`/batten-insert; return that path."""
    script = SOURCE.read_bytes()
    entry = f"static/remoteEntry.{hashlib.sha256(script).hexdigest()[:20]}.js"
    package = {
        "name": NAME,
        "version": version,
        "description": "Puts the code of a batten widget into a new cell below it.",
        "license": "BSD-3-Clause",
        "jupyterlab": {"extension": True, "_build": {"load": entry, "extension": "./extension"}},
    }
    install = {
        "packageManager": "python",
        "packageName": "batten",
        "uninstallInstructions": "Remove the Python package batten: pip uninstall batten",
    }
    root = folder / NAME
    (root / entry).parent.mkdir(parents=True)
    (root / entry).write_bytes(script)
    (root / "package.json").write_text(json.dumps(package, indent=2) + "\n", encoding="utf-8")
    (root / "install.json").write_text(json.dumps(install, indent=2) + "\n", encoding="utf-8")
    return root


class LabextensionHook(BuildHookInterface):  # type: ignore[type-arg]  # hatchling's generic has no public argument
    """Adds the labextension to every wheel, editable ones included."""

    def initialize(self, version: str, build_data: dict[str, Any]) -> None:
        self._folder = Path(tempfile.mkdtemp(prefix="batten-"))
        root = lay_out(self._folder, version=self.metadata.version)
        build_data["shared_data"][str(root)] = f"share/jupyter/labextensions/{NAME}"

    def finalize(self, version: str, build_data: dict[str, Any], artifact_path: str) -> None:
        shutil.rmtree(self._folder)
