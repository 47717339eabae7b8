"""What only the straight line is asked: the rule of thirds, and whether shape or spread is the trouble."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from batten.diagnose.bend import bend_of, flexible
from batten.diagnose.bulging import Bulge, bulge
from batten.diagnose.partial import conditional_residuals, partial_residuals
from batten.diagnose.shape_or_spread import shape_or_spread
from batten.diagnose.tests_of_spread import fitted_spread, koenker
from batten.effects.check import Check
from batten.effects.numbers import show, show_interval
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.errors import Refusal
from batten.fit.estimate import Estimate

__all__ = ["checks_of_line"]

#: rows up to which the thirds are resampled
RESAMPLED = 5_000


def checks_of_line(
    est: Estimate, names: Names, *, tolerance: float | None, bent: bool, every: bool
) -> Iterator[Check | None]:
    """For "y ~ x" alone, at many rows only if `every` check is asked for.

    bent: a covariate bends along x, so that partial residuals would bend falsely.
    """
    if est.remedy.key != "y ~ x" or not (every or est.n <= RESAMPLED):
        return
    yield _trouble(est, names, tolerance)
    alone = est.rows.modifier.shape[1] == 1 and bool((est.rows.modifier == 1).all())
    if alone and est.rows.weights is None:
        yield _thirds(est, names, bent)


def _trouble(est: Estimate, names: Names, tolerance: float | None) -> Check | None:
    """The two-by-two reading: the gap to a flexible curve, and the spread around that curve."""
    reference = flexible(est.rows, tolerance=tolerance)
    bend = bend_of(reference, est)
    if reference.estimate is None or bend is None or isinstance(bend, Refusal):
        return None
    e, x = reference.estimate.residual, est.rows.x
    test, spread = koenker(e, x[:, None]), fitted_spread(e, x)
    found = shape_or_spread(
        {"matters": True, "too small to matter": False}.get(bend.verdict),
        koenker_p=None if test is None else test.p, sd_ratio=None if spread is None else spread.ratio,
    )  # fmt: skip
    shape = _SHAPES.get(found.shape, "these rows cannot tell whether a bend matters")
    even = _SPREADS.get(found.spread, "these rows cannot tell whether the spread is even")
    cures = " or ".join(cure if cure != "none" else "nothing to cure" for cure in found.cures)
    reading = (
        f"the line lies up to {show(bend.largest, names.y_unit)} from a flexible fit: {shape}; {even}. "
        f"Cheapest first: {cures}"
    )
    asked = "is the trouble, if any, the shape or the spread?"
    return Check("shape or spread", "shape", asked, bend.largest, names.y_unit, reading)


_SHAPES = {"straight": "it does not bend enough to matter", "curved": "it bends, and that matters"}
_SPREADS = {"even": "the spread around that fit is even", "uneven": "the spread around that fit is uneven"}


def _thirds(est: Estimate, names: Names, bent: bool) -> Check | None:
    """The bulging rule (Tukey 1977) on y with the covariates taken off."""
    y, x = _taken_off(est, bent), est.rows.x
    found = bulge(x, y, rng=np.random.default_rng(0) if est.n <= RESAMPLED else None)
    if found is None:
        return None
    per = f"{names.y_unit or names.y} per {names.one}"
    left, right = found.slopes
    reading = f"the slope is {show(left)} in the lower half and {show(right, per)} in the upper{_range(found)}"
    return Check(
        "thirds along x", "shape", "which way would the ladder of powers straighten it (bulging rule)?", right - left,
        per, f"{reading}: {_advice(found, names)}",
    )  # fmt: skip


def _taken_off(est: Estimate, bent: bool) -> Array:
    rows = est.rows
    if not (np.ptp(rows.base, axis=0) > 0).any():
        return rows.y
    X = np.column_stack([rows.base, rows.x])
    return (
        conditional_residuals(rows.base, rows.y, rows.x)
        if bent
        else partial_residuals(X, rows.y, focal=slice(-1, None))
    )


def _range(found: Bulge) -> str:
    if found.ratio_range is None:
        return ""
    low, high = found.ratio_range.low, found.ratio_range.high
    ends = show_interval(low, high) if np.isfinite(high) else f"{show(low)} to a turn"
    return f", ratio {show(found.ratio)} (resampled {ends})"


def _advice(found: Bulge, names: Names) -> str:
    if found.reading == "turns":
        return "it turns, so no power helps; a quadratic, a hinge or a spline may"
    if found.reading == "straight":
        return "straight enough for the ladder"
    if found.reading == "cannot tell" or found.direction == "turning":
        return "these rows cannot tell which way to go"
    powers = [
        f"{name} to the power {show(power)}"
        for name, power in ((names.y, found.power_y), (names.x, found.power_x))
        if power is not None
    ]
    way = f"{names.y} {found.move_y} the ladder or {names.x} {found.move_x} it"
    return f"{way}{f'; the thirds lie straight with {chr(32).join(powers[:1])}' if powers else ''}" + (
        f" or {powers[1]}" if len(powers) > 1 else ""
    )
