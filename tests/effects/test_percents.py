"""Covariates' coefficients in percent, as the user reads them."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from data import A_D, A_X, A_Y, fitted, rows_of

import batten
from batten.effects.percents import percents

A = rows_of(A_X, A_Y, A_D)


def test_a_yes_or_no_covariate_of_a_logged_response():
    """Halvorsen and Palmquist 1980; Kennedy 1981; van Garderen and Shah 2002; Manning 1998. Computed apart."""
    (got,) = percents(fitted("log y ~ x", A), ("one", "d"), errors="constant")
    assert (got.percent, got.low, got.high) == pytest.approx((36.861585, -5.987210, 99.239841), rel=1e-6)
    assert got.kennedy == pytest.approx(34.988627, rel=1e-6)
    assert (got.unbiased, got.unbiased_error) == pytest.approx((34.986290, 22.352713), rel=1e-6)
    assert got.means == pytest.approx(35.1015, rel=1e-5)  # means 1.351015 against medians 1.368616
    assert "unbiased" not in got.note  # standard error 0.166


def test_levels_are_read_against_the_first_level():
    rng = np.random.default_rng(1)
    n = 300
    frame = pd.DataFrame({"x": rng.uniform(1, 9, n), "kind": rng.choice(["a", "b", "c"], n), "u": rng.normal(size=n)})
    spread = np.where(frame["kind"] == "c", 0.9, 0.2)
    bump = frame["kind"].map({"a": 0.0, "b": 0.2, "c": -0.3})
    frame["y"] = np.exp(0.1 * frame["x"] + bump + 0.05 * frame["u"] + spread * rng.normal(size=n))
    exam = batten.examine("y ~ x + kind + u", frame, only=["log y ~ x", "loglink y ~ x", "y ~ x"], repeats=1)
    table = exam["log y ~ x"].percents()
    theirs = smf.ols("np.log(y) ~ x + kind + u", frame).fit(cov_type="HC3", use_t=True)
    ends = theirs.conf_int().loc["kind[T.c]"]
    assert list(table.index) == ["kind: b", "kind: c", "u"]
    assert table.loc["kind: c", "percent"] == pytest.approx(100 * np.expm1(theirs.params["kind[T.c]"]), rel=1e-9)
    assert table.loc["kind: c", ["low", "high"]].to_numpy(float) == pytest.approx(100 * np.expm1(ends), rel=1e-9)
    e, kind = np.exp(theirs.resid), frame["kind"]
    ratio = np.exp(theirs.params["kind[T.c]"]) * e[kind == "c"].mean() / e[kind == "a"].mean()
    assert table.loc["kind: c", "means"] == pytest.approx(100 * (ratio - 1), rel=1e-9)
    assert table.loc["kind: c", "means"] > table.loc["kind: c", "percent"] + 10  # c spreads more than a
    assert np.isnan(table.loc["u", "kennedy"])
    assert table.loc["u", "note"] == "for one unit more, of the median"
    assert (exam["loglink y ~ x"].percents()["note"] == "of the mean").all()
    assert exam["y ~ x"].percents().empty


def test_scales_without_percents_have_none():
    for key in ("y ~ x", "sqrt y ~ x", "log1p y ~ x", "invlink-gamma y ~ x", "boxcox y ~ x"):
        assert percents(fitted(key, A), ("one", "d")) == ()


def test_a_wide_error_says_that_the_unbiased_reading_differs():
    rng = np.random.default_rng(2)
    y = np.exp(0.1 * A_X + rng.normal(0, 0.8, 12))
    (got,) = percents(fitted("log y ~ x", rows_of(A_X, y, A_D)), ("one", "d"))
    assert got.note.endswith("the error is wide enough for the unbiased reading to differ")


@pytest.mark.parametrize("key", ["log y ~ x", "loglink y ~ x"])
def test_where_every_level_has_a_column_of_its_own_none_is_compared(key):
    frame = pd.DataFrame({"x": A_X, "y": A_Y, "d": np.where(A_D > 0, "b", "a")})
    exam = batten.examine("y ~ x + d - 1", frame, only=[key], repeats=1, folds=4)
    assert exam[key].percents().empty
    assert len(exam[key].coefficients) == 3
