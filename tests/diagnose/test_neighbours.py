"""Residuals that follow one another in stored order."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats
from statsmodels.stats.stattools import durbin_watson
from two_sets import A_X, A_Y, line, residuals

from batten.diagnose.dependence import neighbouring_residuals


def waves(n, *orders):
    """Eigenvectors of the matrix of first differences: cosines, eigenvalues 4 sin(j pi / 2n)^2."""
    t = np.arange(n) + 0.5
    return np.column_stack([np.cos(np.pi * j * t / n) for j in orders])


def test_the_statistic_is_that_of_statsmodels():
    found = neighbouring_residuals(line(A_X), A_Y)
    left = residuals(line(A_X), A_Y)
    assert found.statistic == pytest.approx(durbin_watson(left), rel=1e-12)
    assert found.correlation == pytest.approx(np.sum(left[1:] * left[:-1]) / np.sum(left**2), rel=1e-12)


@pytest.mark.parametrize(
    ("n", "order", "bound"),
    [(15, 1, 1.36), (15, 14, 1.08), (30, 1, 1.49), (30, 29, 1.35), (50, 1, 1.59), (50, 49, 1.50)],
)
def test_p_meets_the_printed_bounds(n, order, bound):
    """Durbin and Watson 1951, 5% bounds for one regressor (from memory of the tables): d_U and d_L.

    The upper bound is the law of d when the regressor is the slowest wave, the lower one when it is the fastest. A
    response of two waves outside the design has any d between their eigenvalues. The printed bound has two decimals, so
    one-sided p must pass .05 within half a unit of the last (and a little for the beta approximation).
    """
    slow, fast = 2 if order == 1 else 1, n - 2
    low, high = (4 * np.sin(np.pi * j / (2 * n)) ** 2 for j in (slow, fast))
    pair = waves(n, slow, fast) / np.linalg.norm(waves(n, slow, fast), axis=0)
    X = np.column_stack([np.ones(n), waves(n, order)])

    def one_sided(d):
        share = (d - low) / (high - low)
        found = neighbouring_residuals(X, pair @ np.sqrt([1 - share, share]))
        assert found.statistic == pytest.approx(d, rel=1e-10)
        return found.p / 2

    assert one_sided(bound - 0.0055) < 0.05 < one_sided(bound + 0.0055)


def test_p_is_the_exact_tail_on_a_lopsided_design():
    """P(d < observed) by 400,000 seeded draws of the ratio of quadratic forms; beta approximation and draws: 0.003."""
    x = np.exp(np.linspace(0, 4, 18))
    X, z = line(x, np.sqrt(x)), np.cumsum(np.random.default_rng(14).normal(size=18)) + x
    M = np.eye(18) - X @ np.linalg.pinv(X)
    D = np.diff(np.eye(18), axis=0)
    roots = np.sort(np.linalg.eigvalsh(M @ D.T @ D @ M))[3:]
    draws = np.random.default_rng(15).chisquare(1, size=(400_000, len(roots)))
    found = neighbouring_residuals(X, z)
    below = np.mean(draws @ roots / draws.sum(axis=1) < found.statistic)
    assert found.p == pytest.approx(2 * min(below, 1 - below), abs=0.003)


def test_p_is_uniform_for_independent_rows():
    """Kolmogorov-Smirnov on 500 seeded samples of 15 rows."""
    rng = np.random.default_rng(9)
    X = line(np.arange(15.0), rng.normal(size=15))
    p = [neighbouring_residuals(X, rng.normal(size=15)).p for _ in range(500)]
    assert stats.kstest(p, "uniform").pvalue > 0.01


def test_rows_that_drift_together_are_seen_and_shuffling_hides_them():
    rng = np.random.default_rng(10)
    drift = sm.tsa.arma_generate_sample([1, -0.7], [1], 120, distrvs=rng.standard_normal)
    x = rng.uniform(size=120)
    stored = neighbouring_residuals(line(x), x + drift)
    mixed = rng.permutation(120)
    assert stored.p < 1e-6
    assert stored.correlation == pytest.approx(0.7, abs=0.15)
    assert neighbouring_residuals(line(x[mixed]), (x + drift)[mixed]).p > 0.05


def test_too_few_rows_or_a_perfect_fit_say_nothing():
    assert neighbouring_residuals(line(A_X[:4]), A_Y[:4]) is None
    assert neighbouring_residuals(line(A_X), 1 + A_X) is None
