"""Which rows does the answer hang on, and do rows stand for themselves? Neighbours, support, single rows."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from batten.diagnose.dependence import neighbouring_residuals
from batten.diagnose.influence import gaps_without
from batten.diagnose.tests_of_shape import add_on
from batten.effects.check import Check, Tested, Working, added, chance
from batten.effects.checks_of_shape import bending_columns
from batten.effects.contrast import reach_trouble, same_group
from batten.effects.numbers import place, show
from batten.effects.support import support
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.fit.carried import carried, no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means

__all__ = ["checks_of_rows"]

#: rows up to which each is left out of the bend in turn
LEFT_OUT = 2_000


def checks_of_rows(
    est: Estimate,
    work: Working,
    names: Names,
    *,
    span: tuple[float, float],
    labels: tuple[str, ...],
    unnamed: tuple[str, ...],
) -> Iterator[Check | None]:
    yield _neighbours(work)
    yield _supported(est, names, span)
    yield _curved_covariate(est, work, names, labels)
    yield _loudest(est, names, span)
    yield _of_bend(est, work, names)
    yield from _of_constants(est, names, unnamed)
    yield _leverage(est)
    yield _correction(est)


def _neighbours(work: Working) -> Check | None:
    found = neighbouring_residuals(work.q, work.z)
    if found is None:
        return None
    reading = f"errors of neighbours correlate by {show(found.correlation)}, {chance(found.p)}"
    asked = "do rows stored beside each other err alike (Durbin-Watson)?"
    test = Tested("Durbin-Watson d", found.statistic, (), found.p)
    return Check("neighbouring rows", "rows", asked, found.correlation, "correlation", reading, test)


def _supported(est: Estimate, names: Names, span: tuple[float, float]) -> Check | None:
    if not names.covariates:
        return None
    found = support(est.rows, span)
    ends = [f"{show(100 * share, '%')} at {place(end, names.x_unit)}"
            for share, end in zip((found.missing_a, found.missing_b), span, strict=True)]  # fmt: skip
    near = show(found.distance, names.x_unit)
    reading = f"no rows of the same kind within {near}: {' and '.join(ends)}"
    asked = "are there rows with these covariates at both ends of the span?"
    return Check("support", "rows", asked, 100 * found.missing, "%", reading)


def _curved_covariate(est: Estimate, work: Working, names: Names, labels: tuple[str, ...]) -> Check | None:
    """The covariate whose bend along x is worth most: partial residuals would show it as a bend of y (Cook 1993)."""
    x, base = est.rows.x, est.rows.base
    away = (x - x.mean()) / (x.std() or 1.0)
    line, kept = np.column_stack([np.ones_like(x), away]), np.ptp(base, axis=0) > 0
    if est.shape.own_level or not kept.any() or not labels:
        return None
    tried = []
    for j in np.flatnonzero(kept):
        found = add_on(line, away[:, None] ** 2, base[:, j])
        if found is not None:
            tried.append((abs(float(est.coef[j])) * found.gap_max * work.lean, int(j), found))
    if not tried:
        return None
    size, which, found = max(tried, key=lambda one: one[0])
    reading = (
        f"{labels[which]} follows {names.x} along a bend worth up to {show(size, names.y_unit)}, {chance(found.p)}; "
        "where it is more, a plot of partial residuals bends falsely"
    )
    asked = f"does a covariate bend along {names.x}?"
    test = Tested("F", found.statistic, found.df, found.p)
    return Check("bent covariate", "rows", asked, size, names.y_unit, reading, test)


def _loudest(est: Estimate, names: Names, span: tuple[float, float]) -> Check | None:
    """The row that moves the span difference most when it is left out."""
    moved, difference = _left_out(est, span)
    if moved is None:
        return None
    row = int(np.argmax(np.abs(moved)))
    without = show(difference + float(moved[row]), names.y_unit)
    who = "{row}" if est.clusters is None else "{row} and its cluster"
    reading = f"without row {who} the difference over the span would be {without}, not {show(difference)}"
    asked = "which row moves the difference over the span most?"
    return Check("loudest row", "rows", asked, float(moved[row]), names.y_unit, reading, row=row)


def _left_out(est: Estimate, span: tuple[float, float]) -> tuple[Array | None, float]:
    """Change of the span difference without each row (n,), or without its cluster; and the difference itself."""
    if same_group(est, *span) or reach_trouble(est, np.array(span)):
        return None, math.nan
    ends = averaged_means(est, np.array(span), errors="robust")
    difference = float(ends.value[1] - ends.value[0])
    if ends.left_out is not None:
        moved = (ends.left_out[:, 1] - ends.left_out[:, 0]) - difference
    else:  # to first order: a row's influence with its sign turned
        moved = -(ends.by_row[:, 1] - ends.by_row[:, 0])
    return moved if est.clusters is None else moved[est.clusters.code], difference


def _of_bend(est: Estimate, work: Working, names: Names) -> Check | None:
    """The row without which the left-over bend would differ most."""
    extra = bending_columns(est) if est.n <= LEFT_OUT and est.clusters is None else None
    if extra is None:
        return None
    columns = extra * work.root[:, None]
    found = added(work, extra, errors="constant")
    without = gaps_without(work.q, columns, work.z)
    if found is None or not np.isfinite(without).any():
        return None
    row = int(np.nanargmax(np.abs(without - found.gap_max)))
    now, then = found.gap_max * work.lean, float(without[row]) * work.lean
    reading = f"without row {{row}} the left-over bend would be up to {show(then, names.y_unit)}, not {show(now)}"
    asked = "which row makes most of the left-over bend, or hides it?"
    return Check("loudest row: left-over bend", "rows", asked, then - now, names.y_unit, reading, row=row)


def _of_constants(est: Estimate, names: Names, unnamed: tuple[str, ...]) -> Iterator[Check]:
    """The row that moves each searched constant most; none for constants that the data do not settle."""
    words = list(est.shape.constant_words(names.x, names.y)[: est.moving])
    value = list(est.theta[: est.moving])
    if est.remedy.left.searched and est.link is None:
        words.append(f"power of {names.y}")
        value.append(est.c[0])
    if not words:
        return
    moved = est.row_moves()[:, len(est.coef) :]
    for k, word in enumerate(words):
        if word in unnamed:
            continue
        row = int(np.argmax(np.abs(moved[:, k])))
        without = show(value[k] + float(moved[row, k]))
        who = "{row}" if est.clusters is None else "{row} and its cluster"
        reading = f"without row {who} the {word} would be about {without}, not {show(value[k])}"
        yield Check(f"loudest row: {word}", "rows", f"which row moves the {word} most?", float(moved[row, k]), "",
                    reading, row=row)  # fmt: skip


def _leverage(est: Estimate) -> Check:
    row = int(np.argmax(est.leverage))
    h = float(est.leverage[row])
    reading = f"row {{row}} has leverage {show(h)}; the average is {show(float(est.leverage.mean()))}"
    return Check("leverage", "rows", "which row lies farthest out?", h, "share of its own fit", reading, row=row)


def _correction(est: Estimate) -> Check | None:
    """Whether one row supplies too much of the average that brings means back to units of y."""
    found = carried(est)
    if found is None:
        return None
    row, share = found[0], 100 * found[1]
    words = "so no interval is given for a mean" if no_mean_interval(est) else "no row carries it alone"
    reading = f"row {{row}} supplies {show(share, '%')} of the average that corrects means; {words}"
    return Check("correction back to y", "rows", "does one row carry the corrected mean?", share, "%", reading, row=row)
