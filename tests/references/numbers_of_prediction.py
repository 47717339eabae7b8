"""Predictions in units of y, their intervals, and forms judged by them."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import numpy as np
from asked import Asked, Placed, Rule
from case_fits import Fitted
from case_forms import Form
from case_tables import NotDelivered

from batten.compare.heldout import held_out
from batten.engine.folds import Splits
from batten.errors import Refusal

__all__ = ["PLACED", "RULES"]


def _pred_error(a: Asked) -> float:
    """Standard error of the fit, from its interval."""
    return (a.predicted("high", interval="estimate") - a.predicted("low", interval="estimate")) / (2 * a.t)


def _on_scale(a: Asked, y: float) -> float:
    est = a.fitted.fit.estimate
    return float(est.scale.forward(np.array([y]), est.c)[0])


def _smearing(a: Asked) -> float:
    """What means are above the back-transformed fit: the same for every row of a logged response."""
    somewhere = replace(a, at=a.at or {a.form.focus: float(a.fitted.x[0])})
    return somewhere.predicted("estimate") / somewhere.naive()


def _lognormal(a: Asked) -> float:
    return math.exp(a.fitted.fit.sigma**2 / 2)


def _intercept(a: Asked, *, corrected: bool = False) -> float:
    value, error = a.fitted.coefficient("Intercept")
    return math.exp(value - corrected * error**2 / 2)


def _grown(f: Fitted) -> np.ndarray:
    """Back-transformed fit of every row, units of y."""
    return f.back(f.eta)


def _origin_factor(a: Asked) -> float:
    """Slope of y on exp(fit) through the origin, as batten fits it."""
    frame = a.form.frame.loc[a.fitted.fit.problem.index].assign(grown=_grown(a.fitted))
    through = Form(frame, a.form.response, "grown", intercept=False).with_key("y", "x")
    return Fitted(through).coefficient("grown")[0]


def _correlation(a: Asked) -> float:
    return float(np.corrcoef(a.fitted.y, _grown(a.fitted))[0, 1])


def _rmse(f: Fitted) -> float:
    means = f.fit.predict(f.form.frame.loc[f.fit.problem.index])["estimate"].to_numpy()
    return float(np.sqrt(np.mean((f.y - means) ** 2)))


def _bias(f: Fitted) -> float:
    return float(np.mean(_grown(f) - f.y))


def _aic(f: Fitted) -> float:
    """In units of y; sigma counts."""
    return -2 * f.fit.log_likelihood + 2 * f.fit.parameters


def _leave_one_out(f: Fitted) -> float:
    """Root mean square error in units of y, every row alone left out and everything refitted.

    Not by `examine`'s own folds, which keep identical rows together.
    """
    if re.fullmatch(r"spline\d x", f.form.right):  # publications hold the knots of all rows
        f = Fitted(replace(f.form, right=f"spline({', '.join(repr(k) for k in f.fit.estimate.state)}) x"))
    score = held_out([f.fit.estimate], Splits(np.arange(f.fit.rows)[None], f.fit.rows))[0]
    if isinstance(score, Refusal):
        raise NotDelivered(score.wrong)
    return score.rmse


RULES: dict[str, Rule] = {
    "pred": lambda a, _: a.predicted("estimate"),
    "pred_se": lambda a, _: _pred_error(a),
    "mean_ci_lo": lambda a, _: a.predicted("low", interval="estimate"),
    "mean_ci_hi": lambda a, _: a.predicted("high", interval="estimate"),
    "pi_lo": lambda a, _: _on_scale(a, a.predicted("low", interval="new row")),
    "pi_hi": lambda a, _: _on_scale(a, a.predicted("high", interval="new row")),
    "pi_lo_y": lambda a, _: a.predicted("low", interval="new row"),
    "pi_hi_y": lambda a, _: a.predicted("high", interval="new row"),
    "log_pred": lambda a, _: a.fitted.linear(a.at)[0],
    "naive_pred": lambda a, _: a.naive(),
    "median_pred": lambda a, _: a.naive(),
    "smearing": lambda a, _: _smearing(a),
    "smearing_pred": lambda a, _: a.predicted("estimate"),
    "mean_pred_smearing": lambda a, _: a.predicted("estimate"),
    "lognormal_factor": lambda a, _: _lognormal(a),
    "lognormal_pred": lambda a, _: _lognormal(a) * a.naive(),
    "origin_factor": lambda a, _: _origin_factor(a),
    "origin_pred": lambda a, _: _origin_factor(a) * a.naive(),
    "exp_intercept": lambda a, _: _intercept(a),
    "n0_naive": lambda a, _: _intercept(a),
    "n0_bias_corrected": lambda a, _: _intercept(a, corrected=True),
    "corr_y_mhat": lambda a, _: _correlation(a),
    "r2_level_corr2": lambda a, _: _correlation(a) ** 2,
    "r2_corr2": lambda a, _: _correlation(a) ** 2,
    "rmse_original": lambda a, name: _rmse(a.named(name)),
    "bias_naive": lambda a, name: _bias(a.named(name)),
    "aic_y_scale": lambda a, name: _aic(a.named(name)),
    "loocv_rmse": lambda a, name: _leave_one_out(a.named(name)),
    "loocv_mse": lambda a, d: _leave_one_out(a.other("y", "x" if d == "1" else f"poly{d} x")) ** 2,
}

PLACED: tuple[Placed, ...] = (
    (r"smearing_pred_at_(-?[\d.]+)", lambda a, at: a.predicted("estimate", at=at)),
    (r"naive_pred_at_(-?[\d.]+)", lambda a, at: a.naive(at)),
    (r"fitted_at:(-?[\d.]+)", lambda a, at: a.predicted("estimate", at=at)),
    (r"pred_log_at_(-?[\d.]+)", lambda a, at: a.fitted.linear({**a.at, a.form.focus: float(at)})[0]),
)
