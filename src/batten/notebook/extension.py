"""%load_ext batten and %unload_ext batten: what a shell gets, and gives back whole."""

from __future__ import annotations

from contextlib import suppress
from importlib import import_module
from typing import Any

from batten.notebook.completion import add_completion, remove_completion
from batten.notebook.display import add_formatters, in_kernel, remove_formatters
from batten.notebook.magic import BattenMagics

__all__ = ["load", "unload"]


def load(shell: Any) -> None:
    """Register the magics, their completion, and how examinations and fits are shown; a second time changes nothing."""
    if _registered(shell) is not None:
        return
    magics = BattenMagics(shell)
    shell.register_magics(magics)
    add_completion(shell, magics)
    add_formatters(shell)
    if in_kernel(shell):
        with suppress(ModuleNotFoundError):  # without ipywidgets the static report is shown
            import_module("batten.notebook.widget")  # now, so that the first cell need not wait for it


def unload(shell: Any) -> None:
    """Take all of it away again; the last examination is forgotten, variables stay."""
    magics = _registered(shell)
    if magics is None:
        return
    manager = shell.magics_manager
    for kind in ("line", "cell"):
        manager.magics[kind].pop("batten", None)
    del manager.registry[BattenMagics.__name__]
    shell.configurables.remove(magics)
    remove_completion(shell)
    remove_formatters(shell)


def _registered(shell: Any) -> BattenMagics | None:
    magics: BattenMagics | None = shell.magics_manager.registry.get(BattenMagics.__name__)
    return magics
