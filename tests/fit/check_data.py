"""Small data sets on which values were computed by an independent route, typed in for the tests."""

from __future__ import annotations

import numpy as np

from batten.engine.rows import Rows

AX = np.array([1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20.0])
AY = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
AD = np.array([0.0, 1] * 6)
BX = np.array([1, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11.0])
BY = np.array([9.1, 8.6, 7.9, 6.8, 7.2, 5.6, 4.9, 5.3, 4.4, 5.6, 5.1, 6.9, 7.8, 8.4, 9.6, 10.3])
CX = np.arange(1.0, 11)
CY = np.array([0, 0, 1, 0, 3, 2, 5, 9, 8, 14.0])
DX = np.arange(1.0, 11)
DY = np.array([0.08, 0.12, 0.15, 0.22, 0.31, 0.38, 0.52, 0.55, 0.68, 0.81])


def rows_of(y: np.ndarray, x: np.ndarray, *covariates: np.ndarray) -> Rows:
    """Rows with an intercept and numeric covariates."""
    return Rows(y, x, np.column_stack([np.ones(len(y)), *covariates]), np.ones((len(y), 1)))
