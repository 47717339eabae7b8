"""Cases without data: knots, bases, orthogonal polynomials, smearing and readings by hand."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from fractions import Fraction
from typing import Any

import numpy as np
import pandas as pd
from case_fits import Fitted
from case_forms import Form
from case_tables import NotDelivered

from batten.engine.linear import factor
from batten.families import parse
from batten.families.base import Scale
from batten.families.shapes.polynomial import Polynomial
from batten.families.shapes.spline import QUANTILES, Spline
from batten.fit.smear import mean_factor, mean_of

__all__ = ["arithmetic"]

Case = Mapping[str, Any]


def arithmetic(case: Case) -> dict[str, float]:
    """The keys of a case that has no data."""
    for start, rule in _RULES.items():
        if case["id"].startswith(start):
            return rule(case)
    raise NotDelivered("no rule for a case without data of this kind")


def _knots(case: Case) -> dict[str, float]:
    """Quantiles at which knots stand."""
    count = sum(key.startswith("q") for key in case["exact"])
    return {f"q{i}": q for i, q in enumerate(QUANTILES[count], start=1)}


def _spline_basis(case: Case) -> dict[str, float]:
    """Columns of the spline at single places."""
    knots = tuple(float(v) for v in re.findall(r"-?[\d.]+", case["source"].split("knots")[1]))
    shape, out = Spline(knots), {}
    for key in case["exact"]:
        column, at = re.fullmatch(r"b(\d+)_at_(-?[\d.]+)", key).groups()  # type: ignore[union-attr]
        out[key] = float(shape.columns(np.array([float(at)]), knots)[0, int(column) - 1])
    return out


def _orthogonal(case: Case) -> dict[str, float]:
    """Orthogonal polynomials on equal steps, in the smallest whole numbers and rising at the upper end."""
    levels = np.arange(1.0, 1 + sum(key.startswith("d1_") for key in case["exact"]))
    degree = sum(key.startswith("ss") for key in case["exact"])
    shape = Polynomial(max(degree, 2))
    columns = np.column_stack([np.ones_like(levels), shape.columns(levels, (float(levels.mean()),))])
    out: dict[str, float] = {}
    for k in range(1, degree + 1):
        whole = _whole_numbers(factor(columns).q[:, k])
        out |= {f"d{k}_{i}": float(v) for i, v in enumerate(whole, start=1)}
        out[f"ss{k}"] = float((whole**2).sum())
    return out


def _whole_numbers(column: np.ndarray) -> np.ndarray:
    """The smallest whole numbers in the same proportion, the last one positive."""
    share = column / column[-1]
    parts = [Fraction(float(v)).limit_denominator(1000) for v in share]
    times = int(np.lcm.reduce([p.denominator for p in parts]))
    np.testing.assert_allclose([float(p) for p in parts], share, atol=1e-9)
    whole = np.array([float(p * times) for p in parts])
    return np.asarray(whole / np.gcd.reduce(whole.astype(int)))


def _smearing(case: Case) -> dict[str, float]:
    """Means over the given residuals of the back-transformed fit plus residual."""
    given = case["given"]
    e, eta = np.array(given["residuals"])[None], np.array([[float(given["fit"])]])
    spread = float((e**2).sum()) / (e.size - given["p"])

    def mean(key: str, constants: tuple[float, ...] = ()) -> float:
        scale = parse(f"{key} ~ x").left
        assert isinstance(scale, Scale)
        return float(mean_of(scale, [constants or scale.learn(np.array([1.0, 2.0]))], eta, e)[0, 0])

    return {
        "log:smearing_factor": float(mean_factor(e)[0]),
        "log:naive": float(np.exp(eta[0, 0])),
        "log:smearing_pred": mean("log y"),
        "log:lognormal_factor": float(np.exp(spread / 2)),
        "sqrt:smearing_pred": mean("sqrt y"),
        "reciprocal:smearing_pred": mean("1/y"),
        "log10:smearing_factor": float(mean_factor(np.log(10) * e)[0]),
        "power_quarter:smearing_pred": mean("boxcox(0.25) y", (0.25,)),
    }


def _effects(case: Case) -> dict[str, float]:
    """Readings of given coefficients: batten fits rows that hold them exactly, and is asked."""
    g = case["given"]
    x = np.arange(1.0, 9.0)

    def fit(y: np.ndarray, key: str) -> Any:
        left, right = key.split(" ~ ")
        return Fitted(Form(pd.DataFrame({"x": x, "y": y}), "y", "x").with_key(left, right)).fit

    def ratio(found: Any, low: float, high: float) -> float:
        return float(found.contrast(low, high).loc["ratio", "estimate"])

    def difference(found: Any, factor: float) -> float:
        return float(found.contrast(3.0, 3.0 * factor).loc["difference", "estimate"])

    log_y, log10_y = fit(np.exp(g["b"] * x), "log y ~ x"), fit(10 ** (g["b_log10y"] * x), "log y ~ x")
    both, log_x = fit(x ** g["elasticity"], "log y ~ log x"), fit(g["b"] * np.log(x), "y ~ log x")
    curve = fit(g["quad_b1"] * x + g["quad_b2"] * x**2, "y ~ poly2 x")
    return {
        "logy:pct_exact": 100 * (ratio(log_y, 3, 4) - 1),
        "logy:pct_exact_decrease": 100 * (1 / ratio(log_y, 3, 4) - 1),
        "logy:ratio": ratio(log_y, 3, 4),
        "log10y:pct_exact": 100 * (ratio(log10_y, 3, 4) - 1),
        **{f"loglog:pct_for_{n}": 100 * (ratio(both, 3, 3 * k) - 1) for n, k in _TIMES.items()},
        **{f"logx:y_change_for_{n}": difference(log_x, k) for n, k in _TIMES.items()},
        "quad:slope_at_x": float(curve.slope(g["x"])["estimate"].iloc[0]),
        "quad:turning_point": curve.turning_point().estimate,
    }


_TIMES = {"1pct": 1.01, "10pct": 1.1, "doubling": 2.0}
_RULES: dict[str, Callable[[Case], dict[str, float]]] = {
    "harrell-knots": _knots,
    "rcs-basis": _spline_basis,
    "orthopoly": _orthogonal,
    "duan-smearing": _smearing,
    "effect-arithmetic": _effects,
}
