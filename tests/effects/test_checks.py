"""Every check of a fit against published methods, computed apart or by general libraries."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
import statsmodels.formula.api as smf
import statsmodels.stats.api as sms
from data import A_D, A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy import stats

from batten.effects.checks import checks
from batten.effects.tell import Names
from batten.engine.rows import Rows

NAMES = Names("y", "x", "min", "kg", covariates=True)
A, B = rows_of(A_X, A_Y), rows_of(B_X, B_Y)
RNG = np.random.default_rng(2)
WIDE_X = RNG.uniform(1, 9, 80)
WIDE_D = (RNG.random(80) < 0.4).astype(float)
WIDE_Y = 5 + 2 * WIDE_X + WIDE_D + RNG.normal(0, 0.25 * WIDE_X)
WIDE = rows_of(WIDE_X, WIDE_Y, WIDE_D)
DESIGN = np.column_stack([np.ones(80), WIDE_D, WIDE_X])


def found(key, rows, *, errors="constant", span=(5.0, 10.0), **asked):
    return {c.name: c for c in checks(fitted(key, rows), NAMES, span, errors=errors, labels=("one", "d"), **asked)}


def read_off(check):
    return check.test.statistic, check.test.df, check.test.p


# Published methods on two small sets; values computed apart


@pytest.mark.parametrize(
    ("key", "rows", "name", "statistic", "df", "p"),
    [
        ("y ~ x", A, "powers of the fit", 1.368985, (2, 8), 0.308086),
        ("y ~ x", B, "powers of the fit", 65.823314, (2, 12), None),
        ("log y ~ log x", A, "powers of the fit", 2.146150, (2, 8), None),
        ("y ~ x", B, "repeated rows", 44.744900, (9, 5), 0.000301),
        ("y ~ poly2 x", B, "repeated rows", 3.661569, (8, 5), 0.084568),
        ("y ~ hinge x", B, "repeated rows", 0.506698, (7, 5), None),
        ("y ~ x", A, "rows in turn", 0.957424, (9,), 0.363364),
        ("y ~ x", A, "middle rows", 4.896942, (6, 4), 0.073004),
        ("log y ~ x", A, "square of the fit", -3.834617, (9,), None),
        ("y ~ x", rows_of(A_X, A_Y + 3), "level or log", 1.187649, (9,), None),
        ("log y ~ x", rows_of(A_X, A_Y + 3), "level or log", 2.338433, (9,), None),
        ("y ~ x", A, "power of y", 4.982164, (9,), None),
        ("y ~ x", A, "power of x", 1.392872, (9,), None),
        ("y ~ x", A, "spread", 8.262690, (1,), 0.004047),
        ("log y ~ log x", A, "spread, all predictors", 0.027450, (1,), None),
        ("y ~ x", A, "spread, all products", 10.519478, (2,), None),
        ("y ~ x", A, "spread in two halves", 8.186476, (1, 10), 0.016922),
    ],
)
def test_statistics_of_two_small_sets(key, rows, name, statistic, df, p):
    """Ramsey 1969; lack of fit; Harvey and Collier 1977; Utts 1982; Pregibon 1980; MacKinnon, White and Davidson 1983;
    Atkinson 1973; Box and Tidwell 1962; Koenker 1981; White 1980; Brown and Forsythe 1974."""
    got = read_off(found(key, rows)[name])
    assert got[0] == pytest.approx(statistic, rel=2e-5)
    assert got[1] == df
    if p is not None:
        assert got[2] == pytest.approx(p, abs=6e-7)


def test_the_bend_of_the_small_set_is_the_spline_of_its_size():
    """F for the nonlinear columns (Stone and Koo 1985); below 30 rows three knots."""
    got = found("y ~ x", A)["left-over bend"]
    knots = np.quantile(A_X, [0.1, 0.5, 0.9])
    low, mid, high = A_X[[4]].item(), knots[1], A_X[[-5]].item()  # below 100 rows the outer knots are the 5th values
    extra = np.maximum(A_X - low, 0) ** 3 - np.maximum(A_X - mid, 0) ** 3 * (high - low) / (high - mid)
    extra += np.maximum(A_X - high, 0) ** 3 * (mid - low) / (high - mid)
    wide = sm.OLS(A_Y, np.column_stack([np.ones(12), A_X, extra])).fit()
    assert got.test.statistic == pytest.approx(wide.tvalues[2] ** 2, rel=1e-6)
    assert got.test.df == (1, 9)


def test_park_slope_of_a_mean_model():
    """Manning and Mullahy 2001: 1.320686 with means from the Poisson log link; computed apart."""
    assert found("loglink y ~ x", A)["spread and mean"].size == pytest.approx(1.320686, rel=1e-5)


def test_the_level_fit_without_a_log_is_said():
    got = found("y ~ x", A)["level or log"]
    assert got.test is None
    lowest = sm.OLS(A_Y, np.column_stack([np.ones(12), A_X])).fit().fittedvalues.min()
    assert got.reading == f"not available: the fit of y itself falls to {lowest:.3g} min, which has no log"


def test_powers_of_y_and_x_name_their_first_step():
    """Atkinson 1973: about 0.499859; the row that moves it most."""
    assert "the rows point to a power of about 0.500" in found("y ~ x", A)["power of y"].reading
    rng = np.random.default_rng(1)
    x = rng.uniform(1, 9, 60)
    bent = rows_of(x, 3 * np.sqrt(x) + rng.normal(0, 0.1, 60))
    reading = found("y ~ x", bent)["power of x"].reading
    assert "a first step goes to the power " in reading
    assert "a first step" not in found("y ~ x", A)["power of x"].reading  # no more than chance: none is named


def test_thirds_of_the_small_set():
    """Tukey 1977; half-slopes 1.8 and 2.184211 (Velleman and Hoaglin 1981)."""
    got = found("y ~ x", A)["thirds along x"]
    assert got.size == pytest.approx(2.184211 - 1.8, rel=1e-5)
    assert got.unit == "min per kg"
    assert got.reading.startswith("the slope is 1.80 in the lower half and 2.18 min per kg in the upper")


def test_closed_test_of_powers_in_order():
    """Royston and Altman 1994: F 30.937152, 39.926324 and 43.515663, so two powers are needed."""
    got = found("y ~ fp1 x", B)
    names = [f"two powers against {rival}" for rival in ("none", "a line", "one")]
    assert [got[n].test.statistic for n in names] == pytest.approx([30.937152, 39.926324, 43.515663], rel=1e-5)
    assert [got[n].test.df for n in names] == [(4, 11), (3, 11), (2, 11)]
    ended = found("y ~ fp1 x", WIDE)
    assert ended["two powers against a line"].reading.endswith("the closed test ends here: a line will do")
    assert "two powers against one" not in ended


def test_a_kink_pays_for_the_search_in_two_ways():
    """Davies 1987: M of ten places; their largest F (Hansen 1996), far beyond chance where there is a bottom."""
    got = found("y ~ hinge x", B)
    assert got["kink"].size == pytest.approx(2.219602, rel=1e-5)
    line = np.column_stack([np.ones(16), B_X])
    places = np.linspace(*np.quantile(B_X, [0.1, 0.9]), 10)
    t = [sm.OLS(B_Y, np.column_stack([line, np.maximum(B_X - place, 0)])).fit().tvalues[2] for place in places]
    normal = -stats.norm.ppf(stats.t.sf(max(t), 13))
    assert got["kink"].test.statistic == pytest.approx(normal, rel=1e-6)
    assert max(t) == pytest.approx(24.498100, rel=1e-5)
    assert got["kink, resampled"].test.statistic == pytest.approx(600.156926, rel=1e-5)
    assert got["kink, resampled"].p == pytest.approx(1 / 1000)


# General libraries on wider data, both kinds of errors


def test_tests_of_spread_are_those_of_statsmodels():
    got, left = found("y ~ x", WIDE), sm.OLS(WIDE_Y, DESIGN).fit()
    # the square of a yes/no column is that column, so it brings no product of its own
    products = np.column_stack([DESIGN, WIDE_X * WIDE_D, WIDE_X**2])
    for name, theirs in (
        ("spread, all predictors", sms.het_breuschpagan(left.resid, DESIGN)),
        ("spread, all products", sms.het_breuschpagan(left.resid, products)),
        ("spread along the fit",
         sms.het_breuschpagan(left.resid, np.column_stack([np.ones(80), left.fittedvalues, left.fittedvalues**2]))),
    ):  # fmt: skip
        assert got[name].test.statistic == pytest.approx(theirs[0], rel=1e-8), name
    halves = left.fittedvalues <= np.median(left.fittedvalues)
    theirs = stats.levene(left.resid[halves], left.resid[~halves], center="median")
    assert got["spread in two halves"].test.statistic == pytest.approx(theirs.statistic, rel=1e-9)


def test_sizes_of_spread_are_in_units_of_y():
    """The true SD is 0.25 x: 0.45 at the low and 2.05 at the high end of the middle 80%."""
    rng = np.random.default_rng(8)
    x = rng.uniform(1, 9, 4000)
    got = found("y ~ x", rows_of(x, 5 + 2 * x + rng.normal(0, 0.25 * x)))["spread"]
    assert got.unit == "min"
    assert got.size == pytest.approx(0.25 * 0.8 * 8, rel=0.15)  # a log-linear spread fitted to a linear one


def test_one_column_tests_are_refits_with_that_column():
    got = found("y ~ x", WIDE)
    fit = sm.OLS(WIDE_Y, DESIGN).fit()
    log_x = sm.OLS(WIDE_Y, np.column_stack([DESIGN, WIDE_X * np.log(WIDE_X)])).fit()
    assert got["power of x"].test.statistic == pytest.approx(log_x.tvalues[3], rel=1e-8)
    square = sm.OLS(WIDE_Y, np.column_stack([np.ones(80), fit.fittedvalues, fit.fittedvalues**2])).fit()
    assert got["square of the fit"].test.statistic == pytest.approx(square.tvalues[2], rel=1e-8)
    gap = np.abs(log_x.fittedvalues - fit.fittedvalues).max()
    assert got["power of x"].size == pytest.approx(gap, rel=1e-8)


def test_robust_errors_make_the_added_columns_hc3_tests():
    got = found("y ~ x", WIDE, errors="robust")
    fit = sm.OLS(WIDE_Y, DESIGN).fit()
    powers = np.column_stack([fit.fittedvalues**2, fit.fittedvalues**3])
    wide = sm.OLS(WIDE_Y, np.column_stack([DESIGN, powers / np.std(powers, axis=0)])).fit(cov_type="HC3", use_t=True)
    assert got["powers of the fit"].p == pytest.approx(float(wide.f_test(np.eye(5)[3:]).pvalue), rel=1e-6)
    plain = sm.OLS(WIDE_Y, np.column_stack([DESIGN, powers / np.std(powers, axis=0)])).fit()
    assert got["powers of the fit, even spread"].p == pytest.approx(float(plain.f_test(np.eye(5)[3:]).pvalue), rel=1e-6)
    log_x = sm.OLS(WIDE_Y, np.column_stack([DESIGN, WIDE_X * np.log(WIDE_X)])).fit(cov_type="HC3", use_t=True)
    assert got["power of x"].test.statistic == pytest.approx(log_x.tvalues[3], rel=1e-7)


def test_variance_weights_make_weighted_tests():
    w = np.linspace(0.5, 1.5, 80)
    got = found("y ~ x", replace(WIDE, weights=w / w.mean()))
    frame = pd.DataFrame({"y": WIDE_Y, "d": WIDE_D, "x": WIDE_X})
    theirs = smf.wls("y ~ d + x + I(x * np.log(x))", frame, weights=w).fit()
    assert got["power of x"].test.statistic == pytest.approx(theirs.tvalues.iloc[3], rel=1e-7)
    left = smf.wls("y ~ d + x", frame, weights=w).fit()
    spread = sms.het_breuschpagan(left.wresid, DESIGN)
    assert got["spread, all predictors"].test.statistic == pytest.approx(spread[0], rel=1e-7)


def test_clusters_take_the_place_of_rows_in_robust_tests():
    got = found("y ~ x", replace(WIDE, cluster=np.arange(80) // 8), errors="robust")
    assert got["powers of the fit"].test.df == (2, 9)
    assert "{row} and its cluster" in got["loudest row"].reading


def test_a_covariate_that_bends_along_x_is_named():
    rng = np.random.default_rng(3)
    x = rng.uniform(1, 9, 200)
    c = (x - 5) ** 2 / 8 + rng.normal(0, 0.2, 200)
    got = found("y ~ x", rows_of(x, 2 * x + 3 * c + rng.normal(0, 0.5, 200), c))["bent covariate"]
    assert got.p < 1e-10
    assert got.reading.startswith("d follows x along a bend worth up to ")
    quadratic = sm.OLS(c, np.column_stack([np.ones(200), x, x**2])).fit()
    straight = sm.OLS(c, np.column_stack([np.ones(200), x])).fit()
    b = sm.OLS(2 * x + 3 * c, np.column_stack([np.ones(200), c, x])).fit().params[1]
    gap = b * np.abs(quadratic.fittedvalues - straight.fittedvalues).max()
    assert got.size == pytest.approx(gap, rel=0.05)  # the covariate's coefficient is estimated with noise
    assert found("y ~ x", WIDE)["bent covariate"].p > 0.01


def test_the_row_that_moves_a_searched_constant_most_is_that_of_refits():
    est = fitted("y ~ x^p", A)
    got = found("y ~ x^p", A)["loudest row: power of x"]
    refits = []
    for i in range(12):
        keep = np.arange(12) != i
        refits.append(fitted("y ~ x^p", rows_of(A_X[keep], A_Y[keep])).theta[0])
    assert got.row == int(np.argmax(np.abs(np.array(refits) - est.theta[0])))


def test_the_row_that_makes_the_bend_is_found_on_the_straight_line():
    x = np.linspace(1, 9, 40)
    y = 2 * x + np.random.default_rng(5).normal(0, 0.2, 40)
    y[39] += 6
    got = found("y ~ x", rows_of(x, y))["loudest row: left-over bend"]
    assert got.row == 39
    assert got.size < -0.8  # from 0.89 to 0.04
    assert got.reading.startswith("without row {row} the left-over bend would be up to ")


def test_a_constant_that_the_data_do_not_settle_is_not_named_by_a_row():
    assert "loudest row: power of x" not in found("y ~ x^p", A, unnamed=("power of x",))


def test_a_line_through_zero_is_checked_too():
    rows = Rows(y=A_Y, x=A_X, base=np.empty((12, 0)), modifier=np.ones((12, 1)), intercept=None, constant=False)
    got = found("y ~ x", rows)
    theirs = sm.OLS(A_Y, np.column_stack([A_X, A_X * np.log(A_X)])).fit()
    assert got["power of x"].test.statistic == pytest.approx(theirs.tvalues[1], rel=1e-8)
    assert got["rows in turn"].test.df == (10,)


# What a reader sees


@pytest.mark.parametrize(
    ("key", "rows"),
    [
        ("y ~ x", A), ("log y ~ log x", A), ("boxcox y ~ x", A), ("loglink y ~ x", A), ("y ~ bins3 x", WIDE),
        ("y ~ exponential x", A), ("y ~ fp2 x", B), ("asinh y ~ x", A), ("y ~ cut x", WIDE), ("1/y ~ 1/x", A),
    ],
)  # fmt: skip
@pytest.mark.parametrize("errors", ["robust", "constant"])
def test_no_p_stands_without_a_size_and_words(key, rows, errors):
    got = found(key, rows, errors=errors)
    assert len(got) == len(checks(fitted(key, rows), NAMES, (5.0, 10.0), errors=errors, labels=("one", "d")))
    for check in got.values():
        assert math.isfinite(check.size), check
        assert check.reading
        assert check.asked.endswith("?")
        assert "significan" not in check.reading
        if check.test is not None:
            assert 0 <= check.p <= 1
            assert "chance would give" in check.reading, check
    fewer = found(key, rows, errors=errors, every=False)
    assert set(fewer) < set(got)
    assert {"leverage"} <= set(fewer)


def test_the_reading_of_shape_or_spread_names_cures_cheapest_first():
    rng = np.random.default_rng(4)
    x = rng.uniform(1, 9, 3000)
    straight = rows_of(x, 5 + 2 * x + rng.normal(0, 1, 3000))
    assert found("y ~ x", straight)["shape or spread"].reading.endswith("Cheapest first: nothing to cure")
    bent = rows_of(x, 5 + x**2 + rng.normal(0, 1, 3000))
    assert found("y ~ x", bent)["shape or spread"].reading.endswith("Cheapest first: shape of x")
    both = rows_of(x, np.exp(0.5 * x + rng.normal(0, 0.2, 3000)))
    assert "Cheapest first: log link or scale of y" in found("y ~ x", both)["shape or spread"].reading
    assert "shape or spread" not in found("y ~ poly2 x", bent)


def test_covariates_are_taken_off_before_the_thirds():
    """A covariate's steps would bend the raw thirds."""
    rng = np.random.default_rng(7)
    x = np.sort(rng.uniform(1, 9, 300))
    d = (x > 6).astype(float)
    got = found("y ~ x", rows_of(x, 2 * x + 10 * d + rng.normal(0, 0.1, 300), d))["thirds along x"]
    assert got.size == pytest.approx(0, abs=0.1)
    assert A_D.sum() == 6


def test_the_share_of_a_mean_that_is_clipped_is_counted_pair_by_pair():
    """A square root whose fit plus a residual falls below zero stands for y = 0 there."""
    rng = np.random.default_rng(12)
    x = rng.uniform(1, 9, 50)
    rows = rows_of(x, np.maximum(0.3 * x + rng.normal(0, 0.8, 50), 0.02) ** 2)
    est = fitted("sqrt y ~ x", rows)
    pairs = est.eta[:, None] + est.residual < 0
    got = found("sqrt y ~ x", rows, every=False)["beyond the scale"]
    assert pairs.any()
    assert got.size == pytest.approx(100 * pairs.mean(), rel=1e-12)
    assert got.reading.endswith("leave what sqrt y can undo and count as 0 min")
    assert "beyond the scale" not in found("log y ~ x", A)
