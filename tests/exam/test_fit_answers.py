"""Everything a fit can be asked, on formulas read from frames."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from scipy.stats import t as student

import batten
from batten.errors import BattenError
from batten.exam.fit import Fit
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.question import Question
from batten.frame.read import read

A = pd.DataFrame(
    {
        "x": [1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20],
        "y": [2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3],
        "d": ["no", "yes"] * 6,
    },
    index=[f"row{i}" for i in range(12)],
)
UNITS = {"mass_kg": "kg", "minutes": "min"}


def fit(key: str, formula: str, frame: pd.DataFrame, *, span=(5.0, 10.0), units=None, **asked) -> Fit:
    problem = read(formula, frame, units=units or {}, at=asked.get("at"))
    done = estimate(problem.rows, parse(key))
    assert isinstance(done, Estimate), done
    return Fit(problem, Question(span=span, **asked), done)


def castings(key: str, formula: str = "minutes ~ mass_kg + C(alloy)", **asked) -> Fit:
    return fit(key, formula, batten.sample("castings"), span=(10.0, 24.0), units=UNITS, **asked)


def test_the_smeared_mean_with_its_jackknife_interval():
    """Duan 1983, jackknife on the log scale: 14.741279 and log-scale error 0.093626, computed apart by refits."""
    new = pd.DataFrame({"x": [10.0]})
    out = fit("log y ~ x", "y ~ x", A).predict(new, interval="estimate").iloc[0]
    assert out["estimate"] == pytest.approx(14.741279, abs=5e-7)
    half = student.ppf(0.975, 10) * 0.093626
    np.testing.assert_allclose([out["low"], out["high"]], 14.741279 * np.exp([-half, half]), rtol=2e-6)


def test_the_normal_theory_interval_for_a_new_row():
    """g(eta -+ t s sqrt(1 + v)): 6.739073 to 29.727091, computed apart."""
    out = fit("log y ~ x", "y ~ x", A, errors="constant").predict(pd.DataFrame({"x": [10.0]}), interval="new row")
    np.testing.assert_allclose(out[["low", "high"]].iloc[0].astype(float), [6.739073, 29.727091], atol=1e-6)


def test_a_square_root_and_a_power_bring_their_means_back():
    """eta^2 + mean(e^2) = 17.442107 (Neyman and Scott 1960); smeared power 0.25: 15.979097."""
    new = pd.DataFrame({"x": [10.0]})
    assert fit("sqrt y ~ x", "y ~ x", A).predict(new)["estimate"].iloc[0] == pytest.approx(17.442107, abs=5e-7)
    assert fit("boxcox(0.25) y ~ x", "y ~ x", A).predict(new)["estimate"].iloc[0] == pytest.approx(15.979097, abs=5e-7)


def test_constants_come_with_sets_and_the_price_of_rounding():
    table = fit("boxcox y ~ x", "y ~ x", A).constants
    assert list(table.index) == ["power of y"]
    np.testing.assert_allclose(table.loc["power of y", ["estimate", "low", "high"]].astype(float),
                               [0.450577, 0.171211, 0.711478], atol=1e-6)  # fmt: skip
    assert table.loc["power of y", "note"] == "the square root of y costs 0.07 in log-likelihood"
    knots = castings("y ~ spline4 x").constants
    assert list(knots.index) == ["knot 1", "knot 2", "knot 3", "knot 4"]
    assert knots[["low", "high"]].isna().all(axis=None)


def test_slopes_at_places_and_averaged():
    found = fit("y ~ poly2 x", "y ~ x + d", A)
    theirs = smf.ols("y ~ d + x + I(x**2)", A).fit()
    slope = theirs.params["x"] + 2 * theirs.params["I(x ** 2)"] * np.array([5, 10])
    table = found.slope([5, 10])
    assert list(table.index) == [5, 10]
    assert table.index.name == "x"
    np.testing.assert_allclose(table["estimate"], slope, rtol=1e-9)
    average = found.slope().loc["average", "estimate"]
    assert average == pytest.approx(theirs.params["x"] + 2 * theirs.params["I(x ** 2)"] * A["x"].mean(), rel=1e-9)
    assert list(found.slope(at=7).index) == [7]


def test_a_break_has_two_rows_of_slopes():
    found = fit("y ~ hinge(9) x", "y ~ x", A).slope([9.0])
    assert list(found["note"]) == ["left of the break", "right of the break"]


def test_predictions_take_unseen_levels_and_missing_values_with_words():
    new = pd.DataFrame({"mass_kg": [10.0, 12.0, np.nan], "alloy": ["steel", "zinc", "steel"]}, index=["a", "b", "c"])
    out = castings("log y ~ log x").predict(new)
    assert list(out["estimate"].isna()) == [False, True, True]
    assert "zinc" in out.loc["b", "note"]
    assert "mass_kg" in out.loc["c", "note"]


def test_the_question_backwards_follows_held_covariates():
    found = castings("log y ~ log x")
    steel, bronze = (found.x_for(25, at={"alloy": alloy}).estimates[0] for alloy in ("steel", "bronze"))
    assert steel < bronze
    mean = found.predict(pd.DataFrame({"mass_kg": [steel], "alloy": "steel"}))["estimate"].iloc[0]
    assert mean == pytest.approx(25, rel=1e-6)
    assert found.x_for(25).reading.startswith("a mean of 25 min is reached at ")


def test_at_replaces_the_rows_own_covariates_everywhere():
    plain, held = castings("log y ~ log x"), castings("log y ~ log x", at={"alloy": "steel"})
    grid = pd.DataFrame({"mass_kg": [10.0, 24.0], "alloy": "steel"})
    ends = plain.predict(grid)["estimate"].to_numpy()
    assert held.contrast().loc["difference", "estimate"] == pytest.approx(ends[1] - ends[0], rel=1e-9)
    assert held.contrast().loc["ratio", "estimate"] == pytest.approx(
        plain.contrast().loc["ratio", "estimate"], rel=1e-9
    )
    assert held.lookup().loc[10.0, "mean"] == pytest.approx(ends[0], rel=1e-9)
    assert ", with alloy at steel" in held.sentences()[0].text


def test_an_interaction_is_answered_per_group():
    """Elasticities 0.950347 and 1.133407 of log y ~ log x * d by least squares, computed apart."""
    found = fit("log y ~ log x", "y ~ x * d", A)
    table = found.by_group()
    assert list(table.index) == ["d no", "d yes"]
    np.testing.assert_allclose(table["ratio"], [2**0.950347, 2**1.133407], rtol=1e-6)
    assert table.loc["d yes", "ratio_against_first"] == pytest.approx(2**0.183060, rel=1e-6)
    gap = table["difference"].diff().iloc[1]
    assert table.loc["d yes", "against_first"] == pytest.approx(gap, rel=1e-12)
    kinds = [s.kind for s in found.sentences()]
    assert kinds.count("groups") == 1
    assert "coefficient" not in kinds


def test_groups_can_be_asked_without_an_interaction():
    table = castings("log y ~ log x").by_group("alloy")
    assert list(table.index) == ["alloy bronze", "alloy grey iron", "alloy steel"]
    # without an interaction the ratios are equal and the differences are not
    np.testing.assert_allclose(table["ratio_against_first"].iloc[1:], 1, rtol=1e-9)
    assert table["difference"].is_monotonic_increasing


def test_a_numeric_moderator_is_shown_at_three_quantiles():
    rng = np.random.default_rng(3)
    frame = pd.DataFrame({"x": rng.uniform(1, 10, 60), "heat": rng.uniform(700, 800, 60)})
    frame["y"] = 5 + frame["x"] * (1 + 0.01 * (frame["heat"] - 750)) + rng.normal(0, 0.2, 60)
    table = fit("y ~ x", "y ~ x * heat", frame, span=(3.0, 8.0)).by_group()
    assert len(table) == 3
    assert list(table.index) == [f"heat {q:.6g}" for q in np.quantile(frame["heat"], [0.1, 0.5, 0.9])]
    assert table["difference"].is_monotonic_increasing


def test_a_lookup_table_by_group_has_a_row_per_level_and_place():
    table = castings("log y ~ log x").lookup(by="alloy")
    assert table.index.names == ["alloy", "mass_kg"]
    assert list(table.columns) == ["mean", "median", "low", "high", "note"]
    assert (table["low"] < table["median"]).all()
    assert (table["mean"] < table["high"]).all()


def test_checks_name_the_users_rows_and_have_a_size_beside_every_p():
    found = castings("log y ~ log x")
    table = found.checks()
    assert table.index.name == "check"
    assert {"left-over bend", "powers of the fit", "spread", "neighbouring rows", "loudest row", "leverage"} <= set(
        table.index
    )
    assert table["size"].notna().all()
    assert not table["reading"].str.contains("{", regex=False).any()
    loudest = table.loc["loudest row", "reading"]
    label = int(loudest.split("row ")[1].split(" ")[0])
    without = batten.sample("castings").drop(index=label)
    again = fit("log y ~ log x", "minutes ~ mass_kg + C(alloy)", without, span=(10.0, 24.0), units=UNITS)
    change = again.contrast().loc["difference", "estimate"] - found.contrast().loc["difference", "estimate"]
    assert table.loc["loudest row", "size"] == pytest.approx(change, rel=1e-8)


def test_the_reset_and_the_spread_check_are_those_of_the_literature():
    """RESET with squares and cubes (Ramsey 1969): F 1.368985; Koenker 1981: 8.262690, p 0.004047. Computed apart."""
    import statsmodels.stats.api as sms
    from statsmodels.stats.outliers_influence import reset_ramsey

    theirs = smf.ols("y ~ x", A).fit()
    table = fit("y ~ x", "y ~ x", A, errors="constant").checks()
    assert table.loc["powers of the fit", "p"] == pytest.approx(float(reset_ramsey(theirs, 3).pvalue), rel=1e-8)
    assert table.loc["spread", "p"] == pytest.approx(sms.het_breuschpagan(theirs.resid, theirs.model.exog)[1], rel=1e-8)
    assert table.loc["spread", "p"] == pytest.approx(0.004047, abs=5e-7)


def test_the_shape_in_every_group_is_tested_as_an_f_of_the_interaction():
    theirs = smf.ols("np.log(y) ~ np.log(x) * d", A).fit()
    table = fit("log y ~ log x", "y ~ x * d", A, errors="constant").checks()
    assert table.loc["same shape in every group", "p"] == pytest.approx(theirs.pvalues["np.log(x):d[T.yes]"], rel=1e-8)


@pytest.mark.parametrize(
    "key", ["loglink y ~ x", "y ~ hinge x", "y ~ cut x", "boxcox y ~ x", "share y ~ x", "y ~ bins3 x"]
)
def test_checks_run_for_every_kind_of_remedy(key):
    frame = A.assign(y=A["y"] / 60) if key.startswith("share") else A
    table = fit(key, "y ~ x", frame).checks()
    assert table["reading"].str.len().gt(0).all()
    p = table["p"].dropna()
    assert p.between(0, 1).all()


def test_a_searched_kink_pays_for_the_search():
    rng = np.random.default_rng(6)
    frame = pd.DataFrame({"x": np.linspace(1, 10, 60)})
    frame["y"] = frame["x"] + 2 * np.maximum(frame["x"] - 6, 0) + rng.normal(0, 0.5, 60)
    table = fit("y ~ hinge x", "y ~ x", frame).checks()
    assert table.loc["kink", "p"] < 1e-6
    assert table.loc["kink", "reading"].startswith("the slope changes by ")
    assert "(searched places counted)" in table.loc["kink", "reading"]


def test_sentences_start_with_the_standing_question_and_know_their_numbers():
    first, *rest = castings("log y ~ log x").sentences()
    assert first.kind == "span"
    assert (first.numbers["a"], first.numbers["b"]) == (10.0, 24.0)
    assert {s.kind for s in rest} == {"coefficient"}
    first.numbers["a"] = 99.0
    assert first.numbers["a"] == 10.0


def test_the_turning_point_is_read_in_the_users_unit():
    found = castings("y ~ poly2 x").turning_point()
    assert not found.located
    assert "kg" in found.reading


def test_code_is_a_script_about_this_remedy():
    text = castings("log y ~ log x").code()
    compile(text, "script", "exec")
    assert 'remedy "log y ~ log x"' in text


def test_answers_are_fresh_and_the_fit_pickles():
    found = castings("log y ~ hinge x")
    table = found.constants
    table.iloc[:, :] = np.nan
    assert found.constants["estimate"].notna().all()
    again = pickle.loads(pickle.dumps(found))
    assert [s.text for s in again.sentences()] == [s.text for s in found.sentences()]


@pytest.mark.parametrize(
    ("ask", "message"),
    [
        (lambda f: f.lookup(by="shade"), "'shade' is no covariate of this formula.\nIts covariates: 'alloy'."),
        (lambda f: f.x_for(20, at={"alloy": "zinc"}), "Rows with these covariate values cannot be made.\nAsked: alloy"),
        (lambda f: f.x_for(float("inf")), "y (a value of minutes) must be a number.\nIt is inf."),
        (lambda f: f.slope(at="ten"), "at (a value of mass_kg) must be a number."),
    ],
)  # fmt: skip
def test_a_question_with_a_wrong_name_says_what_there_is(ask, message):
    with pytest.raises(BattenError) as caught:
        ask(castings("log y ~ log x"))
    assert str(caught.value).startswith(message)
