"""At many rows an examination keeps no array as long as the rows; what it shows is the same."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf

import batten
from batten.engine.threads import MANY_ROWS
from batten.exam.examination import Examination


@pytest.fixture(scope="module")
def data() -> pd.DataFrame:
    rng = np.random.default_rng(8)
    n = MANY_ROWS + 1_001
    x, g = rng.lognormal(2, 0.5, n), rng.integers(0, 3, n)
    y = np.exp(0.5 + 0.8 * np.log(x) + 0.1 * g + rng.normal(0, 0.25, n))
    return pd.DataFrame({"y": y, "x": x, "g": np.array(["low", "middle", "high"])[g]})


@pytest.fixture(scope="module")
def exam(data: pd.DataFrame) -> Examination:
    only = ["log y ~ log x", "log y ~ x^p", "loglink y ~ log x", "y ~ smooth x", "weighted y ~ x", "boxcox y ~ log x"]
    return batten.examine("y ~ x + C(g)", data, only=only, span=(5, 12))


def test_shown_fits_agree_with_statsmodels(exam: Examination, data: pd.DataFrame) -> None:
    """Coefficients and HC3 errors, the general-purpose library being statsmodels."""
    for key, formula in (("y ~ x", "y ~ x + C(g)"), ("log y ~ log x", "np.log(y) ~ C(g) + np.log(x)")):
        want = smf.ols(formula, data).fit(cov_type="HC3")
        got = exam[key].coefficients
        np.testing.assert_allclose(sorted(got["estimate"]), sorted(want.params), rtol=1e-9)
        np.testing.assert_allclose(sorted(got["std_error"]), sorted(want.bse), rtol=1e-9)


def test_what_is_made_again_is_what_was_dropped(exam: Examination) -> None:
    for key, est in exam.comparison.estimates.items():
        assert est.kept is None, key
        full = est.full
        assert full.kept is not None
        np.testing.assert_allclose(full.eta, est.eta, rtol=1e-12)
        q = est.factored.q
        if est.roughness is None:  # a penalised basis goes on in the penalty's rows
            np.testing.assert_allclose(q.T @ q, np.eye(q.shape[1]), atol=1e-9)
        if est.link is None and not est.theta and est.spread is None and est.roughness is None:
            assert np.abs(q.T @ est.residual).max() <= 1e-8 * np.abs(est.residual).max() * est.n**0.5
            assert est.sigma == pytest.approx(float(np.sqrt(est.residual @ est.residual / est.df_residual)), rel=1e-12)


def test_an_examination_pickles_without_the_arrays_it_can_make_again(exam: Examination) -> None:
    rows = exam.comparison.rows
    held = sum(part.nbytes for part in (rows.y, rows.x, rows.base, rows.modifier))
    # the rows once, covariate patterns and weights; seven remedies with all their arrays are over ten times the rows
    assert len(pickle.dumps(dict(exam.comparison.estimates))) < 2.5 * held
    again = pickle.loads(pickle.dumps(exam))
    for key in exam:
        pd.testing.assert_frame_equal(again[key].coefficients, exam[key].coefficients, check_exact=True)
