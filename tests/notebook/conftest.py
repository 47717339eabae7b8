"""Shells for the magics: own instances, as a terminal has them, with batten loaded."""

from __future__ import annotations

import atexit
from collections.abc import Callable, Iterator
from typing import Any

import numpy as np
import pandas as pd
import pytest
from IPython.core.interactiveshell import InteractiveShell
from traitlets.config import Config

from batten.notebook import insertion


def new_shell() -> InteractiveShell:
    """A shell that keeps no history on disk."""
    return InteractiveShell(config=Config({"HistoryManager": {"enabled": False}}))


def end_shell(shell: InteractiveShell) -> None:
    """Let it go: it has nothing on disk, and what it does at Python's end takes longer than most of these tests."""
    atexit.unregister(shell.atexit_operations)


@pytest.fixture
def bare_shell() -> Iterator[InteractiveShell]:
    """A shell without batten."""
    made = new_shell()
    yield made
    end_shell(made)


@pytest.fixture
def shell(bare_shell: InteractiveShell, monkeypatch: pytest.MonkeyPatch) -> InteractiveShell:
    """A shell in which batten is loaded and a few variables are defined."""
    monkeypatch.setattr(insertion, "get_ipython", lambda: bare_shell)
    bare_shell.run_line_magic("load_ext", "batten")
    bare_shell.user_ns.update(castings=castings(), limit=30, names=["a"], alloys=castings()["alloy"])
    return bare_shell


def castings() -> pd.DataFrame:
    """Thirty invented castings; columns with plain and with unusual names."""
    rng = np.random.default_rng(7)
    mass = np.round(rng.uniform(3, 60, 30), 1)
    return pd.DataFrame({
        "minutes": np.round(4 * mass**0.5 * rng.lognormal(0, 0.1, 30), 1),
        "mass_kg": mass,
        "alloy": np.resize(["bronze", "steel"], 30),
        "daily light": np.round(mass / 3 + rng.normal(0, 1, 30), 2),
        "wall": np.round(rng.normal(0, 4, 30), 1),
        "class": np.resize([1.0, 2.0, 4.0], 30),
    })  # fmt: skip


@pytest.fixture
def run(shell: InteractiveShell, capsys: pytest.CaptureFixture[str]) -> Callable[[str], tuple[str, str]]:
    """Runs a cell as if it were typed; returns what it prints and its errors."""

    def run_cell(cell: str) -> tuple[str, str]:
        capsys.readouterr()
        shell.run_cell(cell)
        return capsys.readouterr()

    return run_cell


@pytest.fixture
def last(shell: InteractiveShell) -> Callable[[], Any]:
    """The examination that %batten works on."""
    return lambda: shell.magics_manager.registry["BattenMagics"].last
