"""The cube root of the response against a published law, closed forms and scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import chi2, norm

from batten.engine.rows import Rows
from batten.families import parse
from batten.families.base import Scale
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means

ROOT = parse("cbrt y ~ x").left
assert isinstance(ROOT, Scale)


@pytest.mark.parametrize(("df", "share"), [(10, 0.95), (30, 0.05), (60, 0.99)])
def test_cube_roots_of_chi_square_are_nearly_normal(df: int, share: float) -> None:
    """Wilson and Hilferty 1931: (chi2/k)^(1/3) is about normal with mean 1 - 2/(9k) and variance 2/(9k)."""
    z = 1 - 2 / (9 * df) + norm.ppf(share) * np.sqrt(2 / (9 * df))
    assert df * ROOT.inverse(np.array([z]), ())[0] == pytest.approx(chi2.ppf(share, df), rel=2e-3)


def test_it_keeps_signs_and_zeros() -> None:
    y = np.array([-27.0, -1e-9, 0.0, 8.0, 1e9])
    np.testing.assert_allclose(ROOT.inverse(ROOT.forward(y, ()), ()), y, rtol=1e-14)


def test_the_mean_has_the_closed_form_of_a_third_moment() -> None:
    """mean (eta + e)^3 = eta^3 + 3 eta mean(e^2) + mean(e^3) for residuals with mean zero."""
    rng = np.random.default_rng(3)
    x = rng.uniform(1, 5, 50)
    y = (1 + 0.5 * x + rng.normal(0, 0.2, 50)) ** 3
    done = estimate(Rows(y, x, np.ones((50, 1)), np.ones((50, 1))), parse("cbrt y ~ x"))
    assert isinstance(done, Estimate)
    eta, e = float(done.coef @ [1, 3]), done.residual
    want = eta**3 + 3 * eta * (e**2).mean() + (e**3).mean()
    assert averaged_means(done, np.array([3.0])).value[0] == pytest.approx(want, rel=1e-12)
