"""The inverse link against published values, statsmodels and refits, and what it says where no mean exists."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from statsmodels.tools.sm_exceptions import DomainWarning

import batten
from batten.engine.rows import Rows
from batten.families import default_grid, parse
from batten.families.base import Link
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

#: blood clotting times, lot 1, by concentration of plasma in percent; McCullagh and Nelder (1989), p. 301
CLOTTING = pd.DataFrame({"u": [5, 10, 15, 20, 30, 40, 60, 80, 100], "time": [118, 58, 42, 35, 27, 25, 21, 19, 18]})
KEY = "invlink-gamma y ~ log x"


def clotting(**asked) -> batten.Fit:
    asked = {"errors": "constant", "span": (10, 40), "units": {"u": "%", "time": "s"}, **asked}
    return batten.examine("time ~ u", CLOTTING, only=[KEY], repeats=1, folds=9, **asked)[KEY]


def rows(y: np.ndarray, x: np.ndarray, *covariates: np.ndarray) -> Rows:
    return Rows(y, x, np.column_stack([np.ones(len(y)), *covariates]), np.ones((len(y), 1)))


def wide(n: int = 200) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(5)
    x, d = rng.uniform(1, 9, n), (rng.random(n) < 0.5).astype(float)
    return rng.gamma(8, 1 / (0.1 + 0.05 * x + 0.1 * d) / 8), x, d


def test_clotting_times_meet_the_published_coefficients_and_errors() -> None:
    """McCullagh and Nelder (1989), p. 302: 1/mean = -.01655438 + .01534311 log u, errors .00092754 and .00041496."""
    table = clotting().coefficients
    np.testing.assert_allclose(table["estimate"], [-0.01655438, 0.01534311], atol=6e-9)
    np.testing.assert_allclose(table["std_error"], [0.00092754, 0.00041496], atol=1.1e-8)


#: statsmodels says that this link lets eta fall to zero, which is true
reaches_zero = pytest.mark.filterwarnings(f"ignore::{DomainWarning.__module__}.DomainWarning")


@reaches_zero
def test_it_agrees_with_statsmodels() -> None:
    y, x, d = wide()
    done = estimate(rows(y, x, d), parse("invlink-gamma y ~ x"))
    assert isinstance(done, Estimate)
    theirs = sm.GLM(y, np.column_stack([np.ones(200), d, x]), family=sm.families.Gamma()).fit(tol=1e-15, maxiter=200)
    np.testing.assert_allclose(done.coef, theirs.params, rtol=1e-8)
    np.testing.assert_allclose(done.covariance("constant"), theirs.cov_params(), rtol=1e-6)  # their stopping rule
    assert isinstance(done.remedy.left, Link)
    assert done.remedy.left.deviance(y, done.mu).sum() == pytest.approx(theirs.deviance, rel=1e-10)


def test_rows_left_out_move_the_coefficients_as_refits_do() -> None:
    """One Newton step without the row, so near but not equal; above all its sign."""
    y, x, d = wide(400)
    whole = rows(y, x, d)
    done = estimate(whole, parse("invlink-gamma y ~ x"))
    assert isinstance(done, Estimate)
    for i in (3, 77, 301):
        again = estimate(whole.take(np.arange(400) != i), parse("invlink-gamma y ~ x"))
        assert isinstance(again, Estimate)
        np.testing.assert_allclose(done.moves()[i], again.coef - done.coef, rtol=0.1, atol=1e-6)


def test_predictions_are_one_over_eta_with_intervals_in_order() -> None:
    fit, new = clotting(errors="robust"), pd.DataFrame({"u": [12.0, 50.0]})
    b = fit.coefficients["estimate"].to_numpy()
    for interval in ("estimate", "new row"):
        got = fit.predict(new, interval=interval)
        np.testing.assert_allclose(got["estimate"], 1 / (b[0] + b[1] * np.log([12, 50])), rtol=1e-12)
        assert (got["low"] < got["estimate"]).all()
        assert (got["estimate"] < got["high"]).all()


def test_the_span_effect_and_slopes_are_of_the_mean_itself() -> None:
    fit = clotting()
    b = fit.coefficients["estimate"].to_numpy()
    low, high = (1 / (b[0] + b[1] * np.log(u)) for u in (10, 40))
    got = fit.contrast()
    assert got.loc["difference", "estimate"] == pytest.approx(high - low, rel=1e-10)
    assert got.loc["ratio", "estimate"] == pytest.approx(high / low, rel=1e-10)
    assert got.loc["difference", "high"] < 0
    slope = fit.slope(at=20).loc[20, "estimate"]
    assert slope == pytest.approx(-b[1] / 20 / (b[0] + b[1] * np.log(20)) ** 2, rel=1e-10)


def test_sentences_speak_of_places_and_never_of_percent() -> None:
    told = clotting().sentences()
    assert [s.kind for s in told][:2] == ["span", "places"]
    assert "the mean of time is clearly lower, by 28.3 s" in told[0].text
    assert not any(s.kind == "coefficient" for s in told)
    assert clotting().words == "inverse link for time (Gamma) on log of u"


def test_a_valley_of_eta_is_a_top_of_the_mean() -> None:
    rng = np.random.default_rng(6)
    x = rng.uniform(0, 10, 300)
    y = rng.gamma(50, 1 / (0.5 + 0.1 * (x - 6) ** 2) / 50)
    fit = batten.examine("y ~ x", pd.DataFrame({"x": x, "y": y}), only=["invlink-gamma y ~ poly2 x"], repeats=1)[
        "invlink-gamma y ~ poly2 x"
    ]
    turn = fit.turning_point()
    assert turn.estimate == pytest.approx(6, abs=0.1)
    assert turn.form == "highest"
    assert turn.located


def test_where_eta_reaches_zero_there_is_no_mean_and_words_say_so() -> None:
    fit = clotting()
    zero = float(np.exp(-fit.coefficients["estimate"].iloc[0] / fit.coefficients["estimate"].iloc[1]))
    got = fit.predict(pd.DataFrame({"u": [0.9 * zero, 20.0]}), interval="estimate")
    assert np.isnan(got["estimate"].iloc[0])
    assert "invlink-gamma y has no mean there" in got["note"].iloc[0]
    assert np.isfinite(got["estimate"].iloc[1])
    assert fit.contrast(0.5 * zero, 20).loc["difference", "note"].startswith("invlink-gamma y has no mean at ")
    assert np.isnan(fit.total(pd.DataFrame({"u": [0.9 * zero]})).loc["total", "estimate"])


@reaches_zero
def test_checks_and_summary_read_like_those_of_any_link() -> None:
    fit = clotting()
    assert fit.checks()["size"].map(np.isfinite).all()
    theirs = sm.GLM(CLOTTING["time"], sm.add_constant(np.log(CLOTTING["u"])), family=sm.families.Gamma()).fit()
    assert fit.summary().loc["deviance", "value"] == pytest.approx(theirs.deviance, rel=1e-8)
    assert np.isfinite(fit.aicc)


@pytest.mark.parametrize(
    ("y", "seen", "instead"),
    [
        ([0.0, 2.0], "1 of 2 values are zero or negative (lowest 0).", "loglink y keeps zeros."),
        ([-3.0, 2.0], "1 of 2 values are zero or negative (lowest -3).",
         "yeojohnson y, or a shape of the predictor (y ~ spline4 x)."),
    ],
)  # fmt: skip
def test_it_refuses_responses_at_or_below_zero(y: list[float], seen: str, instead: str) -> None:
    refusal = parse(KEY).left.refuse(np.array(y))
    assert refusal is not None
    assert (refusal.wrong, refusal.seen, refusal.instead) == (
        "An inverse link needs a response above zero.",
        seen,
        instead,
    )


def test_it_is_tried_on_request_only() -> None:
    grid = default_grid(CLOTTING["time"].to_numpy(float), CLOTTING["u"].to_numpy(float), zero_is_arbitrary=False)
    assert not any(r.left.key == "invlink-gamma y" for r in grid)
    assert parse("invlink-gamma y~x").key == "invlink-gamma y ~ x"
