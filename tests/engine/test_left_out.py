"""Averages and medians over the rows of every training set equal those had by going through the rows."""

from __future__ import annotations

import numpy as np
import pytest

from batten.engine.left_out import LeftOut


def left_out(n: int = 4001, folds: int = 7, always: int = 13, seed: int = 0, far: float = 0.0) -> LeftOut:
    """Least squares on skewed errors; the first rows always train; `far` adds a few rows of great leverage."""
    rng = np.random.default_rng(seed)
    a = np.column_stack([np.ones(n), rng.normal(size=(n, 3)) + far * (rng.random(n) < 0.002)[:, None]])
    a = np.linalg.qr(a)[0]
    z = rng.gamma(2.0, 0.3, n)
    e = z - a @ (a.T @ z)
    starts = np.linspace(always, n, folds + 1).astype(np.intp)
    d = np.empty((folds, a.shape[1]))
    for k in range(folds):
        held = a[starts[k] : starts[k + 1]]
        d[k] = -np.linalg.solve(np.eye(a.shape[1]) - held.T @ held, held.T @ e[starts[k] : starts[k + 1]])
    return LeftOut(e, a, d, starts, (a * a).sum(axis=1))


def trained(left: LeftOut, k: int) -> np.ndarray:
    """Residuals of the training rows of set k by plain least squares on them."""
    rows = np.delete(np.arange(len(left.e)), slice(*left.starts[k : k + 2]))
    coef = np.linalg.lstsq(left.a[rows], left.e[rows], rcond=None)[0]
    return np.asarray(left.e[rows] - left.a[rows] @ coef)


@pytest.mark.parametrize("far", [0.0, 40.0])
def test_averages_medians_and_exponentials_are_those_of_refitted_rows(far: float) -> None:
    left = left_out(far=far)
    for k in range(len(left.d)):
        e = trained(left, k)
        np.testing.assert_allclose(left.own(k), e, atol=1e-12)
        assert left.averages[k] == pytest.approx(e.mean(), abs=1e-12)
        assert left.middles[k].mean() == pytest.approx(np.median(e), abs=1e-12)
        # PRECISE bounds what the quadratic part leaves out
        assert left.exponentials[k] == pytest.approx(np.exp(e).mean(), rel=1e-8)


@pytest.mark.parametrize("n", [4000, 4001])
def test_an_even_number_of_rows_has_two_middles(n: int) -> None:
    left = left_out(n, always=0, folds=5)
    for k in range(5):
        e = np.sort(trained(left, k))
        np.testing.assert_allclose(left.middles[k], [e[(len(e) - 1) // 2], e[len(e) // 2]], atol=1e-12)


def test_squares_stop_at_zero() -> None:
    left = left_out()
    eta = np.linspace(0.05, 3, 50)
    for k in range(len(left.d)):
        e = trained(left, k)
        want = (np.maximum(eta[:, None] + e, 0) ** 2).mean(axis=1)
        np.testing.assert_allclose(left.squares(k, eta, float((e**2).mean())), want, rtol=1e-11)


def test_pooled_residuals_keep_count_mean_and_mean_square_and_bound_a_curved_average() -> None:
    left = left_out(40_001)
    for k in range(len(left.d)):
        e = trained(left, k)
        value, weight = left.pooled(k, float((e**2).mean()))
        assert weight.sum() == pytest.approx(1, abs=1e-12)
        assert weight @ value == pytest.approx(e.mean(), abs=1e-12)
        assert weight @ value**2 == pytest.approx((e**2).mean(), rel=1e-12)
        # third powers of shifts of order 1 / sqrt(n), and of classes a thousandth of the range wide, are left out
        assert weight @ (4 + value) ** -1.0 == pytest.approx(((4 + e) ** -1.0).mean(), rel=1e-8)
