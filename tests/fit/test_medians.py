"""Medians brought back from a scale: their value, how it moves, and intervals that hold."""

from __future__ import annotations

import numpy as np
import pytest

from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.averaged import interval
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means
from batten.fit.medians import middle


def _fit(key, x, y):
    rows = Rows(y=y, x=x, base=np.ones((len(x), 1)), modifier=np.ones((len(x), 1)))
    est = estimate(rows, parse(key))
    assert isinstance(est, Estimate)
    return est


def test_the_influence_of_a_median_is_its_sign_over_twice_the_density():
    """Large n, normal errors: the variance of a median is pi / 2 times that of a mean."""
    rng = np.random.default_rng(1)
    x = rng.uniform(0, 1, 20_000)
    est = _fit("log y ~ x", x, np.exp(rng.normal(0, 0.5, len(x))))
    error = np.sqrt(np.sum(middle(est).influence ** 2)) / len(x)
    # the kernel's density at n = 20,000 is right to a few percent
    assert error == pytest.approx(0.5 * np.sqrt(np.pi / 2 / len(x)), rel=0.05)


def test_moving_the_intercept_moves_the_median_residual_the_other_way():
    rng = np.random.default_rng(2)
    x = rng.uniform(0, 1, 50)
    for key in ("log y ~ x", "sqrt y ~ x"):
        assert middle(_fit(key, x, np.exp(rng.normal(2, 0.3, 50)))).slope[0] == pytest.approx(-1, rel=1e-12)
    link = middle(_fit("loglink y ~ x", x, np.exp(rng.normal(0, 0.5, 50))))
    # near the median ratio, a shift d of the linear predictor divides y / mu by exp(d)
    assert link.slope[0] == pytest.approx(-link.value, rel=0.05)


@pytest.mark.parametrize(("key", "heavy"), [("log y ~ x", False), ("log y ~ x", True), ("loglink y ~ x", False)])
def test_intervals_for_a_median_cover_at_the_stated_rate(key, heavy):
    rng, covered, truth = np.random.default_rng(3), 0, np.exp(0.3 + 0.2 * 5)
    for _ in range(200):
        x = rng.uniform(1, 10, 40)
        # Gamma errors with median one: a shape of 2 has its median at 1.678347
        e = np.log(rng.gamma(2, 1, 40) / 1.678347) if heavy else rng.normal(0, 0.5, 40)
        found = averaged_means(_fit(key, x, np.exp(0.3 + 0.2 * x + e)), np.array([5.0]), of="median")
        low, high = interval(found, 0.95, positive=True)
        covered += int(low[0] <= truth <= high[0])
    # binomial error of 200 runs is 1.5 points; the density at n = 40 errs on the wide side
    assert 0.91 <= covered / 200 <= 0.995
