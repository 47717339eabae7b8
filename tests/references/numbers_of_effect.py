"""Readings of coefficients, slopes, turning points, breaks."""

from __future__ import annotations

import math

import numpy as np
from asked import Asked, Placed, Rule
from case_tables import NotDelivered

from batten.effects.turn import Turn

__all__ = ["ABOUT_X", "PLACED", "RULES"]


def _log_units(a: Asked, term: str) -> float:
    """A coefficient in natural logs of y."""
    return a.fitted.coefficient(term or a.form.focus)[0] / (a.form.percent or a.form.factor)


def _ratio(a: Asked, term: str) -> float:
    """exp(b): for the focal predictor, the ratio of means one unit apart."""
    if term in ("", a.form.focus) and a.form.percent is None and a.form.key == "log y ~ x":
        low = float(a.fitted.x.mean())
        return float(a.fitted.fit.contrast(low, low + 1)["estimate"]["ratio"])
    return math.exp(_log_units(a, term))


def _times(a: Asked, factor: float, effect: str) -> float:
    """Rows with `factor` times as much x against rows with x, as `effect` of the mean."""
    low = float(np.median(a.fitted.x[a.fitted.x > 0]))
    return float(a.fitted.fit.contrast(low, factor * low)["estimate"][effect])


def _relative(a: Asked, factor: float) -> float:
    return 100 * (_times(a, factor, "ratio") - 1)


def _ends(a: Asked, side: int) -> float:
    """Interval on the fitting scale: of the fit at the given row, or of the focal coefficient without one."""
    if not a.at and len(a.form.terms) != 1:
        raise NotDelivered("the focal predictor has several coefficients")
    value, error = a.fitted.linear(a.at) if a.at else a.fitted.coefficient(next(iter(a.form.terms)))
    return value + side * a.t * error


def _turn(a: Asked) -> Turn:
    return a.fitted.fit.turning_point()


def _end(a: Asked, side: int) -> float:
    if not _bounded(a):
        raise NotDelivered("the set of turning points has no two ends")
    return _turn(a).pieces[0][side]


def _bounded(a: Asked) -> bool:
    pieces = _turn(a).pieces
    return len(pieces) == 1 and bool(np.isfinite(pieces[0]).all())


def _slope(a: Asked, at: float | None) -> float:
    if at is None:
        raise NotDelivered("no place is given")
    return float(a.fitted.fit.slope(at)["estimate"].iloc[0])


def _slope_percent(a: Asked, at: str) -> float:
    """Slope of log y in percent: that of the mean over the mean, which a contrast of two places gives."""
    low, high = float(at), float(a.fitted.x.max())
    found = a.fitted.fit.contrast(low, high)["estimate"]
    return float(100 * _slope(a, low) * (found["ratio"] - 1) / found["difference"])


def _break(a: Asked) -> float:
    table = a.fitted.fit.constants
    places = [name for name in table.index if name.startswith("break")]
    if not places:
        raise NotDelivered(f"{a.form.key} has no break")
    return float(table["estimate"][places[0]])


def _break_error(a: Asked) -> float:
    found = a.fitted.fit.coefficients["std_error"]
    return float(found[[label for label in found.index if label.startswith("break")]].iloc[0])


def _piece(a: Asked, *, last: bool) -> float:
    """Slope left of the first break or right of the last one."""
    x = a.fitted.x
    return _slope(a, float(x.max() if last else x.min()))


RULES: dict[str, Rule] = {
    "pct_approx": lambda a, t: 100 * _log_units(a, t),
    "pct_exact": lambda a, t: 100 * (_ratio(a, t) - 1),
    "pct_exact_decrease": lambda a, t: 100 * (1 - 1 / _ratio(a, t)),
    "ratio_per_unit": _ratio,
    "pct_y_for_1pct_x": lambda a, _: _relative(a, 1.01),
    "pct_y_for_10pct_x": lambda a, _: _relative(a, 1.1),
    "pct_y_for_doubling_x": lambda a, _: _relative(a, 2),
    "y_change_for_1pct_x": lambda a, _: _times(a, 1.01, "difference"),
    "y_change_for_10pct_x": lambda a, _: _times(a, 1.1, "difference"),
    "y_change_for_doubling": lambda a, _: _times(a, 2, "difference"),
    "y_change_for_doubling_x": lambda a, _: _times(a, 2, "difference"),
    "ci_lo": lambda a, _: _ends(a, -1),
    "ci_hi": lambda a, _: _ends(a, 1),
    "doubling_ci_lo": lambda a, _: 100 * (2 ** _ends(a, -1) - 1),
    "doubling_ci_hi": lambda a, _: 100 * (2 ** _ends(a, 1) - 1),
    "slope_at_x": lambda a, _: _slope(a, a.x),
    "turning_point": lambda a, _: _turn(a).estimate,
    "fieller_lo": lambda a, _: _end(a, 0),
    "fieller_hi": lambda a, _: _end(a, 1),
    "fieller_bounded": lambda a, _: _bounded(a),
    "delta_se_turning": lambda a, _: _turn(a).std_error,
    "n_below_turning": lambda a, _: (a.fitted.x <= _turn(a).estimate).sum(),
    "breakpoint": lambda a, _: _break(a),
    "se_breakpoint": lambda a, _: _break_error(a),
    "value_at_break": lambda a, _: a.predicted("estimate", at=repr(_break(a))),
    "slope_left": lambda a, _: _piece(a, last=False),
    "slope_right": lambda a, _: _piece(a, last=True),
    "slope_above": lambda a, _: _piece(a, last=True),
}

#: what is asked about a predictor as a whole, not about one term of it
_WHOLE = ("turning", "fieller", "delta", "n_below", "pct_y", "y_change", "slope_at")
ABOUT_X = tuple(name for name in RULES if name.startswith(_WHOLE))

PLACED: tuple[Placed, ...] = (
    (r"diff_(-?[\d.]+)_(-?[\d.]+)", lambda a, low, high: a.fitted.fit.contrast(float(low), float(high)).iloc[0, 0]),
    (r"slope_pct_at_(-?[\d.]+)", _slope_percent),
    (r"slope_at_(-?[\d.]+)", lambda a, at: _slope(a, float(at))),
)
