"""Finds the members: every module in scales/, shapes/, links/ and curves/ that defines FAMILY or FAMILIES."""

from __future__ import annotations

import pkgutil
from functools import cache
from importlib import import_module
from typing import Any

from batten.families.base import Link, Scale, Shape

__all__ = ["curves", "links", "scales", "shapes"]

# Loaded here, so that the package can afterwards give the functions below the names of its folders for good.
_FOLDERS = {name: import_module(f"batten.families.{name}") for name in ("curves", "links", "scales", "shapes")}


@cache
def scales() -> tuple[Scale, ...]:
    """One member of each response scale, from simple to elaborate."""
    return _members("scales")


@cache
def shapes() -> tuple[Shape, ...]:
    """One member of each predictor shape, from simple to elaborate."""
    return _members("shapes")


@cache
def links() -> tuple[Link, ...]:
    """One member of each link, from simple to elaborate."""
    return _members("links")


@cache
def curves() -> tuple[Shape, ...]:
    """One member of each known curve, from simple to elaborate."""
    return _members("curves")


def _members(folder: str) -> tuple[Any, ...]:
    package = _FOLDERS[folder]
    found: list[Any] = []
    for info in pkgutil.iter_modules(package.__path__):
        module = import_module(f"{package.__name__}.{info.name}")
        found += getattr(module, "FAMILIES", None) or [module.FAMILY]
    return tuple(sorted(found, key=lambda member: (member.rank, member.detail, member.key)))
