"""The constant of a response scale by maximum likelihood given the design (Box and Cox 1964).

The profile log-likelihood in units of y is -n/2 log(RSS(lambda)/n) + sum log |T'(y; lambda)|, up to a constant. It is
never taken from y alone.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev
from scipy.fft import dct
from scipy.optimize import minimize_scalar

from batten.engine.rows import Array, Ints

__all__ = ["Power", "best_power", "fold_powers", "likelihood_width", "peaks", "profile_likelihood"]

SCAN_ROWS = 5_000
#: places around the optimum through which a training set's profile is interpolated
NODES = 24


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


def fold_powers(
    power: Power, y: Array, basis: Array, cross: list[Array], held: list[Ints], best: float
) -> Array | None:
    """Best lambda of every training set (S,), from the basis (n, p) that all of them share.

    cross: inverse cross-product of each training set (p, p); held: its held-out rows. The profile of each training set
    is interpolated through Chebyshev nodes around the all-rows optimum; None where one of them runs out of the nodes.
    """
    width = 8 * _width(power, y, basis, best)
    low, high = max(power.lower, best - width), min(power.upper, best + width)
    count = NODES if len(y) < SCAN_ROWS else NODES // 2  # many rows mean a narrow, smooth stretch
    nodes = np.cos(np.pi * (np.arange(count) + 0.5) / count)
    places = low + (nodes + 1) * (high - low) / 2
    z = np.column_stack([power.forward(y, float(v)) for v in places])
    z = z - z.mean(axis=0) if _holds_constant(basis) else z
    jacobian = np.column_stack([power.jacobian(y, float(v)) for v in places])
    square, right, jump = (z * z).sum(axis=0), basis.T @ z, jacobian.sum(axis=0)
    likelihood = np.empty((count, len(held)))
    for s, (inverse, rows) in enumerate(zip(cross, held, strict=True)):
        left = right - basis[rows].T @ z[rows]
        rss = square - (z[rows] ** 2).sum(axis=0) - np.einsum("pm,pq,qm->m", left, inverse, left)
        n = len(y) - len(rows)
        if not (rss > 0).all():
            return None
        likelihood[:, s] = -0.5 * n * np.log(rss / n) + jump - jacobian[rows].sum(axis=0)
    at = peaks(likelihood, nodes)
    return None if at is None else low + (at + 1) * (high - low) / 2


def peaks(values: Array, nodes: Array) -> Array | None:
    """Where the Chebyshev interpolants of values (nodes, S) peak, (S,) in -1..1; None where one has no peak inside."""
    fitted = dct(values - values.max(axis=0), type=2, axis=0) / len(values)
    fitted[0] /= 2
    slope, bend = chebyshev.chebder(fitted), chebyshev.chebder(fitted, 2)
    at: Array = nodes[np.argmax(values, axis=0)]
    for _ in range(30):
        with np.errstate(all="ignore"):
            step = chebyshev.chebval(at, slope, tensor=False) / chebyshev.chebval(at, bend, tensor=False)
        at = at - step
        if not (np.abs(at) < 1).all():
            return None
        if np.abs(step).max() < 1e-12:
            break
    return at if (chebyshev.chebval(at, bend, tensor=False) < 0).all() else None


def likelihood_width(power: Power, y: Array, q: Array, best: float) -> float:
    """Standard error of lambda at many rows, from a thinned sample of them; q (n, p): columns of the design."""
    every = max(1, len(y) // SCAN_ROWS)
    thin = np.linalg.qr(q[::every])[0]
    return _width(power, y[::every], thin, best) * float(np.sqrt(len(thin) / len(y)))


def _width(power: Power, y: Array, q: Array, best: float) -> float:
    """Standard error of lambda from the bend of its profile."""
    h = 0.05
    three = [profile_likelihood(power, y, q, best + k * h) for k in (-1, 0, 1)]
    bend = -(three[0] - 2 * three[1] + three[2]) / h**2
    return float(min(1.0, 1 / np.sqrt(bend))) if bend > 1 else 1.0


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
