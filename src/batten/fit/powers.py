"""What a searched power of y moves: its likelihood's scores, and units in which it stands almost still."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from batten.engine.rows import Array

if TYPE_CHECKING:
    from batten.fit.estimate import Estimate

__all__ = ["in_lambda", "likelihood_moves", "own_units", "pivot"]

#: step of five-point slopes in lambda: truncation and rounding both stay near 1e-10 for y over ten decades
STEP = 1e-3


def in_lambda(of: Callable[[float], Array], lam: float) -> tuple[Array, Array]:
    """First and second slope at lam of a smooth function of lambda."""
    far_left, left, here, right, far_right = (of(lam + k * STEP) for k in (-2, -1, 0, 1, 2))
    first = (8 * (right - left) - (far_right - far_left)) / (12 * STEP)
    return first, (16 * (right + left) - 30 * here - (far_right + far_left)) / (12 * STEP**2)


def pivot(est: Estimate, lam: float) -> tuple[float, float]:
    middle = np.array([np.median(est.rows.y)])
    value = float(est.scale.forward(middle, (lam,))[0]) if est.rows.intercept is not None else 0.0
    return value, float(np.exp(est.scale.log_jacobian(middle, (lam,))[0]))


def own_units(est: Estimate, lam: float) -> tuple[float, float]:
    """Place and length of the scale at lambda: z(lambda) = place + length * (z - pivot), to first order near median y.

    A power of y stretches the whole scale as lambda moves, and the coefficients with it; in these units both stand
    almost still, so that one step in (coefficients, lambda) is a good one (the scaling of Box and Cox 1964, with the
    median in the place of the geometric mean).
    """
    value, slope = pivot(est, lam)
    return value, slope / est.pivot[1]


def likelihood_moves(est: Estimate) -> Array:
    """Influence of each row on (coef, theta, lambda) from the full likelihood with sigma, (n, P).

    The scores of Box and Cox's likelihood: coef x e/s2; lambda -e z'/s2 + d log|T'|/d lambda; s2 (e2/s2 - 1)/(2 s2).
    """
    y, e = est.rows.y, est.residual
    s2 = float(e @ e) / est.n
    z1, z2 = in_lambda(lambda v: est.rows.weigh(est.scale.forward(y, (v,))), est.c[0])
    j1, j2 = in_lambda(lambda v: est.scale.log_jacobian(y, (v,)), est.c[0])
    x = est.rows.weigh(est.jacobian_at(est.rows.x, est.rows.base, est.rows.modifier)[:, :-1])
    length = est.factored.length
    unit = x / length  # scaled columns keep the information matrix well conditioned
    score = np.column_stack([unit * (e / s2)[:, None], -e * z1 / s2 + j1, (e * e / s2 - 1) / (2 * s2)])
    p = unit.shape[1]
    information = np.zeros((p + 2, p + 2))
    information[:p, :p] = unit.T @ unit / s2
    information[:p, p] = information[p, :p] = -(unit.T @ z1) / s2
    information[p, p] = (z1 @ z1 + e @ z2) / s2 - j2.sum()
    information[p, p + 1] = information[p + 1, p] = -(e @ z1) / s2**2
    information[p + 1, p + 1] = est.n / (2 * s2**2)
    moved = np.linalg.solve(information, score.T).T
    return np.asarray(np.column_stack([moved[:, :p] / length, moved[:, p]]))
