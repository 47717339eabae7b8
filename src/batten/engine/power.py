"""The constant of a response scale by maximum likelihood given the design (Box and Cox 1964).

The profile log-likelihood in units of y is -n/2 log(RSS(lambda)/n) + sum log |T'(y; lambda)|, up to a constant. It is
never taken from y alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import minimize_scalar

from batten.engine.rows import Array

__all__ = ["Power", "best_power", "profile_likelihood"]

SCAN_ROWS = 5_000


@dataclass(frozen=True, eq=False)
class Power:
    """forward(y, lambda) -> z and jacobian(y, lambda) -> log |T'| per row, both (n,)."""

    forward: Callable[[Array, float], Array]
    jacobian: Callable[[Array, float], Array]
    lower: float
    upper: float


def profile_likelihood(power: Power, y: Array, q: Array, lam: float) -> float:
    """Profile log-likelihood of lambda in units of y; q (n, p) an orthonormal basis of the design."""
    z = power.forward(y, lam)
    centre = z.mean()
    # subtracting the mean first keeps digits where a constant is in the span, and changes nothing otherwise
    e = z - centre
    e = e - q @ (q.T @ e) if _holds_constant(q) else z - q @ (q.T @ z)
    n = len(y)
    rss = float(e @ e)
    if not np.isfinite(rss) or rss <= 0:
        return -np.inf
    return float(-0.5 * n * (np.log(2 * np.pi * rss / n) + 1) + power.jacobian(y, lam).sum())


def _holds_constant(q: Array) -> bool:
    one = q.sum(axis=0)
    return bool(abs(one @ one - len(q)) <= 1e-9 * len(q))


def best_power(power: Power, y: Array, q: Array, *, start: float | None = None) -> tuple[float, bool]:
    """Lambda of highest profile likelihood and whether it lies inside the range.

    A grid finds the cell (on a thinned sample at large n), Brent's method the place. `start` skips the grid.
    """

    def loss(lam: float) -> float:
        return -profile_likelihood(power, y, q, lam)

    warm = start is not None
    if start is None:
        places = np.linspace(power.lower, power.upper, 25)
        every = max(1, len(y) // SCAN_ROWS)
        thin_y, thin_q = y[::every], q[::every]
        if every > 1:
            thin_q = np.linalg.qr(thin_q)[0]
        values = [-profile_likelihood(power, thin_y, thin_q, float(v)) for v in places]
        start, width = float(places[int(np.argmin(values))]), float(places[1] - places[0])
    else:
        width = 0.05 * (power.upper - power.lower)
    low, high = max(power.lower, start - width), min(power.upper, start + width)
    found = minimize_scalar(loss, bounds=(low, high), method="bounded", options={"xatol": 1e-6})
    best = _polish(loss, float(found.x))
    if warm and not low + 1e-4 < best < high - 1e-4:
        return best_power(power, y, q)
    return best, power.lower + 1e-6 < best < power.upper - 1e-6


def _polish(loss: Callable[[float], float], at: float) -> float:
    """Two Newton steps on five-point derivatives: function values alone would give half the digits."""
    h = 0.02
    for _ in range(2):
        two_left, left, here, right, two_right = (loss(at + k * h) for k in (-2, -1, 0, 1, 2))
        slope = (8 * (right - left) - (two_right - two_left)) / (12 * h)
        bend = (-two_left + 16 * left - 30 * here + 16 * right - two_right) / (12 * h * h)
        if not (np.isfinite(bend) and bend > 0 and abs(slope / bend) < h):
            break
        at -= slope / bend
    return at
