"""A searched power of the response in a script: its uncertainty counts, so every row is left out of it too."""

from __future__ import annotations

from batten.emit.parts import Parts
from batten.emit.text import docstring, noted

__all__ = ["power_functions", "power_moves"]

_HELD = "its place and stretch at m, the median of y, as under LAMBDA"
_BACK = "Back to {y}; beyond the scale's limit 0 or infinite."


def power_functions(parts: Parts) -> list[list[str]]:
    """bent() and undo() by any power, and the likelihood.

    A power stretches its whole scale as it moves, and coefficients with it; in units in which the median of y stands
    still they hardly move, so that one step in all of them is a good one.
    """
    return [*(_box_cox(parts) if _positive(parts) else _yeo_johnson(parts)), _likelihood(parts)]


def _positive(parts: Parts) -> bool:
    """Whether the scale is Box-Cox's, for y above zero."""
    return parts.est.remedy.left.family == "boxcox"


def _quiet(parts: Parts) -> list[str]:
    """A decorator where the way back may divide by zero at the scale's limit."""
    power = parts.est.c[0]
    safe = power > 0.02 if _positive(parts) else 0.02 < power < 1.98
    return [] if safe else ['@np.errstate(divide="ignore", over="ignore")']


def _box_cox(parts: Parts) -> list[list[str]]:
    if parts.covariates.intercept:
        forward = "(m**LAMBDA - 1) / LAMBDA + m**LAMBDA * np.expm1(v * np.log(y / m)) / v"
        back = "m * np.maximum(1 + v * ((LAMBDA * z + 1) / m**LAMBDA - 1) / LAMBDA, 0) ** (1 / v)"
    else:
        forward = "m ** (LAMBDA - v) * np.expm1(v * np.log(y)) / v"
        back = "np.maximum(1 + v * m ** (v - LAMBDA) * z, 0) ** (1 / v)"
    return [
        ["def bent(v):", *docstring(f"{parts.y} on the Box-Cox scale of power v, {_HELD}."), f"    return {forward}"],
        [
            *_quiet(parts),
            "def undo(z, v=LAMBDA):",
            *docstring(_BACK.format(y=parts.y)),
            f"    return {back}",
        ],
    ]


def _yeo_johnson(parts: Parts) -> list[list[str]]:
    if parts.covariates.intercept:
        forward = "scale(m, LAMBDA) + (scale(y, v) - scale(m, v)) * np.exp((LAMBDA - v) * size(m))"
        back = "scale(m, v) + (z - scale(m, LAMBDA)) * np.exp((v - LAMBDA) * size(m))"
    else:
        forward, back = "scale(y, v) * np.exp((LAMBDA - v) * size(m))", "z * np.exp((v - LAMBDA) * size(m))"
    return [
        [
            "def size(y):",
            "    return np.sign(y) * np.log1p(np.abs(y))",
            "def scale(y, v):",
            *docstring("The Yeo-Johnson scale of power v, which is 2 - v below zero."),
            "    return np.expm1(np.where(y < 0, v - 2, v) * size(y)) / np.where(y < 0, v - 2, v)",
        ],
        ["def bent(v):", *docstring(f"{parts.y} on the scale of power v, {_HELD}."), f"    return {forward}"],
        [
            *_quiet(parts),
            "def undo(z, v=LAMBDA):",
            *docstring(_BACK.format(y=parts.y)),
            f"    z = {back}",
            "    power = np.where(z < 0, v - 2, v)",
            "    return np.sign(z) * np.expm1(np.abs(np.log1p(np.maximum(power * z, -1)) / power))",
        ],
    ]


def _likelihood(parts: Parts) -> list[str]:
    v = "v * " if parts.weigher else ""
    drift = "np.log(y / m)" if _positive(parts) else "(size(y) - size(m))"
    return [
        "def likelihood(p):",
        *docstring("Log-likelihood of each row at p: coefficients, power, log of error variance (Box and Cox 1964)."),
        f"    return p[-2] * {drift} - p[-1] / 2 - ({v}bent(p[-2]) - X @ p[:-2]) ** 2 / np.exp(p[-1]) / 2",
    ]


def _at_a_corner(parts: Parts) -> list[str]:
    """Where a break lies on a row the squares are not level, and the step is taken in the power's own units."""
    stretch = "np.log(m)" if _positive(parts) else "size(m)"
    return [
        "corner = X.T @ e / np.exp(p[-1])  # of the squares, where a break lies on a row: not of the step",
        f"curved[:-2, -2:] += np.outer(corner, [{stretch}, 1])",
        "curved[-2:, :-2] = curved[:-2, -2:].T",
    ]


def power_moves(parts: Parts, weight: str) -> list[str]:
    """p and without, power and log variance last: a Newton step of the whole likelihood leaves out each row.

    weight: source of what leaving a row out makes of its score, with the sign before it.
    """
    slope = f"slope = {'v * ' if parts.weigher else ''}bent(LAMBDA + 1e-20j).imag * 1e20"
    moves = [f"without = p + (np.linalg.solve(curved, score.T) {weight}).T"]
    if parts.clustered:
        moves = [
            f"moves = (np.linalg.solve(curved, score.T) {weight}).T",
            "without = p + np.array([moves[i].sum(axis=0) for i in members])",
        ]
    if parts.searched and not parts.level_there:
        moves = [*_at_a_corner(parts), *moves]
    return [
        f"# LAMBDA was estimated too: a Newton step of the whole likelihood leaves out each {parts.unit}",
        "p = np.array([*b, LAMBDA, np.log(e @ e / len(e))])",
        'step = np.array([*1e-3 * table["std_error"], 3e-5, 3e-5])',
        "score, curved = approx_fprime_cs(p, likelihood), approx_hess_cs(p, lambda p: likelihood(p).sum(), step)",
        *moves,
        *noted(slope, "of the scale in LAMBDA (Squire and Trapp 1998)"),
    ]
