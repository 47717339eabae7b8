"""Least squares of the displayed fit against certified sets and a general-purpose library."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from batten.engine.linear import design, factor, solve
from batten.engine.rows import Rows

# NIST Statistical Reference Datasets, linear regression: Wampler1 (y is the exact polynomial of x = 0..20) and
# Wampler5's certified coefficients are all 1; Longley's certified values as printed there.
LONGLEY = np.array([
    [60323, 83.0, 234289, 2356, 1590, 107608, 1947], [61122, 88.5, 259426, 2325, 1456, 108632, 1948],
    [60171, 88.2, 258054, 3682, 1616, 109773, 1949], [61187, 89.5, 284599, 3351, 1650, 110929, 1950],
    [63221, 96.2, 328975, 2099, 3099, 112075, 1951], [63639, 98.1, 346999, 1932, 3594, 113270, 1952],
    [64989, 99.0, 365385, 1870, 3547, 115094, 1953], [63761, 100.0, 363112, 3578, 3350, 116219, 1954],
    [66019, 101.2, 397469, 2904, 3048, 117388, 1955], [67857, 104.6, 419180, 2822, 2857, 118734, 1956],
    [68169, 108.4, 442769, 2936, 2798, 120445, 1957], [66513, 110.8, 444546, 4681, 2637, 121950, 1958],
    [68655, 112.6, 482704, 3813, 2552, 123366, 1959], [69564, 114.2, 502601, 3931, 2514, 125368, 1960],
    [69331, 115.7, 518173, 4806, 2572, 127852, 1961], [70551, 116.9, 554894, 4007, 2827, 130081, 1962],
])  # fmt: skip
LONGLEY_COEF = np.array([
    -3482258.63459582, 15.0618722713733, -0.358191792925910e-01, -2.02022980381683, -1.03322686717359,
    -0.511041056535807e-01, 1829.15146461355,
])  # fmt: skip
LONGLEY_SE = np.array([
    890420.383607373, 84.9149257747669, 0.334910077722432e-01, 0.488399681651699, 0.214274163161675,
    0.226073200069370, 455.478499142212,
])  # fmt: skip


def digits(got: np.ndarray, want: np.ndarray) -> float:
    """Smallest number of correct digits (log relative error)."""
    return float((-np.log10(np.maximum(np.abs(got - want) / np.abs(want), 1e-16))).min())


def test_longley_keeps_thirteen_digits_of_coefficients_and_twelve_of_errors() -> None:
    y, x = LONGLEY[:, 0], np.column_stack([np.ones(16), LONGLEY[:, 1:]])
    done = factor(x)
    coef, residual = solve(done, x, y)
    error = np.sqrt(residual @ residual / 9 * np.diagonal(done.inverse_cross))
    assert digits(coef, LONGLEY_COEF) >= 13
    assert digits(error, LONGLEY_SE) >= 12


@pytest.mark.parametrize(("name", "needed"), [("Wampler1", 13), ("Wampler5", 9)])
def test_high_powers_keep_the_digits_that_the_data_hold(name: str, needed: int) -> None:
    x = np.arange(21.0)
    exact = sum(x**k for k in range(6))
    # NIST's Wampler4/5 disturbances at x = 0..20, ten thousand times those of Wampler3's hundredth
    noise = np.array([
        759, -2048, 2048, -2048, 2523, -2048, 2048, -2048, 1838, -2048, 2048, -2048, 1838, -2048, 2048, -2048, 2523,
        -2048, 2048, -2048, 759,
    ])  # fmt: skip
    y = exact if name == "Wampler1" else exact + 100 * noise
    design_matrix = np.column_stack([x**k for k in range(6)])
    coef, _ = solve(factor(design_matrix), design_matrix, y)
    assert digits(coef, np.ones(6)) >= needed


def test_ordinary_data_agree_with_statsmodels_to_ten_digits() -> None:
    rng = np.random.default_rng(3)
    x = np.column_stack([np.ones(80), rng.normal(size=(80, 3)), rng.lognormal(size=80)])
    y = x @ np.array([1.0, 2, -1, 0.5, 0.1]) + rng.standard_t(5, size=80)
    done, want = factor(x), sm.OLS(y, x).fit()
    coef, residual = solve(done, x, y)
    np.testing.assert_allclose(coef, want.params, rtol=1e-10)
    np.testing.assert_allclose(residual, want.resid, rtol=1e-10, atol=1e-12)
    np.testing.assert_allclose(done.leverage, want.get_influence().hat_matrix_diag, rtol=1e-10)
    np.testing.assert_allclose(done.inverse_cross, want.normalized_cov_params, rtol=1e-9, atol=1e-14)


def test_a_repeated_column_is_counted_as_aliased() -> None:
    x = np.random.default_rng(0).normal(size=(20, 3))
    assert factor(np.column_stack([x, x @ [1.0, 2, 3]])).aliased == 1
    assert factor(x).aliased == 0
    assert factor(np.column_stack([x, np.zeros(20)])).aliased == 1


def test_interactions_multiply_every_shape_column_modifier_by_modifier() -> None:
    x, g = np.array([1.0, 2, 3]), np.array([0.0, 1, 1])
    rows = Rows(x, x, np.ones((3, 1)), np.column_stack([np.ones(3), g]))
    got = design(rows, np.column_stack([x, x**2]))
    np.testing.assert_array_equal(got, np.column_stack([np.ones(3), x, x**2, g * x, g * x**2]))


def test_a_curve_with_its_own_level_leaves_the_constant_out() -> None:
    x = np.array([1.0, 2, 3])
    rows = Rows(x, x, np.column_stack([np.ones(3), x]), np.ones((3, 1)))
    assert design(rows, x[:, None], own_level=True).shape == (3, 2)


def test_very_many_rows_have_the_same_triangle_and_nearly_collinear_ones_fall_back() -> None:
    """Cholesky's triangle twice (Yamamoto and others 2015) against Householder's, up to the signs of its rows."""
    rng = np.random.default_rng(4)
    x = np.column_stack([np.ones(25_000), rng.lognormal(size=(25_000, 3)) * [1.0, 1e4, 1e-3]])
    done = factor(x)
    q, r = np.linalg.qr(x / done.length)
    sign = np.sign(np.diagonal(r))
    np.testing.assert_allclose(done.r, sign[:, None] * r, atol=1e-13)
    np.testing.assert_allclose(done.q, q * sign, atol=1e-13)
    np.testing.assert_allclose(done.q.T @ done.q, np.eye(4), atol=1e-13)
    near = np.column_stack([x, x[:, 1] + 1e-9 * x[:, 2]])
    np.testing.assert_allclose(factor(near).q.T @ factor(near).q, np.eye(5), atol=1e-13)
    assert factor(np.column_stack([x, x[:, 1]])).aliased == 1
