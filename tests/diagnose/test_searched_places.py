"""Breaks and cuts found by looking: p-values that pay for the search."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.api as sm
from scipy import stats
from two_sets import A_X, A_Y, B_X, B_Y, line

from batten.diagnose.searched_places import candidate_places, davies, hinge_columns, place_t, searched_cut_p, sup_f

PLACES = candidate_places(B_X)
KINKS = hinge_columns(B_X, PLACES)


def test_candidate_places_are_even_steps_between_two_quantiles():
    low, high = np.quantile(B_X, [0.1, 0.9])
    assert len(PLACES) == 10
    assert (PLACES[0], PLACES[-1]) == (low, high)
    assert np.diff(PLACES) == pytest.approx((high - low) / 9)


def test_place_t_is_the_t_of_each_hinge_alone():
    t, df = place_t(line(B_X), KINKS, B_Y)
    assert df == 13
    for k in range(10):
        assert t[k] == pytest.approx(sm.OLS(B_Y, line(B_X, KINKS[:, k])).fit().tvalues[2], rel=1e-9)


def test_place_t_with_weights_is_the_weighted_t():
    w = 1 / B_X
    t, _ = place_t(line(B_X), KINKS, B_Y, weights=w)
    assert t[4] == pytest.approx(sm.WLS(B_Y, line(B_X, KINKS[:, 4]), weights=w).fit().tvalues[2], rel=1e-9)


def test_davies_of_the_set_with_a_bottom():
    """Davies 1987; values computed apart at ten places between the 10th and 90th percentile."""
    t, _ = place_t(line(B_X), KINKS, B_Y)
    found = davies(t)
    assert found.largest == pytest.approx(24.498100, rel=1e-6)
    assert found.variation == pytest.approx(43.794641, rel=1e-6)
    assert found.best == 5  # of ten places the nearest to the best break, 5.8955
    assert found.p < 1e-100


def test_davies_bound_by_hand():
    found = davies(np.array([0.5, -1.0, 2.2, 1.9]))
    by_hand = 2 * (stats.norm.sf(2.2) + (1.5 + 3.2 + 0.3) * np.exp(-(2.2**2) / 2) / np.sqrt(8 * np.pi))
    assert found.p == pytest.approx(by_hand, rel=1e-12)
    assert found.best == 2


def test_one_place_named_beforehand_pays_for_no_search():
    assert davies(np.array([-2.0])).p == pytest.approx(2 * stats.norm.sf(2.0), rel=1e-12)
    assert davies(np.array([-2.0]), df=7).p == pytest.approx(2 * stats.t.sf(2.0, 7), rel=1e-12)


def test_places_that_cannot_be_tested_are_passed_over():
    t, _ = place_t(line(B_X), hinge_columns(B_X, np.array([0.0, 5.0, 20.0])), B_Y)
    assert np.isfinite(t).tolist() == [False, True, False]
    assert davies(t).best == 1
    assert davies(np.array([np.nan])) is None


@pytest.mark.parametrize(("n", "df"), [(60, 57), (12, 9)])
def test_davies_keeps_its_level_where_the_naive_test_does_not(n, df):
    """1000 seeded straight lines, 20 places: the naive t at the best place rejects far above 5%, Davies does not.

    Limits are 5% and about three Monte Carlo errors (0.7 points each); twelve rows show that df matters.
    """
    rng = np.random.default_rng(17)
    naive = paid = raw = 0
    for _ in range(1000):
        x = np.sort(rng.uniform(0, 1, n))
        columns = hinge_columns(x, candidate_places(x, count=20))
        t, rest = place_t(line(x), columns, x + rng.normal(size=n))
        naive += 2 * stats.t.sf(np.max(np.abs(t)), rest) < 0.05
        paid += davies(t, df=df).p < 0.05
        raw += davies(t).p < 0.05
    assert naive > 120
    assert 20 <= paid <= 70
    assert raw > 80 or n > 12


def test_sup_f_of_the_set_with_a_bottom():
    """Largest F 600.156926 (Hansen 1996); no resample of a straight line comes near."""
    for wild in (True, False):
        found = sup_f(line(B_X), KINKS, B_Y, rng=np.random.default_rng(1), resamples=99, wild=wild)
        assert found.statistic == pytest.approx(600.156926, rel=1e-8)
        assert (found.p, found.best, found.resamples) == (0.01, 5, 99)


def test_sup_f_is_the_largest_squared_t():
    t, _ = place_t(line(A_X), hinge_columns(A_X, candidate_places(A_X)), A_Y)
    found = sup_f(line(A_X), hinge_columns(A_X, candidate_places(A_X)), A_Y, rng=np.random.default_rng(0), resamples=19)
    assert found.statistic == pytest.approx(np.max(t**2), rel=1e-10)


def test_sup_f_resamples_are_refits():
    """The quick resampling gives the same p as refitting every resample, sign by sign."""
    x, y, places = A_X, A_Y, candidate_places(A_X, count=5)
    quick = sup_f(line(x), hinge_columns(x, places), y, rng=np.random.default_rng(9), resamples=60)
    null = sm.OLS(y, line(x)).fit()
    inflated = null.resid / np.sqrt(1 - null.get_influence().hat_matrix_diag)
    signs = np.random.default_rng(9).choice(np.array([-1.0, 1.0]), size=(60, 12))
    fits = [null.fittedvalues + s * inflated for s in signs]
    largest = [np.max(place_t(line(x), hinge_columns(x, places), z)[0] ** 2) for z in fits]
    assert quick.p == (1 + np.sum(np.array(largest) >= quick.statistic)) / 61
    assert 0.02 < quick.p < 0.98


def test_sup_f_is_the_same_for_the_same_seed():
    p = [sup_f(line(A_X), A_X[:, None] ** 2, A_Y, rng=np.random.default_rng(3), resamples=199).p for _ in range(2)]
    assert p[0] == p[1]


@pytest.mark.parametrize("wild", [True, False])
def test_sup_f_p_is_near_uniform_under_a_straight_line(wild):
    """Kolmogorov-Smirnov on 200 seeded samples; for the wild version the spread grows with x."""
    rng = np.random.default_rng(23)
    x = np.linspace(1, 10, 40)
    columns = hinge_columns(x, candidate_places(x))
    p = [
        sup_f(line(x), columns, x + rng.normal(size=40) * (x if wild else 1), rng=rng, resamples=99, wild=wild).p
        for _ in range(200)
    ]
    assert stats.kstest(p, "uniform").pvalue > 0.01


def test_rows_of_a_cluster_share_a_sign():
    """With all rows in two clusters only four resamples exist, two of them the data and their mirror image."""
    cluster = np.repeat([0, 1], 8)
    found = sup_f(line(B_X), KINKS, B_Y, rng=np.random.default_rng(4), resamples=400, cluster=cluster)
    assert found.p == pytest.approx(0.5, abs=0.1)  # four standard errors of 400 coins


def test_nothing_to_search_gives_no_sup_f():
    rng = np.random.default_rng(0)
    assert sup_f(line(A_X), A_X[:, None], A_Y, rng=rng) is None
    assert sup_f(line(A_X), A_X[:, None] ** 2, 2 * A_X, rng=rng) is None
    assert sup_f(line(A_X[:3]), A_X[:3, None] ** 2, A_Y[:3], rng=rng) is None


def test_p_of_a_searched_cut():
    """Miller and Siegmund 1982 at z 2.5 between the 10th and 90th percentile; naive p .012419."""
    assert 2 * stats.norm.sf(2.5) == pytest.approx(0.012419, rel=1e-4)
    assert searched_cut_p(2.5) == pytest.approx(0.189802, rel=1e-5)
    assert searched_cut_p(-2.5) == searched_cut_p(2.5)


def test_the_quick_form_of_the_cut_correction_is_close():
    """Altman, Lausen, Sauerbrei and Schumacher 1994: -1.63 p (1 + 2.35 log p) for e = .10, with rounded constants."""
    for z, near in ((2.5, 0.01), (3.0, 0.02), (3.5, 0.04)):
        naive = 2 * stats.norm.sf(z)
        quick = -1.63 * naive * (1 + 2.35 * np.log(naive))
        assert searched_cut_p(z) == pytest.approx(quick, rel=near)
    assert -1.63 * 0.012419 * (1 + 2.35 * np.log(0.012419)) == pytest.approx(0.188527, rel=1e-4)


def test_p_of_a_searched_cut_is_the_share_found_on_noise():
    """2000 seeded sets of pure noise, all cuts between the 10th and 90th percentile of 400 rows.

    The approximation is for a continuous search: a finite one finds slightly less, so the limit above is wider.
    """
    rng = np.random.default_rng(6)
    y = rng.normal(size=(2000, 400))
    sums = np.cumsum(y, axis=1)[:, 39:360]
    k = np.arange(40, 361)
    z = (sums - k / 400 * y.sum(axis=1, keepdims=True)) / np.sqrt(k * (400 - k) / 400)
    for cut in (2.5, 3.0):
        found = np.mean(np.max(np.abs(z), axis=1) >= cut)
        assert searched_cut_p(cut) - 0.04 < found < searched_cut_p(cut) + 0.01


def test_a_searched_cut_never_beats_the_naive_p_and_never_passes_one():
    z = np.linspace(0, 6, 200)
    p = np.array([searched_cut_p(v) for v in z])
    assert np.all(p >= 2 * stats.norm.sf(z))
    assert p.max() == 1
    assert np.all(np.diff(p[z > 1.1]) < 0)


def test_a_narrower_search_costs_less():
    assert searched_cut_p(2.5, low=0.3, high=0.7) < searched_cut_p(2.5, low=0.1, high=0.9)
    assert searched_cut_p(2.5, low=0.1, high=0.7) == pytest.approx(searched_cut_p(2.5, low=0.3, high=0.9), rel=1e-12)
