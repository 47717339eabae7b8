"""The magics in IPython in a terminal: text, and code in the next prompt."""

from __future__ import annotations

import os
import re
import sys
from pathlib import Path

import pytest

pexpect = pytest.importorskip("pexpect", reason="IPython brings it, but not on Windows")

PATIENCE = 60


@pytest.mark.skipif(sys.platform == "win32", reason="there are no pseudo-terminals")
def test_the_result_is_text_as_wide_as_the_terminal_and_the_code_is_in_the_next_prompt(tmp_path: Path) -> None:
    quick = "--only ladder --folds 2 --repeats 1"
    script = tmp_path / "start.ipy"
    script.write_text(
        "%load_ext batten\nimport batten\ncastings = batten.sample('castings').head(60)\n"
        f"get_ipython().run_cell('''%%batten castings {quick}\\nminutes ~ mass_kg''')\n"
    )
    environment = {**os.environ, "IPYTHONDIR": str(tmp_path), "OMP_NUM_THREADS": "1", "TERM": "xterm"}
    environment.pop("COLUMNS", None)
    child = pexpect.spawn(
        sys.executable, ["-m", "IPython", "--no-banner", "--colors=NoColor", "--no-confirm-exit", "-i", str(script)],
        env=environment, encoding="utf-8", timeout=PATIENCE, dimensions=(60, 80),
    )  # fmt: skip
    try:
        child.expect(r"%batten report\s+FILE")
        shown = re.sub(r"\x1b\[[0-9;?]*[a-zA-Z]|\x1b\][^\x07]*\x07", "", child.before)
        assert "Choice: " in shown
        assert "<div" not in shown
        # a table is as wide as its numbers need
        assert max(len(line) for line in shown.splitlines() if not re.search(r"---|\S {2,}\S", line)) <= 80
        child.expect("In ")
        child.sendline("%batten code log y ~ log x")
        child.expect("In the next cell: ")
        child.expect(r"\.\.\.: ")  # further lines of a prompt that nobody has typed
    finally:
        child.close(force=True)
