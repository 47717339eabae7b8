"""Powers that are searched for: of y, of x, fractional polynomials; and knots."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from asked import Asked, Placed, Rule
from case_fits import Fitted
from case_forms import Form
from case_tables import NotDelivered
from numbers_of_fit import gaussian_deviance

from batten.engine.power import profile_likelihood
from batten.fit.searched import scale_power

__all__ = ["PLACED", "RULES"]


def _power_form(a: Asked) -> Form:
    """Predictors that a power of y is sought for: as they stand, but untransformed where both sides were logged."""
    form = a.form.plain if a.form.key == "log y ~ log x" else a.form
    return replace(form, left="boxcox y", factor=1.0, shift=0.0)


def _power_of_y(a: Asked, column: str) -> float:
    fit = Fitted(_power_form(a), a.fitted.level).fit
    return float(fit.constants[column][f"power of {fit.problem.response}"])


def _scaled_rss(a: Asked, power: str) -> float:
    """Residual sum of squares of the power transform scaled by the geometric mean (Box and Cox 1964).

    From the profile likelihood, for a power whose fitted values have no way back to y cannot be asked for as a remedy.
    """
    f = Fitted(_power_form(a))
    est = f.fit.estimate
    likelihood = profile_likelihood(scale_power(est.scale, est.rows), f.y, est.factored.q, float(power))
    return f.fit.rows * math.exp(-2 * likelihood / f.fit.rows - 1) / (2 * math.pi)


def _constant(f: Fitted, start: str) -> float:
    """The first learned constant whose name begins so."""
    table = f.fit.constants
    found = [name for name in table.index if name.startswith(start)]
    if not found:
        raise NotDelivered(f"{f.form.key} learns no {start}")
    return float(table["estimate"][found[0]])


def _box_tidwell(a: Asked, steps: int) -> float:
    """Power of x after 1 or 2 steps of Box and Tidwell (1962), each from two straight lines."""
    form, power = a.form.plain, 1.0
    for _ in range(steps):
        x = form.frame[form.focus] ** power
        line = replace(form, frame=form.frame.assign(moved=x, moved_log=x * np.log(x)), focus="moved")
        wide = replace(line, covariates=(*line.covariates, "moved_log")).with_key("y", "x")
        straight = line.with_key("y", "x")
        power *= 1 + Fitted(wide).coefficient("moved_log")[0] / Fitted(straight).coefficient("moved")[0]
    return power


def _fractional(a: Asked, degree: str, what: str) -> float:
    f = a.other(a.form.left, f"fp{degree} x")
    names = {"power": "power of", "p1": "first power", "p2": "second power"}
    if what in names:
        return _constant(f, names[what])
    return f.rss if what == "rss" else gaussian_deviance(f)


def _versus(a: Asked, one: str, two: str) -> float:
    """Deviance that the first form gains over the second."""
    keys = {"linear": "x", "fp1": "fp1 x", "fp2": "fp2 x"}
    low, high = (gaussian_deviance(a.other(a.form.left, keys[name])) for name in (one, two))
    return high - low


RULES: dict[str, Rule] = {
    "boxcox_lambda": lambda a, _: _power_of_y(a, "estimate"),
    "boxcox_ci_lo": lambda a, _: _power_of_y(a, "low"),
    "boxcox_ci_hi": lambda a, _: _power_of_y(a, "high"),
    "sse": _scaled_rss,
    "box_tidwell_1": lambda a, _: _box_tidwell(a, 1),
    "box_tidwell_2": lambda a, _: _box_tidwell(a, 2),
    "best_power_x": lambda a, _: _constant(a.other(a.form.left, "x^p"), "power of"),
}

PLACED: tuple[Placed, ...] = (
    (r"knot(\d+)", lambda a, i: _constant(a.fitted, f"knot {i}")),
    (r"fp([12])_(power|p1|p2|rss|deviance)", _fractional),
    (r"(fp2|fp1)_vs_(fp1|linear)", _versus),
)
