"""The standing question: what the analyst asks of every remedy."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

__all__ = ["Question"]


@dataclass(frozen=True)
class Question:
    """Everything asked that is not data. Frozen; shared by all layers above the fit.

    span: the two x values compared (always filled in by `examine`: rounded quartiles by default).
    tolerance: smallest gap that matters, units of y, or None for the default (a quarter of the spline's residual SD).
    at: covariate values that replace the rows' own in averages, by column name.
    """

    aim: Literal["effect", "prediction"] = "effect"
    span: tuple[float, float] = (0.0, 1.0)
    level: float = 0.95
    tolerance: float | None = None
    expect: Literal["rising", "falling"] | None = None
    planned: str | None = None
    by: str | None = None
    at: Mapping[str, Any] = field(default_factory=dict)
    only: tuple[str, ...] = ()
    errors: Literal["robust", "constant"] = "robust"
    folds: int = 10
    repeats: int | None = None
    seed: int = 0
