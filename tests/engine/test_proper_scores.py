"""Scores of predicted distributions against their defining integral."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.integrate import quad

from batten.engine.proper_scores import crps_lognormal, crps_normal, interval_score


def by_integral(law, y):
    """Integral of (F(t) - [t >= y])^2 (Gneiting and Raftery 2007)."""
    return quad(lambda t: law.cdf(t) ** 2, -60, y, limit=400)[0] + quad(lambda t: law.sf(t) ** 2, y, 400, limit=400)[0]


def test_crps_of_a_normal():
    assert crps_normal(np.array(0.5), 0.0, 1.0) == pytest.approx(0.331404, rel=1e-5)


def test_crps_of_a_lognormal():
    assert crps_lognormal(np.array(3.0), 1.0, 0.5) == pytest.approx(0.350803, rel=1e-5)


@pytest.mark.parametrize("y", [-1.0, 0.7, 4.0])
def test_crps_of_a_normal_is_its_integral(y):
    assert crps_normal(np.array(y), 1.2, 0.6) == pytest.approx(by_integral(stats.norm(1.2, 0.6), y), rel=1e-6)


@pytest.mark.parametrize("y", [-0.5, 0.0, 0.3, 2.0, 9.0])
def test_crps_of_a_lognormal_is_its_integral_even_at_nought_and_below(y):
    law = stats.lognorm(0.6, scale=np.exp(0.8))
    assert crps_lognormal(np.array(y), 0.8, 0.6) == pytest.approx(by_integral(law, y), rel=1e-6)


def test_scores_go_row_by_row():
    y, mean, sd = np.array([1.0, 2.0, 3.0]), np.array([1.5, 1.5, 1.0]), np.array([0.5, 1.0, 2.0])
    rows = [float(crps_normal(*(np.array(v) for v in row))) for row in zip(y, mean, sd, strict=True)]
    assert crps_normal(y, mean, sd) == pytest.approx(rows, rel=1e-12)


def test_scores_are_in_units_of_the_response():
    assert crps_normal(np.array(50.0), 0.0, 100.0) == pytest.approx(100 * 0.331404, rel=1e-5)
    assert crps_lognormal(np.array(300.0), 1 + np.log(100), 0.5) == pytest.approx(100 * 0.350803, rel=1e-5)


def test_interval_score_by_hand():
    """Inside: the width. Outside by 1 at 95%: the width plus 40."""
    y = np.array([1.5, 0.0, 3.0])
    assert interval_score(y, np.array(1.0), np.array(2.0)) == pytest.approx([1, 41, 41])
    assert interval_score(y, np.array(1.0), np.array(2.0), level=0.8) == pytest.approx([1, 11, 11])


def test_the_true_quantiles_have_the_best_interval_score():
    y = np.random.default_rng(3).normal(size=40_000)
    right = stats.norm.ppf(0.95)
    scores = {
        c: interval_score(y, np.array(-c), np.array(c), level=0.9).mean() for c in (right - 0.3, right, right + 0.3)
    }
    assert min(scores, key=scores.get) == right
