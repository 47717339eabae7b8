"""Every member found in the folders, with samples it accepts; shared by the contract tests of this folder."""

from __future__ import annotations

from typing import Any

import numpy as np

from batten.families import curves, links, parse, scales, shapes
from batten.families.base import Array, Code, Constants, Link, Scale, Shape

_rng = np.random.default_rng(7)
RESPONSES: dict[str, Array] = {
    "positive": _rng.gamma(3.0, 1.2, 40) + 0.3,
    "mixed": _rng.normal(0.0, 2.0, 40),
    "negative": -_rng.gamma(3.0, 1.2, 40) - 0.3,
    "share": _rng.beta(2.0, 3.0, 40),
    "with zeros": np.concatenate([np.zeros(8), _rng.gamma(2.0, 2.0, 32)]),
}
PREDICTORS: dict[str, Array] = {
    "skewed": _rng.gamma(2.0, 15.0, 120) + 1.0,
    "mixed": _rng.normal(0.0, 3.0, 60),
    "years": 1950.0 + _rng.permutation(70),
    "small": np.array([0.5, 1.0, 1.5, 2.5, 4.0, 4.0, 5.5, 7.0, 8.0, 9.5, 11.0, 13.0]),
    "ties": np.repeat([1.0, 2.0, 3.0, 5.0, 8.0, 13.0, 21.0, 34.0], [20, 5, 9, 4, 12, 3, 6, 11]),
    "tiny units": _rng.gamma(2.0, 1.5e-7, 80) + 1e-8,
}
_LEFT = ("boxcox(-1)", "boxcox(0)", "boxcox(0.5)", "yeojohnson(0)", "yeojohnson(2)", "logit(-10, 10)")
_RIGHT = (
    "x^3", "x^-2", "x^0.25", "poly3 x", "poly5 x", "bins3 x", "bins(2, 6.5) x", "bins(-1, 2) x", "hinge(4.5) x",
    "hinge2(2, 9) x", "spline3 x", "spline5 x", "spline6 x", "spline7 x", "spline(2, 5, 9) x", "fp1(-1) x", "fp1(0) x",
    "fp2(2, 2) x", "fp2(0, 0) x", "fp2(-0.5, 3) x",
)  # fmt: skip
ALL_SCALES: tuple[Scale, ...] = (*scales(), *(parse(f"{left} y ~ x").left for left in _LEFT))  # type: ignore[arg-type]
ALL_SHAPES: tuple[Shape, ...] = (*shapes(), *curves(), *(parse(f"y ~ {right}").shape for right in _RIGHT))
ALL_LINKS: tuple[Link, ...] = links()


def scale_cases() -> list[tuple[Scale, str]]:
    """Every scale with every sample it accepts, by the sample's name."""
    return [(scale, name) for scale in ALL_SCALES for name, y in RESPONSES.items() if scale.refuse(y) is None]


def scale_settings(scale: Scale, sample: str) -> list[Constants]:
    """Constants to try: searched ones across their range, else what the sample teaches."""
    tried: list[Constants] = [(lam,) for lam in (-1.5, -0.5, 0.0, 1e-9, 0.5, 1.0, 2.0, 2.5)]
    return tried if scale.searched else [scale.learn(RESPONSES[sample])]


def shape_cases() -> list[tuple[Shape, str]]:
    """Every shape and curve with every sample it accepts, by the sample's name."""
    return [(shape, name) for shape in ALL_SHAPES for name, x in PREDICTORS.items() if shape.refuse(x) is None]


def shape_settings(shape: Shape, sample: str) -> list[tuple[bool, Constants, Constants]]:
    """(constant in the span, state, theta): both kinds of span, and candidates from across the grid."""
    out = []
    for constant in (True, False):
        state = shape.learn(PREDICTORS[sample], constant=constant)
        grid = shape.candidates(PREDICTORS[sample], state)
        rows = sorted({len(grid) // 4, len(grid) // 2, len(grid) - 1})
        out += [(constant, state, tuple(float(t) for t in grid[row])) for row in rows]
    return out


def run(code: Code, **values: Array) -> dict[str, Any]:
    """Execute a member's pieces as a script would; its columns, its inverse and its check by name."""
    lines = [f"{name} = {literal}  # {comment}" for name, literal, comment in code.constants]
    space: dict[str, Any] = {"np": np, **values}
    exec("\n".join([*lines, code.helper]), space)
    out = {name: eval(expression, space) for name, expression in code.columns if "y" in values or "x" in values}
    if code.inverse and "z" in values:
        out["inverse"] = eval(code.inverse, space)
    if code.check and ("y" in values or "x" in values):
        out["check"] = bool(np.all(eval(code.check[0], space)))
    return out


def central(function: Any, at: Array, step: Array) -> Array:
    """Fourth-order central difference; its error is of the order of step^4 and rounding / step."""
    far, near = function(at + 2 * step) - function(at - 2 * step), function(at + step) - function(at - step)
    return np.asarray((8 * near - far) / (12 * step))
