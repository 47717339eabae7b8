"""The corrected standard error of paired differences over folds."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from batten.engine.paired import corrected_se

D = np.array([0.12, 0.05, 0.30, -0.04, 0.18, 0.22, 0.09, 0.15, -0.02, 0.11])


def test_correction_of_ten_folds():
    """Nadeau and Bengio 2003: naive 0.032971, corrected 0.047906, t 2.421394, p 0.038522; arithmetic done apart."""
    assert np.std(D, ddof=1) / np.sqrt(10) == pytest.approx(0.032971, rel=1e-4)
    found = corrected_se(D, 10)
    assert found == pytest.approx(0.047906, rel=1e-5)
    assert D.mean() / found == pytest.approx(2.421394, rel=1e-6)
    assert 2 * stats.t.sf(D.mean() / found, 9) == pytest.approx(0.038522, rel=1e-4)


def test_more_repeats_do_not_buy_precision_without_end():
    """However many repeats, the part from overlapping training sets, var / (K - 1), stays."""
    many = np.tile(D, 1000)
    floor = np.std(many, ddof=1) * np.sqrt(1 / 9)
    assert floor < corrected_se(many, 10) < 1.001 * floor


def test_units_scale_the_error_and_a_shift_leaves_it():
    assert corrected_se(60 * D - 4, 10) == pytest.approx(60 * corrected_se(D, 10), rel=1e-12)


def test_one_split_has_no_error():
    assert np.isnan(corrected_se(D[:1], 2))


def test_it_is_near_the_true_error_where_the_naive_one_is_far_below():
    """Mean against nought as predictions of 40 normal rows, 10 folds dealt 5 times, 400 seeded samples. The true error
    is the SD of the mean difference over the samples: the naive one claims less than half of it, the corrected one
    errs on the safe side by no more than half."""
    rng = np.random.default_rng(21)
    means, corrected, naive = [], [], []
    for _ in range(400):
        y = 0.15 + rng.normal(size=40)
        folds = np.array([rng.permutation(y).reshape(10, 4) for _ in range(5)])
        training = (y.sum() - folds.sum(axis=2, keepdims=True)) / 36
        d = np.mean((folds - training) ** 2 - folds**2, axis=2).ravel()
        means.append(d.mean())
        corrected.append(corrected_se(d, 10) ** 2)
        naive.append(np.var(d, ddof=1) / 50)
    truth = np.std(means)
    assert np.sqrt(np.mean(naive)) < 0.5 * truth
    assert 0.95 * truth < np.sqrt(np.mean(corrected)) < 1.5 * truth
