"""A real Jupyter server for both front ends, with everything it reads or writes in one folder."""

from __future__ import annotations

import importlib.util
import json
import os
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

_HOOK = Path(__file__).parents[2] / "src/batten/notebook/labextension/hatch_hook.py"
_SETTINGS = {
    "notification": {"fetchNews": "false", "checkForUpdates": False, "doNotDisturbMode": True},
    "themes": {"theme": "JupyterLab Light"},
}


@dataclass(frozen=True)
class Server:
    """A running Jupyter server: its address and the folder whose notebooks it serves."""

    url: str
    root: Path


@contextmanager
def running_server(folder: Path, *, theme: str = "light") -> Iterator[Server]:
    """Run one server for both front ends; everything it reads or writes lies in `folder`."""
    root = folder / "notebooks"
    root.mkdir(parents=True)
    _write_settings(folder / "settings", theme)
    port = _free_port()
    command = [sys.executable, "-m", "jupyterlab", *_server_options(port, root, labextension(folder / "labextensions"))]
    with (folder / "server.log").open("w") as log:
        process = subprocess.Popen(command, env=_environment(folder), stdout=log, stderr=subprocess.STDOUT, cwd=folder)
        try:
            _wait_until_it_answers(process, f"http://127.0.0.1:{port}/api/status", folder / "server.log")
            yield Server(f"http://127.0.0.1:{port}", root)
        finally:
            process.terminate()  # the server ends its kernels on this signal
            try:
                process.wait(20)
            except subprocess.TimeoutExpired:
                process.kill()
                process.wait()


def _server_options(port: int, root: Path, extensions: Path) -> list[str]:
    return [
        "--no-browser",
        "--allow-root",
        "--ServerApp.ip=127.0.0.1",
        f"--ServerApp.port={port}",
        "--ServerApp.port_retries=0",
        f"--ServerApp.root_dir={root}",
        "--IdentityProvider.token=",
        "--PasswordIdentityProvider.hashed_password=",
        "--LabApp.expose_app_in_browser=True",
        "--JupyterNotebookApp.expose_app_in_browser=True",
        f"--LabServerApp.extra_labextensions_path={extensions}",  # read by both front ends, before the installed ones
    ]


def _environment(folder: Path) -> dict[str, str]:
    own = {
        "JUPYTER_CONFIG_DIR": "config",
        "JUPYTER_DATA_DIR": "data",
        "JUPYTER_RUNTIME_DIR": "runtime",
        "JUPYTERLAB_SETTINGS_DIR": "settings",
        "JUPYTERLAB_WORKSPACES_DIR": "workspaces",
        "IPYTHONDIR": "ipython",
        "MPLCONFIGDIR": "matplotlib",
    }
    rest = {name: value for name, value in os.environ.items() if not name.startswith("JUPYTER")}
    return rest | {name: str(folder / place) for name, place in own.items()}


def _write_settings(folder: Path, theme: str) -> None:
    settings = _SETTINGS | {"themes": {"theme": f"JupyterLab {theme.capitalize()}"}}
    place = folder / "@jupyterlab" / "apputils-extension"
    place.mkdir(parents=True)
    for name, values in settings.items():
        (place / f"{name}.jupyterlab-settings").write_text(json.dumps(values))


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def _wait_until_it_answers(process: subprocess.Popen[bytes], url: str, log: Path) -> None:
    deadline = time.monotonic() + 60
    while time.monotonic() < deadline and process.poll() is None:
        try:
            with urllib.request.urlopen(url, timeout=5):
                return
        except (urllib.error.URLError, ConnectionError):
            time.sleep(0.05)  # the pause between two looks, not a guess at how long it takes
    raise RuntimeError(f"The Jupyter server did not start:\n{log.read_text()[-2000:]}")


def labextension(folder: Path) -> Path:
    """Lay out the plugin as it is in the working tree now; return the folder that holds it."""
    spec = importlib.util.spec_from_file_location("hatch_hook", _HOOK)
    assert spec is not None
    assert spec.loader is not None
    hook = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(hook)
    hook.lay_out(folder, version="0")
    return folder
