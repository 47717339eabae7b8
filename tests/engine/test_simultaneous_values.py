"""Critical values of bands for whole curves: limits known exactly, draws, and values computed apart."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from batten.engine.simultaneous import (
    critical,
    drawn_critical,
    path,
    path_length,
    scheffe_critical,
    tube_critical,
)

X = np.array([1, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11], dtype=float)
DESIGN = np.vander(X, 3, increasing=True)
V = 0.311271 * np.linalg.inv(DESIGN.T @ DESIGN)
GRID = np.linspace(1, 11, 401)
CURVE = np.vander(GRID, 3, increasing=True)
SLOPE = np.column_stack([np.zeros_like(GRID), np.ones_like(GRID), 2 * GRID])


def test_slope_band_of_a_quadratic():
    """Scheffe 1959; Sun and Loader 1994; values computed apart. The path nearly closes, so Scheffe's is smaller."""
    found = critical(SLOPE, V, df=13)
    assert found.dimension == 2
    assert found.scheffe == pytest.approx(2.758828, rel=1e-6)
    assert found.length == pytest.approx(2.593449, rel=1e-6)
    assert found.tube == pytest.approx(2.837119, rel=1e-6)
    assert found.value == found.scheffe


def test_band_of_a_quadratic():
    found = critical(CURVE, V, df=13)
    assert found.dimension == 3
    assert found.scheffe == pytest.approx(3.198687, rel=1e-6)
    assert found.length == pytest.approx(3.760666, rel=1e-5)  # five digits of the length need 1,000 places
    assert found.tube == pytest.approx(2.993452, rel=1e-5)
    assert found.value == found.tube


@pytest.mark.parametrize(("rows", "elsewhere"), [(SLOPE, 2.759), (CURVE, 2.956)], ids=["slope", "curve"])
def test_draws_give_the_value_of_an_independent_simulation(rows, elsewhere):
    """Both from draws of the maximum: with 20,000 draws and over the standard error of a 95% point is about 0.015."""
    found = drawn_critical(rows[::10], V, df=13, rng=np.random.default_rng(0), draws=50_000)
    assert found == pytest.approx(elsewhere, abs=0.03)


@pytest.mark.parametrize("df", [6, 13, np.inf])
@pytest.mark.parametrize("rows", [SLOPE, CURVE], ids=["slope", "curve"])
def test_draws_stay_below_the_bound_and_near_it(rows, df):
    """The bound counts paths that meet twice; with few degrees of freedom that costs up to 5%."""
    drawn = drawn_critical(rows[::10], V, df=df, rng=np.random.default_rng(1))
    bound = critical(rows, V, df=df).value
    assert bound * 0.95 < drawn < bound + 0.05


def test_a_path_of_one_point_needs_only_the_t_quantile():
    assert tube_critical(0.0, df=13) == pytest.approx(stats.t.ppf(0.975, 13), rel=1e-10)
    assert tube_critical(0.0, df=np.inf, level=0.9) == pytest.approx(stats.norm.ppf(0.95), rel=1e-10)
    assert scheffe_critical(1, df=13) == pytest.approx(stats.t.ppf(0.975, 13), rel=1e-10)


def test_many_degrees_of_freedom_approach_the_normal_case():
    for rows in (SLOPE, CURVE):
        near, limit = critical(rows, V, df=1e7), critical(rows, V, df=np.inf)
        assert (near.scheffe, near.tube) == pytest.approx((limit.scheffe, limit.tube), rel=1e-5)


def test_scheffe_in_two_dimensions_has_a_closed_form():
    """P(chi-square on 2 > c^2) = exp(-c^2 / 2)."""
    assert scheffe_critical(2, df=np.inf) == pytest.approx(np.sqrt(-2 * np.log(0.05)), rel=1e-10)


def test_a_straight_line_over_all_x_turns_through_half_a_circle():
    """Working and Hotelling's case: u and -u are one combination, so the length is pi and Scheffe's value is exact."""
    x = np.tan(np.linspace(-np.pi / 2, np.pi / 2, 2001)[1:-1])
    found = critical(np.column_stack([np.ones_like(x), x]), np.diag([2.0, 0.5]), df=20)
    assert found.length == pytest.approx(np.pi, abs=0.01)
    assert found.value == found.scheffe == pytest.approx(np.sqrt(2 * stats.f.ppf(0.95, 2, 20)), rel=1e-10)


def test_the_length_hardly_depends_on_the_grid_and_not_on_centring_or_units():
    whole = path_length(path(CURVE, V))
    assert path_length(path(CURVE[::20], V)) == pytest.approx(whole, rel=1e-3)
    moved = np.vander((GRID - 6) * 1000, 3, increasing=True)
    design = np.vander((X - 6) * 1000, 3, increasing=True)
    assert path_length(path(moved, np.linalg.inv(design.T @ design))) == pytest.approx(whole, rel=1e-7)


def test_a_jump_costs_no_more_than_the_short_way_round():
    turn = np.array([[1.0, 0.0], [-0.99, -np.sqrt(1 - 0.99**2)]])
    assert path_length(turn) == pytest.approx(np.arccos(0.99), rel=1e-10)


def test_places_without_variance_are_left_out():
    rows = np.column_stack([np.ones(50), np.linspace(0, 5, 50)])
    fixed_at_nought = np.diag([0.0, 0.3])
    found = critical(rows, fixed_at_nought, df=10)
    assert found.dimension == 1
    assert found.value == pytest.approx(stats.t.ppf(0.975, 10), rel=1e-9)
    assert drawn_critical(rows[:1], fixed_at_nought, df=10, rng=np.random.default_rng(0)) == 0


def test_bands_cover_whole_curves_as_often_as_they_say():
    """600 seeded quadratics, 95%: at least 95% less three standard errors, at most what the bound's slack allows."""
    rng = np.random.default_rng(7)
    truth = np.array([11.0, -2.0, 0.19])
    inverse = np.linalg.inv(DESIGN.T @ DESIGN)
    c = critical(CURVE, inverse, df=13).value
    covered = 0
    for _ in range(600):
        y = DESIGN @ truth + rng.normal(size=16)
        b = inverse @ DESIGN.T @ y
        s = np.sqrt(np.sum((y - DESIGN @ b) ** 2) / 13)
        se = s * np.sqrt(np.einsum("ij,jk,ik->i", CURVE, inverse, CURVE))
        covered += bool(np.all(np.abs(CURVE @ (b - truth)) <= c * se))
    assert 0.923 * 600 <= covered <= 0.985 * 600


def test_the_same_seed_draws_the_same_value():
    values = {drawn_critical(CURVE[::40], V, df=13, rng=np.random.default_rng(5), draws=4000) for _ in range(3)}
    assert len(values) == 1
