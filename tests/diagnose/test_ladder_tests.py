"""First steps along the ladder against refits with the added columns."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from two_sets import A_X, A_Y, line

from batten.diagnose.ladder_tests import pe_columns, power_step


def test_first_step_of_box_and_tidwell():
    """Box and Tidwell 1962; delta, its t and the first power computed apart."""
    found = power_step(line(A_X), A_X, A_Y)
    assert found.delta == pytest.approx(0.931613, rel=1e-5)
    assert found.power == pytest.approx(1.403596, rel=1e-5)
    added = sm.OLS(A_Y, line(A_X, A_X * np.log(A_X))).fit()
    assert added.params[2] == pytest.approx(found.delta, rel=1e-9)
    assert added.tvalues[2] == pytest.approx(1.392872, rel=1e-5)
    same = sm.OLS(A_Y, line(A_X, found.column)).fit()
    assert same.tvalues[2] == pytest.approx(added.tvalues[2], rel=1e-9)


def test_iterated_steps_end_at_the_least_squares_power():
    """The steps, each taken from the power before, end where the residual sum of squares is lowest: 1.499068."""
    p = 1.0
    for _ in range(200):
        found = power_step(line(A_X**p), A_X**p, A_Y)
        p *= 1 + 0.3 * (found.power - 1)  # damped, for whole steps swing
    assert p == pytest.approx(1.499068, rel=1e-5)


def test_weighted_rows_take_the_weighted_step():
    root = np.sqrt(np.linspace(0.5, 1.5, 12))
    found = power_step(line(A_X) * root[:, None], A_X, A_Y * root, root=root)
    theirs = sm.WLS(A_Y, line(A_X, A_X * np.log(A_X)), weights=root**2).fit()
    assert found.delta == pytest.approx(theirs.params[2], rel=1e-9)


def test_no_power_of_values_at_or_below_zero():
    assert power_step(line(A_X - 1), A_X - 1, A_Y) is None


def test_pe_columns_need_a_positive_level_fit():
    level, log = np.array([1.0, 2.0]), np.array([0.1, 0.7])
    against_level, against_log = pe_columns(level, log)
    assert against_level == pytest.approx(log - np.log(level))
    assert against_log == pytest.approx(level - np.exp(log))
    assert pe_columns(np.array([0.0, 2.0]), log) is None
