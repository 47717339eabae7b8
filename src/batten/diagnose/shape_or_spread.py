"""Shape or spread? The two-by-two reading of one straight line's troubles, and the cheapest cures for each cell."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

__all__ = ["Cure", "ShapeOrSpread", "shape_or_spread"]

Cure = Literal["none", "robust errors", "weights", "shape of x", "log link", "scale of y", "scale of y and shape of x"]

#: a p-value below this counts the spread as uneven, if the ratio of SDs agrees
ALPHA = 0.05
#: SDs that differ by less than this factor are even enough whatever p says: with many rows p punishes trifles
TRIFLE = 1.25
#: SDs that differ by more than this factor are not called even only because few rows could not show it
MARKED = 1.5


@dataclass(frozen=True)
class ShapeOrSpread:
    """cures: cheapest first."""

    shape: Literal["straight", "curved", "cannot tell"]
    spread: Literal["even", "uneven", "cannot tell"]
    cures: tuple[Cure, ...]


def shape_or_spread(curved: bool | None, *, koenker_p: float | None, sd_ratio: float | None) -> ShapeOrSpread:
    """Reading of the bend's verdict with the spread about the flexible fit.

    curved: True where the line bends and it matters, False where it is straight enough or the bend is too small to
    matter, None where these rows cannot tell. koenker_p, sd_ratio: Koenker's test and the ratio of fitted SDs, both on
    the residuals of the flexible fit, or a missed bend passes for uneven spread; None where they could not be made.
    """
    shape: Literal["straight", "curved", "cannot tell"]
    shape = "cannot tell" if curved is None else "curved" if curved else "straight"
    spread = _spread(koenker_p, sd_ratio)
    return ShapeOrSpread(shape, spread, _CURES[shape, spread])


def _spread(p: float | None, ratio: float | None) -> Literal["even", "uneven", "cannot tell"]:
    if p is None or ratio is None or not ratio > 0:
        return "cannot tell"
    factor = max(ratio, 1 / ratio)
    if factor < TRIFLE:
        return "even"
    if p < ALPHA:
        return "uneven"
    return "even" if factor < MARKED else "cannot tell"


#: transforming x moves the curve and leaves the spread alone; weights and robust errors do the reverse; a log link
#: bends the curve and is indifferent to the spread; transforming y does both at once, wanted or not
_CURES: dict[tuple[str, str], tuple[Cure, ...]] = {
    ("straight", "even"): ("none",),
    ("straight", "uneven"): ("robust errors", "weights"),
    ("straight", "cannot tell"): ("robust errors",),
    ("curved", "even"): ("shape of x",),
    ("curved", "uneven"): ("log link", "scale of y", "scale of y and shape of x"),
    ("curved", "cannot tell"): ("shape of x", "robust errors", "log link"),
    ("cannot tell", "even"): ("none", "shape of x"),
    ("cannot tell", "uneven"): ("robust errors", "weights", "log link", "scale of y"),
    ("cannot tell", "cannot tell"): ("robust errors",),
}
