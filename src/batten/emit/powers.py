"""A searched power of the response in a script: its uncertainty counts, so every row is left out of it too."""

from __future__ import annotations

import re

from batten.emit.parts import Parts
from batten.emit.text import docstring

__all__ = ["difference_by_power", "power_functions", "power_moves"]


def power_functions(parts: Parts) -> list[list[str]]:
    """The scale's own functions with the power as an argument, and held()."""
    blocks = re.split(r"\n{2,}(?=def )", parts.left.helper.strip())
    own = [re.sub(r"^def (\w+)\((\w)\):", r"def \1(\2, LAMBDA=LAMBDA):", block) for block in blocks]
    text = "Place and stretch of power v at the median m of y; in these units coefficients hardly move with v."
    place = _forward(parts, "m") if parts.covariates.intercept else "0.0"
    held = ["def held(v):", *docstring(text), f"    return {place}, np.exp((v - LAMBDA) * {_drift(parts, 'm')})"]
    return [*(block.replace("def unbent(", "def undo(").splitlines() for block in own), held]


def _forward(parts: Parts, y: str) -> str:
    """Source of the scale with power v."""
    source = parts.left.columns[0][1]
    return f"bent({y}, v)" if source == "bent(y)" else re.sub(r"\by\b", y, source).replace("LAMBDA", "v")


def _drift(parts: Parts, y: str) -> str:
    """Source of the slope in LAMBDA of the log of the scale's own slope at y."""
    return f"np.log({y})" if parts.est.remedy.left.family == "boxcox" else f"np.sign({y}) * np.log1p(np.abs({y}))"


def power_moves(parts: Parts) -> list[str]:
    """b and without, LAMBDA last: a Newton step of the full likelihood, sigma included, leaves out each row.

    The step in LAMBDA is the row's score with coefficients and variance swept out, over the information left; the
    coefficients follow by `pull`. Slopes are taken in the units of held(), where coefficients stand almost still.
    """
    held = " - z1[-1] - g * (z - e - held(LAMBDA)[0])" if parts.covariates.intercept else " - g * (z - e)"
    return [
        "# LAMBDA was estimated too: a Newton step of the whole likelihood (Box and Cox 1964) leaves out each row",
        f"m, var, g = np.median(y), e @ e / len(e), {_drift(parts, 'np.median(y)')}",
        f"five = np.array([{_forward(parts, 'np.append(y, m)')} for v in LAMBDA + 1e-3 * np.arange(-2, 3)])",
        "z1, z2 = [1, -8, 0, 8, -1] @ five / 12e-3, [-1, 16, -30, 16, -1] @ five / 12e-6  # slopes of z in LAMBDA",
        f"w = z1[:-1]{held}",
        "pull = np.linalg.solve(R, Q.T @ w)",
        "own, k = w - X @ pull, e @ w / var / len(e)",
        f"score = {_drift(parts, 'y')} - e * own / var + k * (e * e / var - 1)",
        "power = LAMBDA - score / ((own @ own + e @ z2[:-1]) / var - 2 * len(e) * k**2) / (1 - h)",
        "without = b - np.linalg.solve(R, Q.T * out).T - np.outer(LAMBDA - power, pull)",
        "b, without, slope = np.append(b, LAMBDA), np.column_stack([without, power]), w - g * e",
    ]


def difference_by_power(keep: str) -> list[str]:
    """Body of difference(b, keep): each replicate goes back by its own power."""
    return [
        "    at, by = held(b[-1])",
        "    e = by * (z + (b[-1] - LAMBDA) * slope - X @ b[:-1])[keep]",
        f"    low, high = (at + by * ((N @ b[:-1]){keep} - held(LAMBDA)[0]) for N in (A, B))",
        "    return (mean(high, e, b[-1]) - mean(low, e, b[-1])).mean()",
    ]
