"""The response with the covariates taken off, row by row: for the bulging rule and plots of what is left."""

from __future__ import annotations

import numpy as np

from batten.diagnose.span import basis, outside
from batten.engine.rows import Array, Ints

__all__ = ["conditional_residuals", "partial_residuals"]


def partial_residuals(X: Array, z: Array, *, focal: Ints | slice) -> Array:
    """Component-plus-residual values (n,): e + f, f from *all* columns of the focal term (Ezekiel 1924).

    Larsen and McCleary 1972. f is centred and the mean of z added, so the values lie at the level of z whatever way the
    columns were centred. On the scale of the fit: bring them back to units of y through the scale's inverse, never a
    residual alone. They bend falsely where covariates follow x along a curve: see `conditional_residuals`.
    """
    b = np.linalg.lstsq(X, z, rcond=None)[0]
    component = X[:, focal] @ b[focal]
    return np.asarray(z - X @ b + component - component.mean() + z.mean())


def conditional_residuals(others: Array, z: Array, x: Array, *, degree: int = 2) -> Array:
    """The same where covariates depend on x along a curve (CERES, Cook 1993).

    others (n, q): all columns without x. Each covariate's mean given x is a polynomial of `degree` in x; z is regressed
    on the covariates and these means, and e plus the means' part is returned at the level of z. The response's curve in
    x shows without the covariates' curves.
    """
    powers = np.vander((x - x.mean()) / (x.std() or 1.0), degree + 1)
    given_x = basis(powers)
    design = others
    for column in (given_x @ (given_x.T @ others)).T:
        # a covariate that is itself such a polynomial, like the constant, brings no new column
        if np.linalg.norm(outside(basis(design), column)) > 1e-9 * np.linalg.norm(column):
            design = np.column_stack([design, column])
    b = np.linalg.lstsq(design, z, rcond=None)[0]
    added = slice(others.shape[1], None)
    component = design[:, added] @ b[added]
    return np.asarray(z - design @ b + component - component.mean() + z.mean())
