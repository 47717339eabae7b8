"""Format, lint and types of the source, so that one command checks everything."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent


@pytest.mark.parametrize(
    "command",
    [["ruff", "check", "src", "tests"], ["ruff", "format", "--check", "src", "tests"], ["mypy"]],
    ids=["lint", "format", "types"],
)
def test_the_source_is_clean(command: list[str]) -> None:
    done = subprocess.run([sys.executable, "-m", *command], capture_output=True, text=True, cwd=ROOT, check=False)
    assert done.returncode == 0, done.stdout[-3000:] + done.stderr[-1000:]
