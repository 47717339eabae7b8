"""The straight line's trial: does it bend, where, by how much, and does that matter?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.diagnose.bend import Bend, Flexible
from batten.fit.estimate import Estimate

__all__ = ["Stretch", "Trial", "try_line"]

#: above this the test of the bending columns is called quiet
QUIET = 0.05


@dataclass(frozen=True)
class Stretch:
    """A stretch of x where the line runs above or below the flexible curve. size: largest gap there, units of y."""

    low: float
    high: float
    side: str  # "too high" or "too low"
    size: float


@dataclass(frozen=True, eq=False)
class Trial:
    """Verdict on the untreated line, with everything it rests on.

    verdict: "straight enough", "too small to matter", "bends, and it matters" or "cannot tell with these rows".
    gap, gap_low, gap_high: largest gap to the flexible curve over the central 90% of x and its limits, units of y.
    f, p, df: robust test that the flexible curve's bending columns are zero. stretches: where the line misses.
    """

    verdict: str
    gap: float
    gap_low: float
    gap_high: float
    at: float
    tolerance: float
    tolerance_is_default: bool
    f: float
    p: float
    df: tuple[int, int]
    knots: int
    stretches: tuple[Stretch, ...]
    words: str


def try_line(line: Estimate, reference: Flexible, bend: Bend | None, *, x: str, x_unit: str, y_unit: str) -> Trial:
    """The trial of the straight line against the reference curve. x, x_unit, y_unit: names for the words."""
    if bend is None:
        nan = float("nan")
        words = f"{x} has too few different values to show a bend."
        return Trial(
            "cannot tell with these rows", nan, nan, nan, nan, reference.tolerance, reference.tolerance_is_default,
            nan, nan, (0, 0), 0, (), words,
        )  # fmt: skip
    quiet = not reference.add_on_p < QUIET
    verdict = {
        "matters": "bends, and it matters",
        "too small to matter": "straight enough" if quiet else "too small to matter",
        "cannot tell": "cannot tell with these rows",
    }[bend.verdict]
    stretches = _stretches(bend)
    knots = len(reference.estimate.state) if reference.estimate else 0
    words = _words(verdict, bend, stretches, reference, x=x, x_unit=x_unit, y_unit=y_unit)
    return Trial(
        verdict, bend.largest, bend.low, bend.high, bend.at, bend.tolerance, reference.tolerance_is_default,
        reference.add_on_f, reference.add_on_p, reference.add_on_df, knots, stretches, words,
    )  # fmt: skip


def _stretches(bend: Bend) -> tuple[Stretch, ...]:
    """Runs of one sign of the gap, left to right; slivers under a tenth of the largest gap are left out."""
    side = np.sign(bend.gap)
    cuts = np.flatnonzero(np.diff(side)) + 1
    out = []
    for part in np.split(np.arange(len(side)), cuts):
        size = float(np.abs(bend.gap[part]).max())
        if size >= 0.1 * bend.largest and side[part[0]] != 0:
            words = "too low" if side[part[0]] > 0 else "too high"
            out.append(Stretch(float(bend.places[part[0]]), float(bend.places[part[-1]]), words, size))
    return tuple(out)


def _words(
    verdict: str, bend: Bend, stretches: tuple[Stretch, ...], reference: Flexible, *, x: str, x_unit: str, y_unit: str
) -> str:
    def y(value: float) -> str:
        return f"{value:.3g} {y_unit}".rstrip()

    ours = " (our default; set yours with tolerance)" if reference.tolerance_is_default else ""
    opening = {
        "straight enough": "The straight line is straight enough",
        "too small to matter": "The line bends, but too little to matter",
        "bends, and it matters": "The straight line bends, and it matters",
        "cannot tell with these rows": "These rows cannot tell whether a bend matters",
    }[verdict]
    size = (
        f"{opening}: over the central 90% of {x} its mean misses a flexible curve by up to {y(bend.largest)} "
        f"(limits {y(bend.low)} to {y(bend.high)}), against {y(bend.tolerance)} that would matter{ours}."
    )
    if verdict in ("straight enough", "too small to matter"):
        return size
    unit = f" {x_unit}".rstrip()
    where = "; ".join(f"{s.side} by up to {y(s.size)} from {s.low:.4g} to {s.high:.4g}{unit}" for s in stretches)
    return f"{size} The line is {where}."
