"""Which part of a span effect rests on rows that exist, and the default span."""

from __future__ import annotations

import numpy as np
import pytest
from data import rows_of

from batten.effects.span import round_span
from batten.effects.support import support


def test_independent_covariates_are_supported_at_both_ends():
    rng = np.random.default_rng(1)
    x, c, d = rng.uniform(0, 10, 400), rng.normal(size=400), rng.integers(0, 2, 400).astype(float)
    found = support(rows_of(x, x, c, d), (3, 7))
    # the neighbours' range misses a few of the most extreme values
    assert found.missing < 0.02
    assert found.distance == pytest.approx(0.9, rel=0.05)


def test_a_group_without_rows_at_one_end_is_missing_there():
    x = np.concatenate([np.linspace(0, 10, 60), np.linspace(0, 4, 20)])
    group = np.repeat([0.0, 1.0], [60, 20])
    found = support(rows_of(x, x, group), (2, 9))
    assert (found.missing_a, found.missing_b) == (0.0, 0.25)
    assert found.missing == 0.125


def test_a_covariate_that_moves_with_x_leaves_most_pairs_without_rows():
    rng = np.random.default_rng(2)
    x = rng.uniform(0, 10, 300)
    found = support(rows_of(x, x, x + rng.normal(0, 0.2, 300)), (2, 8))
    assert found.missing > 0.6


def test_held_covariates_are_asked_instead_of_the_rows_own():
    x = np.concatenate([np.linspace(0, 10, 60), np.linspace(0, 4, 20)])
    rows = rows_of(x, x, np.repeat([0.0, 1.0], [60, 20]))
    one = np.ones((1, 1))
    assert support(rows, (2, 9), base=np.array([[1.0, 1.0]]), modifier=one).missing_b == 1.0
    assert support(rows, (2, 9), base=np.array([[1.0, 0.0]]), modifier=one).missing_b == 0.0


@pytest.mark.parametrize(
    ("values", "expected"),
    [
        ([4.975, 8.1, 10.275, 12.4, 15.0, 19.9, 23.975, 30.8, 43.2], (10.0, 24.0)),
        ([0] * 75 + [1] * 25, (0.0, 1.0)),
        ([1, 2, 3, 4, 5] * 8, (2.0, 4.0)),
        ([0, 1] * 10, (0.0, 1.0)),
        ([0] * 90 + [1] * 10, (0.0, 1.0)),
        ([7.0] * 5, (7.0, 7.0)),
        (np.linspace(1890, 2020, 14), (1920.0, 1990.0)),
        (np.linspace(0.0012, 0.0098, 9), (0.0034, 0.0076)),
        (np.linspace(-3.2, -0.3, 30), (-2.5, -1.0)),
    ],
)
def test_the_default_span_is_the_quartiles_as_a_person_would_say_them(values, expected):
    x = np.array(values, dtype=float)
    assert round_span(x) == expected


def test_the_default_span_lies_inside_the_data_and_near_the_quartiles():
    rng = np.random.default_rng(3)
    for _ in range(200):
        x = rng.lognormal(rng.normal(0, 3), rng.uniform(0.05, 2), rng.integers(8, 200))
        a, b = round_span(x)
        low, high = np.quantile(x, [0.25, 0.75])
        assert x.min() <= a < b <= x.max()
        assert max(abs(a - low), abs(b - high)) <= 0.1 * (high - low)
