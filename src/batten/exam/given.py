"""What a fit is given, checked and named: targets and numbers asked for, rows to predict, labels of coefficients."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from batten.effects.numbers import place, show
from batten.effects.support import support
from batten.engine.rows import Array
from batten.errors import ask
from batten.errors import exam as errors
from batten.fit.estimate import Estimate
from batten.frame.problem import NewRows, Problem

__all__ = ["complete", "joined", "known", "labels_of", "number", "sparse_words", "target"]


def target(of: str) -> str:
    """ "mean" or "median"."""
    if of not in ("mean", "median"):
        raise errors.one_of("of", of, ("mean", "median"))
    return of


def number(name: str, given: Any, column: str) -> float:
    """A finite number given as `name`, a value of `column`."""
    if isinstance(given, bool) or not isinstance(given, int | float | np.number) or not math.isfinite(given):
        raise ask.not_a_number(f"{name} (a value of {column})", given)
    return float(given)


def joined(first: str, second: str) -> str:
    """Two notes as one."""
    return "; ".join(part for part in (first, second) if part)


def known(weight: Array | None, rows: NDArray[np.bool_]) -> Array | None:
    """Weights of some rows; a missing one counts as average."""
    return None if weight is None else np.where(np.isfinite(weight), weight, 1.0)[rows]


def complete(est: Estimate, new: NewRows) -> tuple[NDArray[np.bool_], list[str]]:
    """Which rows can be predicted (k,), and the notes, with words where the shape cannot take an x."""
    told = list(new.notes)
    given = np.isfinite(new.x) & np.isfinite(new.base).all(axis=1) & np.isfinite(new.modifier).all(axis=1)
    with np.errstate(all="ignore"):
        taken = np.isfinite(est.shape.columns(new.x, est.state, est.theta)).all(axis=1)
    for row in np.flatnonzero(given & ~taken):
        told[row] = joined(told[row], f"{est.shape.key} cannot be taken at {new.x[row]:.6g}")
    whole = given & taken
    if est.link is not None and whole.any():
        eta = est.design_at(new.x[whole], new.base[whole], new.modifier[whole]) @ est.coef
        for row in np.flatnonzero(whole)[~np.isfinite(est.link.mean(eta))]:
            told[row], whole[row] = joined(told[row], f"{est.link.key} has no mean there"), False
    return whole, told


def labels_of(problem: Problem, est: Estimate) -> list[str]:
    """Plain names of the coefficients, then of the shape's searched constants."""
    base = list(problem.base_names)
    if est.shape.own_level and est.rows.intercept is not None:
        del base[est.rows.intercept]
    focal = est.shape.names(problem.focus, est.state, est.theta)
    crossed = [f"{name} × {modifier}" if modifier else name for modifier in problem.modifier_names for name in focal]
    constants = est.shape.constant_words(problem.focus, problem.response)
    return [*base, *crossed, *constants[: est.moving]]


def sparse_words(problem: Problem, span: tuple[float, float]) -> str:
    """Words where more than a twentieth of the rows have none like them near an end of the span."""
    if not problem.covariates:
        return ""
    base, modifier = problem.profile or (None, None)
    found = support(problem.rows, span, base=base, modifier=modifier)
    ends, unit = zip((found.missing_a, found.missing_b), span, strict=True), problem.unit(problem.focus)
    parts = [f"{show(100 * share, '%')} at {place(end, unit)}" for share, end in ends if share > 0.05]
    return f"no rows like these near: {' and '.join(parts)}" if parts else ""
