"""The cube root of the predictor against geometry and a general-purpose library."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm

from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate


def test_the_edge_of_a_cube_is_straight_in_the_cube_root_of_its_volume() -> None:
    edge = np.linspace(0.5, 4, 20)
    done = estimate(Rows(2 + 12 * edge, edge**3, np.ones((20, 1)), np.ones((20, 1))), parse("y ~ cbrt x"))
    assert isinstance(done, Estimate)
    np.testing.assert_allclose(done.coef, [2, 12], rtol=1e-12)


def test_coefficients_agree_with_statsmodels_across_zero() -> None:
    rng = np.random.default_rng(1)
    x = rng.normal(0, 5, 80)
    y = 1 + 2 * np.cbrt(x) + rng.normal(0, 0.3, 80)
    done = estimate(Rows(y, x, np.ones((80, 1)), np.ones((80, 1))), parse("y ~ cbrt x"))
    assert isinstance(done, Estimate)
    np.testing.assert_allclose(done.coef, sm.OLS(y, sm.add_constant(np.cbrt(x))).fit().params, rtol=1e-10)


def test_the_slope_at_eight_is_a_twelfth() -> None:
    assert parse("y ~ cbrt x").shape.slopes(np.array([8.0]), ())[0, 0] == pytest.approx(1 / 12, rel=1e-15)
