"""Every published number of a regression on a fixed form: key -> how batten answers it."""

from __future__ import annotations

import math
import re

import numbers_of_effect
import numbers_of_fit
import numbers_of_power
import numbers_of_prediction
from asked import Asked, Placed, Rule
from case_tables import NotDelivered

__all__ = ["RULES", "number"]

_PARTS = (numbers_of_fit, numbers_of_effect, numbers_of_prediction, numbers_of_power)

RULES: dict[str, Rule] = {name: rule for part in _PARTS for name, rule in part.RULES.items()}
_PLACED: tuple[Placed, ...] = tuple(rule for part in _PARTS for rule in part.PLACED)


def number(asked: Asked, key: str) -> float:
    """The number a key names; `key` without its prefix."""
    name, _, rest = key.partition(":")
    if name in RULES:
        return _defined(key, float(RULES[name](asked, rest)))
    for pattern, rule in _PLACED:
        found = re.fullmatch(pattern, key)
        if found:
            return _defined(key, float(rule(asked, *found.groups())))
    raise NotDelivered(f"no rule for {key}")


def _defined(key: str, value: float) -> float:
    if math.isnan(value):
        raise NotDelivered(f"batten leaves {key} undefined here")
    return value
