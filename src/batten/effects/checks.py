"""What can be checked about one fit: left-over shape, spread, dependence, kinks, and the rows it leans on.

Each check has a size a reader can weigh, beside p. Tests are made on the fit's own scale (weighted for links), robust
where the question's errors are; sizes are brought back to units of y at the middle of the fitted values.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.special import ndtri
from scipy.stats import t as student

from batten.diagnose.bend import knots_for
from batten.diagnose.dependence import neighbouring_residuals
from batten.diagnose.searched_places import candidate_places, davies, hinge_columns, place_t, searched_cut_p
from batten.diagnose.tests_of_shape import AddOn, add_on, add_on_robust, pure_error
from batten.diagnose.tests_of_spread import fitted_spread, koenker
from batten.effects.contrast import reach_trouble, same_group
from batten.effects.numbers import about, place, show
from batten.effects.support import support
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.families.shapes.hinge import Hinge
from batten.families.shapes.spline import Spline
from batten.fit.carried import carried, no_mean_interval
from batten.fit.estimate import Estimate
from batten.fit.means import averaged_means

__all__ = ["Check", "checks"]

#: below this p, a difference is called more than chance
CHANCE = 0.05


@dataclass(frozen=True)
class Check:
    """name, what was asked, size in `unit`, p (NaN where there is no test), reading in words.

    row: position of the row the reading is about; "{row}" in the reading stands for its label.
    """

    name: str
    asked: str
    size: float
    unit: str
    p: float
    reading: str
    row: int | None = None


@dataclass(frozen=True, eq=False)
class _Working:
    """The fit as weighted least squares: design basis q (n, k), residuals z (n,), row weights' roots (n,), and what
    one unit of z is in y.
    """

    q: Array
    z: Array
    root: Array
    lean: float


def checks(
    est: Estimate,
    names: Names,
    span: tuple[float, float],
    *,
    errors: str = "robust",
) -> tuple[Check, ...]:
    """All checks that can be made on this fit; one that cannot is left out."""
    work = _working(est)
    found = [
        _bend(est, work, names, errors),
        _reset(est, work, names, errors),
        _repeats(est, work, names),
        _same_shape(est, work, names, errors),
        _searched(est, names),
        _spread(est, work, names),
        _neighbours(work),
        _supported(est, names, span),
        *_rows(est, names, span),
        _correction(est),
    ]
    return tuple(check for check in found if check is not None)


def _working(est: Estimate) -> _Working:
    q = est.factored.q
    if est.link is None:
        lean = 1.0
        if est.scale.closed != "identity":
            slope = np.abs(est.scale.inverse_slope(est.eta, est.c))
            lean = float(np.median(slope[np.isfinite(slope)]))
        return _Working(q, est.residual, np.ones(est.n), lean)
    spread = np.sqrt(est.link.variance(est.mu))
    return _Working(q, est.residual / spread, est.link.mean_slope(est.eta) / spread, float(np.median(spread)))


def _added(work: _Working, extra: Array, errors: str) -> AddOn | None:
    test = add_on_robust if errors == "robust" else add_on
    return test(work.q, extra * work.root[:, None], work.z)


def _chance(p: float) -> str:
    return "more than chance would give" if p < CHANCE else "no more than chance would give"


def _added_check(name: str, asked: str, found: AddOn | None, work: _Working, names: Names) -> Check | None:
    if found is None:
        return None
    size = found.gap_max * work.lean
    reading = f"the two fits differ by up to {show(size, names.y_unit)}, {_chance(found.p)}"
    return Check(name, asked, size, names.y_unit, found.p, reading)


def _bend(est: Estimate, work: _Working, names: Names, errors: str) -> Check | None:
    """Bending columns of a spline whose knots the number of rows fixes, added to the remedy."""
    spline = Spline(knots_for(est.n))
    if spline.refuse(est.rows.x):
        return None
    columns = spline.columns(est.rows.x, spline.learn(est.rows.x))[:, 1:]
    extra = (columns[:, None, :] * est.rows.modifier[:, :, None]).reshape(est.n, -1)
    asked = f"does a spline in {names.x}, added to this remedy, find more bend?"
    return _added_check("left-over bend", asked, _added(work, extra, errors), work, names)


def _reset(est: Estimate, work: _Working, names: Names, errors: str) -> Check | None:
    """Squares and cubes of the fit (Ramsey 1969)."""
    away = est.eta - est.eta.mean()
    size = float(np.std(est.eta))
    if size <= 1e-10 * float(np.abs(est.eta).max()):
        return None
    extra = np.column_stack([(away / size) ** 2, (away / size) ** 3])
    asked = "do the square and the cube of the fit add anything (RESET)?"
    return _added_check("powers of the fit", asked, _added(work, extra, errors), work, names)


def _repeats(est: Estimate, work: _Working, names: Names) -> Check | None:
    """Lack of fit against the spread of rows that repeat in all predictors; plain constants only."""
    if est.link is not None or est.moving:
        return None
    found = pure_error(est.design_at(est.rows.x, est.rows.base, est.rows.modifier), est.z)
    if found is None:
        return None
    size = found.gap_rms * work.lean
    within = show(found.sd * work.lean, names.y_unit)
    reading = (
        f"means of repeated rows lie {show(size, names.y_unit)} from the fit, {_chance(found.p)}; "
        f"repeats spread by {within}"
    )
    return Check(
        "repeated rows", "do rows with equal predictors average to the fit?", size, names.y_unit, found.p, reading
    )


def _same_shape(est: Estimate, work: _Working, names: Names, errors: str) -> Check | None:
    """Whether the interaction's columns are needed: the fit without them, and what they add."""
    m = est.rows.modifier.shape[1]
    constant = [j for j in range(m) if (est.rows.modifier[:, j] == 1).all()]
    if m < 2 or not constant or est.moving:
        return None
    columns = est.shape.columns(est.rows.x, est.state, est.theta)
    k = columns.shape[1]
    first = len(est.coef) - m * k
    whole = est.design_at(est.rows.x, est.rows.base, est.rows.modifier) * work.root[:, None]
    plain = [j for j in range(len(est.coef)) if j < first or (j - first) // k in constant]
    crossed = [j for j in range(len(est.coef)) if j not in plain]
    # the response of the weighted fit, up to what the whole design explains
    z = work.z + whole @ est.coef
    test = add_on_robust if errors == "robust" else add_on
    found = test(whole[:, plain], whole[:, crossed], z)
    asked = f"is the shape along {names.x} the same in every group?"
    return _added_check("same shape in every group", asked, found, work, names)


def _searched(est: Estimate, names: Names) -> Check | None:
    """A kink or a cut found by looking, with a p that pays for the search."""
    if est.link is not None or not est.theta or est.rows.modifier.shape[1] > 1 or est.remedy.left.searched:
        return None
    rows = est.rows
    if isinstance(est.shape, Hinge):
        line = np.column_stack([rows.base, rows.x])
        places = candidate_places(rows.x)
        t, df = place_t(line, hinge_columns(rows.x, places), est.z)
        found = davies(t, df=df)
        if found is None:
            return None
        size = float(np.abs(est.coef[-1])) * _working(est).lean
        per = f"{names.y_unit or names.y} per {names.one}"
        reading = f"the slope changes by {show(size, per)} at the break, {_chance(found.p)} (searched places counted)"
        return Check("kink", "is there a kink anywhere (Davies)?", size, per, found.p, reading)
    if est.shape.steps and est.shape.finite:
        step = np.asarray(rows.x >= est.theta[0], dtype=float)[:, None]
        t, df = place_t(rows.base, step, est.z)
        # by the smaller tail, for the larger loses its digits
        score = -float(ndtri(max(float(student.sf(abs(t[0]), df)), 1e-300)))
        p = searched_cut_p(score)
        size = abs(float(est.coef[-1])) * _working(est).lean
        reading = f"the step is {show(size, names.y_unit)}, {_chance(p)} (searched places counted)"
        return Check("cut", "is there a step anywhere?", size, names.y_unit, p, reading)
    return None


def _spread(est: Estimate, work: _Working, names: Names) -> Check | None:
    test, spread = koenker(work.z, est.rows.x[:, None]), fitted_spread(work.z, est.rows.x)
    if test is None or spread is None:
        return None
    at = [about(v, names.x_unit) for v in spread.at]
    scale = "" if est.link is None and est.scale.closed == "identity" else " on the fitting scale"
    reading = f"errors spread {show(spread.ratio)} times as much at {at[1]} as at {at[0]}{scale}, {_chance(test.p)}"
    asked = f"is the spread the same all along {names.x} (Koenker)?"
    return Check("spread", asked, spread.ratio, "times", test.p, reading)


def _neighbours(work: _Working) -> Check | None:
    found = neighbouring_residuals(work.q, work.z)
    if found is None:
        return None
    reading = f"errors of neighbours correlate by {show(found.correlation)}, {_chance(found.p)}"
    asked = "do rows stored beside each other err alike (Durbin-Watson)?"
    return Check("neighbouring rows", asked, found.correlation, "correlation", found.p, reading)


def _supported(est: Estimate, names: Names, span: tuple[float, float]) -> Check | None:
    if not names.covariates:
        return None
    found = support(est.rows, span)
    ends = [f"{show(100 * share, '%')} at {place(end, names.x_unit)}"
            for share, end in zip((found.missing_a, found.missing_b), span, strict=True)]  # fmt: skip
    near = show(found.distance, names.x_unit)
    reading = f"no rows of the same kind within {near}: {' and '.join(ends)}"
    asked = "are there rows with these covariates at both ends of the span?"
    return Check("support", asked, 100 * found.missing, "%", math.nan, reading)


def _rows(est: Estimate, names: Names, span: tuple[float, float]) -> list[Check]:
    """The row that moves the span difference most when it is left out, and the one with the highest leverage."""
    out = []
    moved, difference = _left_out(est, span)
    if moved is not None:
        row = int(np.argmax(np.abs(moved)))
        without = show(difference + float(moved[row]), names.y_unit)
        reading = f"without row {{row}} the difference over the span would be {without}, not {show(difference)}"
        asked = "which row moves the difference over the span most?"
        out.append(Check("loudest row", asked, float(moved[row]), names.y_unit, math.nan, reading, row))
    row = int(np.argmax(est.leverage))
    h = float(est.leverage[row])
    reading = f"row {{row}} has leverage {show(h)}; the average is {show(float(est.leverage.mean()))}"
    out.append(Check("leverage", "which row lies farthest out?", h, "share of its own fit", math.nan, reading, row))
    return out


def _left_out(est: Estimate, span: tuple[float, float]) -> tuple[Array | None, float]:
    """Change of the span difference without each row (n,), and the difference itself."""
    if same_group(est, *span) or reach_trouble(est, np.array(span)):
        return None, math.nan
    ends = averaged_means(est, np.array(span), errors="robust")
    difference = float(ends.value[1] - ends.value[0])
    if ends.left_out is not None:
        return (ends.left_out[:, 1] - ends.left_out[:, 0]) - difference, difference
    # to first order: a row's influence with its sign turned
    return -(ends.root[:, 1] - ends.root[:, 0]), difference


def _correction(est: Estimate) -> Check | None:
    """Whether one row supplies too much of the average that brings means back to units of y."""
    found = carried(est)
    if found is None:
        return None
    row, share = found[0], 100 * found[1]
    words = "so no interval is given for a mean" if no_mean_interval(est) else "no row carries it alone"
    reading = f"row {{row}} supplies {show(share, '%')} of the average that corrects means; {words}"
    return Check("correction back to y", "does one row carry the corrected mean?", share, "%", math.nan, reading, row)
