"""Rows with their covariates taken off, in units of y."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from data import A_D, A_X, A_Y, fitted, rows_of

import batten
from batten.effects.partial import bent_covariates, partial

A = rows_of(A_X, A_Y, A_D)


def test_component_plus_residual_of_a_straight_line():
    """Ezekiel 1924; first values 6.969924, 3.315298, 9.069924 before centring, computed apart."""
    est, found = fitted("y ~ x", A), partial(fitted("y ~ x", A))
    raw = found.value - (np.mean(est.eta) - est.coef[2] * A_X.mean())
    assert raw[:3] == pytest.approx([6.969924, 3.315298, 9.069924], rel=1e-6)
    assert found.value - found.curve == pytest.approx(est.residual, rel=1e-12)
    assert found.bent == ()


def test_without_covariates_values_are_the_rows_and_the_curve_is_the_fit():
    for key in ("y ~ poly2 x", "y ~ exponential x", "y ~ hinge x"):
        est = fitted(key, rows_of(A_X, A_Y))
        found = partial(est)
        assert found.value == pytest.approx(A_Y, rel=1e-10)
        assert found.curve == pytest.approx(est.eta, rel=1e-10)


def test_a_logged_response_comes_back_to_its_own_units():
    est = fitted("log y ~ x", A)
    found = partial(est)
    alike = A_D.mean()
    assert found.value == pytest.approx(A_Y * np.exp(est.coef[1] * (alike - A_D)), rel=1e-10)
    assert found.curve == pytest.approx(np.exp(est.coef[0] + est.coef[1] * alike + est.coef[2] * A_X), rel=1e-10)


def test_a_link_uses_its_working_residuals():
    est = fitted("loglink y ~ x", A)
    theirs = sm.GLM(A_Y, np.column_stack([np.ones(12), A_D, A_X]), family=sm.families.Poisson()).fit(tol=1e-14)
    focal = theirs.params[2] * A_X
    level = np.mean(np.log(theirs.mu) - focal)
    assert partial(est).value == pytest.approx(np.exp(focal + level + theirs.resid_working), rel=1e-7)


def test_weights_do_not_stretch_the_residuals():
    w = np.linspace(0.5, 1.5, 12)
    est = fitted("y ~ x", replace(A, weights=w / w.mean()))
    theirs = sm.WLS(A_Y, np.column_stack([np.ones(12), A_D, A_X]), weights=w).fit()
    found = partial(est)
    assert found.value - found.curve == pytest.approx(theirs.resid, rel=1e-9)


def test_a_covariate_that_bends_is_taken_off_with_its_curve():
    """Cook 1993: y rises straight in x, but plain partial residuals would bend with the covariate."""
    rng = np.random.default_rng(3)
    x = rng.uniform(0, 10, 400)
    c = (x - 5) ** 2 / 5 + rng.normal(0, 0.3, 400)
    frame = pd.DataFrame({"x": x, "c": c, "y": np.sqrt(x) * 4 + 2 * c + rng.normal(0, 0.3, 400)})
    fit = batten.examine("y ~ x + c", frame, only=["y ~ x"], repeats=1)["y ~ x"]
    table = fit.partial()
    assert list(table.columns) == ["x", "value", "curve", "note"]
    assert table["note"].iloc[0] == "c bends along x, and that is taken off too (CERES)"
    truth = 4 * np.sqrt(x)
    gap = (table["value"] - table["value"].mean()) - (truth - truth.mean())
    assert gap.std() < 0.5
    assert bent_covariates(fit.estimate) == (1,)


def test_values_a_scale_cannot_undo_are_missing():
    rng = np.random.default_rng(5)
    x, d = rng.uniform(1, 9, 60), np.arange(60) % 2 * 1.0
    est = fitted("sqrt y ~ x", rows_of(x, np.maximum(0.2 * x + 1.5 * d + rng.normal(0, 0.3, 60), 0.02) ** 2, d))
    found = partial(est)
    assert np.isnan(found.value).sum() < 10
    assert (found.value[np.isfinite(found.value)] >= 0).all()
