"""Covariance of the coefficients by the kind of error an analyst may be asked for."""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = ["covariance", "kinds"]


def kinds(est: Estimate) -> tuple[str, ...]:
    """What `covariance` takes: by row, or by cluster where the rows have clusters."""
    more = ("HC0", "HC1", "HC2", "HC3") if est.clusters is None else ("CR0", "CR1", "CR3")
    return ("robust", "constant", *more)


def covariance(est: Estimate, kind: str = "robust") -> Array:
    """Covariance (P, P) of the coefficients and the shape's searched constants.

    "constant": s2 (J'J)^-1. Sandwiches with squared residuals as they are (HC0, White 1980), times n / (n - p) (HC1),
    over 1 - h (HC2) or its square (HC3; MacKinnon and White 1985); by cluster CR0, times G / (G - 1) (n - 1) / (n - p)
    (CR1), and CR3 (Bell and McCaffrey 2002). "robust" is HC3 or CR3. A searched power of y is held: coefficients have
    no meaning across powers (Hinkley and Runger 1984).
    """
    if kind == "constant":
        return np.asarray(est.factored.inverse_cross * est.sigma**2)
    if kind in ("robust", "HC3", "CR3"):
        moves = est.linear_moves() * est.few_clusters
        return np.asarray(moves.T @ moves)
    moves = est.linear_moves(leave_out=False)
    if kind == "HC2":
        moves = moves / np.sqrt(1 - est.leverage)[:, None]
    plain, n, p = moves.T @ moves, est.n, est.n - est.df_residual
    if kind == "HC1":
        return np.asarray(plain * n / (n - p))
    if kind == "CR1" and est.clusters is not None:
        count = est.clusters.count
        return np.asarray(plain * count / (count - 1) * (n - 1) / (n - p))
    return np.asarray(plain)
