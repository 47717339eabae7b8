"""Runs emitted scripts in clean processes: `run_script(source, frames, engine)`.

One server process imports the libraries once and forks for every script, so that a run costs no import. In the child
warnings are errors, batten cannot be imported, and nothing is shared with the tests or with other scripts.
"""

from __future__ import annotations

import atexit
import os
import pickle
import struct
import subprocess
import sys
from collections.abc import Mapping
from dataclasses import dataclass, field
from importlib import import_module
from typing import IO, Any

__all__ = ["ENGINES", "Ran", "run_script"]

ENGINES = ("patsy", "formulaic")


@dataclass(frozen=True)
class Ran:
    """error: the traceback, or "". names: the script's numbers, arrays and tables. printed: what it wrote.

    changed: frames that are no longer what they were.
    """

    error: str
    names: Mapping[str, Any] = field(default_factory=dict)
    printed: str = ""
    changed: tuple[str, ...] = ()


def run_script(
    source: str, frames: Mapping[str, Any], engine: str = "patsy", *, after: str = "", draw: bool = True
) -> Ran:
    """Execute a script where `frames` exist by name, under one of statsmodels' formula engines.

    after: further code for the script's namespace, to ask its functions something. draw: whether pictures are really
    drawn, which takes half of the time.
    """
    server = _server()
    assert server.stdin is not None
    assert server.stdout is not None
    _send(server.stdin, (source, dict(frames), engine, after, draw))
    return Ran(**_receive(server.stdout))


_SERVERS: list[subprocess.Popen[bytes]] = []


def _server() -> subprocess.Popen[bytes]:
    if not _SERVERS:
        quiet = {**os.environ, "OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1", "MPLBACKEND": "Agg"}
        quiet.pop("PYTHONWARNINGS", None)
        server = subprocess.Popen([sys.executable, __file__], stdin=subprocess.PIPE, stdout=subprocess.PIPE, env=quiet)
        _SERVERS.append(server)
        atexit.register(_stop)
    return _SERVERS[0]


def _stop() -> None:
    for server in _SERVERS:
        assert server.stdin is not None
        assert server.stdout is not None
        server.stdin.close()
        server.stdout.close()
        server.wait(timeout=20)
    _SERVERS.clear()


def _send(stream: IO[bytes], value: Any) -> None:
    data = pickle.dumps(value)
    stream.write(struct.pack("<Q", len(data)) + data)
    stream.flush()


def _receive(stream: IO[bytes]) -> Any:
    size = stream.read(8)
    if len(size) < 8:
        raise EOFError
    return pickle.loads(stream.read(struct.unpack("<Q", size)[0]))


_FIRST = """
import matplotlib.pyplot as plt
import pandas as pd
import statsmodels.formula.api as smf
rows = pd.DataFrame({"x": [1.0, 2, 3, 5], "y": [1.0, 3, 2, 5], "g": pd.Categorical(["a", "b", "a", "b"])})
smf.ols("y ~ x + C(g)", rows).fit(cov_type="HC3", use_t=True)
rows[["x", "y"]].plot()
plt.close("all")
"""


# --- the server -------------------------------------------------------------------------------------------------------


def _serve() -> None:
    for library in ("matplotlib.pyplot", "scipy.interpolate", "statsmodels.api", "statsmodels.formula.api"):
        import_module(library)  # once, for all children
    for engine in ENGINES:
        _execute(_FIRST, {}, engine, "", True)  # what libraries load at first use
    sys.modules["batten"] = None  # type: ignore[assignment]  # a script must never need it
    channel = os.fdopen(os.dup(1), "wb")
    os.dup2(2, 1)  # what anything prints must not get between the answers
    while True:
        try:
            job = _receive(sys.stdin.buffer)
        except EOFError:
            return
        into, out = os.pipe()
        child = os.fork()
        if child == 0:
            os.close(into)
            with os.fdopen(out, "wb") as answer:
                _send(answer, _execute(*job))
            os._exit(0)
        os.close(out)
        with os.fdopen(into, "rb") as answer:
            try:
                result = _receive(answer)
            except EOFError:
                result = {"error": "the script's process died"}
        os.waitpid(child, 0)
        _send(channel, result)


def _execute(source: str, frames: dict[str, Any], engine: str, after: str, draw: bool) -> dict[str, Any]:
    import contextlib
    import io
    import traceback
    import warnings

    import statsmodels.formula

    statsmodels.formula.options.formula_engine = engine
    if not draw:
        _draw_nothing()
    before = {name: pickle.dumps(frame) for name, frame in frames.items()}
    space: dict[str, Any] = {"__name__": "__main__", **frames}
    printed, error = io.StringIO(), ""
    with contextlib.redirect_stdout(printed), warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            exec(compile(source, "script", "exec"), space)
            exec(compile(after, "after", "exec"), space)
        except BaseException:
            error = traceback.format_exc()
    changed = tuple(name for name, old in before.items() if pickle.dumps(frames[name]) != old)
    moved = tuple(name for name in frames if space.get(name) is not frames[name])
    return {"error": error, "names": _plain(space), "printed": printed.getvalue(), "changed": changed + moved}


def _draw_nothing() -> None:
    """In this process, pictures take any call and stay empty."""
    from unittest.mock import MagicMock

    import pandas as pd

    pd.DataFrame.plot = MagicMock()  # type: ignore[assignment,method-assign]


def _plain(space: dict[str, Any]) -> dict[str, Any]:
    """What can be sent back: numbers, texts, arrays and tables."""
    import numpy as np
    import pandas as pd

    kinds = (int, float, str, list, tuple, np.ndarray, np.generic, pd.DataFrame, pd.Series)
    return {name: value for name, value in space.items() if isinstance(value, kinds) and not name.startswith("_")}


if __name__ == "__main__":
    _serve()
