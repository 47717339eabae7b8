"""Rows of the user's frame with values held, as its own columns have them."""

from __future__ import annotations

from collections.abc import Mapping
from keyword import iskeyword
from typing import Any

from batten.emit.parts import Parts
from batten.emit.text import literal

__all__ = ["held_at"]


def held_at(parts: Parts, value: str, others: Mapping[str, Any] | None = None) -> str:
    """Arguments of assign() that hold the focal predictor at a value, as the user's frame has it, and others too."""
    value = f'START + pd.to_timedelta({value}, "D")' if parts.covariates.start else value
    entries = {parts.problem.focus: value, **{name: literal(given) for name, given in (others or {}).items()}}
    if all(name.isidentifier() and not iskeyword(name) and name != "self" for name in entries):
        return ", ".join(f"{name}={source}" for name, source in entries.items())
    return f"**{{{', '.join(f'{literal(name)}: {source}' for name, source in entries.items())}}}"
