"""batten: for regressions that bend.

`examine` fits a grid of remedies, compares them fairly in the response's own units and chooses; the `%%batten` cell
magic does the same in a notebook and shows a widget. Importing the package loads no notebook, widget or drawing
library.
"""

from __future__ import annotations

from typing import Any

from batten.errors import BattenError, InputError, UnknownNameError
from batten.exam import Examination, Fit, examine
from batten.frame.samples import sample

__version__ = "0.1.0"

__all__ = [
    "BattenError", "Examination", "Fit", "InputError", "UnknownNameError", "__version__", "examine", "sample",
]  # fmt: skip


def load_ipython_extension(shell: Any) -> None:
    """`%load_ext batten`."""
    from batten.notebook.extension import load

    load(shell)


def unload_ipython_extension(shell: Any) -> None:
    """`%unload_ext batten`."""
    from batten.notebook.extension import unload

    unload(shell)
