"""The closed test of fractional polynomials, from residual sums of squares found by trying every pair of powers."""

from __future__ import annotations

from itertools import combinations_with_replacement

import numpy as np
import pytest
from scipy import stats
from two_sets import B_X, B_Y

from batten.diagnose.closed_test import closed_test

POWERS = (-2, -1, -0.5, 0, 0.5, 1, 2, 3)


def power(x, p):
    return np.log(x) if p == 0 else x**p


def rss(y, *columns):
    X = np.column_stack([np.ones_like(y), *columns])
    Q = np.linalg.qr(X / np.linalg.norm(X, axis=0))[0]
    return float(np.sum((y - Q @ (Q.T @ y)) ** 2))


def best(x, y):
    """Residual sums of squares without x, on a line, on the best power and on the best two."""
    ones = {p: rss(y, power(x, p)) for p in POWERS}
    pairs = {
        (p, q): rss(y, power(x, p), power(x, q) * (np.log(x) if p == q else 1))
        for p, q in combinations_with_replacement(POWERS, 2)
    }
    return rss(y), rss(y, x), ones, pairs


def test_the_set_with_a_bottom_takes_two_powers():
    """Royston and Altman 1994; Royston and Sauerbrei 2008 (F form). Values computed apart."""
    none, straight, ones, pairs = best(B_X, B_Y)
    assert min(ones, key=ones.get) == 3
    assert min(pairs, key=pairs.get) == (1, 2)
    one, two = min(ones.values()), min(pairs.values())
    deviances = [16 * np.log(v / 16) for v in (none, straight, one, two)]
    assert deviances == pytest.approx([18.092552, 17.614117, 13.002571, -21.995698], rel=1e-5)
    found = closed_test(none=none, straight=straight, one_power=one, two_powers=two, n=16, others=1)
    steps = (found.no_effect, found.straight, found.one_power)
    assert [s.fall for s in steps] == pytest.approx([40.088250, 39.609814, 34.998269], rel=1e-5)
    assert [s.statistic for s in steps] == pytest.approx([30.937152, 39.926324, 43.515663], rel=1e-5)
    assert [s.df for s in steps] == [(4, 11), (3, 11), (2, 11)]
    assert [s.p for s in steps] == pytest.approx([float(stats.f.sf(s.statistic, *s.df)) for s in steps], rel=1e-12)
    assert found.verdict == "two powers"


@pytest.mark.parametrize(
    ("truth", "verdict"),
    [
        (lambda x: 0 * x, "no effect"), (lambda x: 2 * x, "straight"), (lambda x: 8 * np.log(x), "one power"),
        (lambda x: 8 * (np.log(x) - 1) ** 2, "two powers"),
    ],
)  # fmt: skip
def test_the_first_that_is_not_rejected_stands(truth, verdict):
    rng = np.random.default_rng(5)
    x = rng.uniform(0.5, 9, 150)
    none, straight, ones, pairs = best(x, truth(x) + rng.normal(0, 1, 150))
    found = closed_test(
        none=none, straight=straight, one_power=min(ones.values()), two_powers=min(pairs.values()), n=150, others=1
    )
    assert found.verdict == verdict


def test_too_few_rows_or_a_perfect_fit_have_no_closed_test():
    assert closed_test(none=9.0, straight=5.0, one_power=4.0, two_powers=3.0, n=5, others=1) is None
    assert closed_test(none=9.0, straight=5.0, one_power=4.0, two_powers=0.0, n=20, others=1) is None
