"""Turning points: printed cases, inverted tests, and data that locate nothing."""

from __future__ import annotations

import numpy as np
import pytest
from data import B_X, B_Y
from scipy import stats

from batten.effects.turning import delta_std_error, fieller, flat_set, u_shape

#: Montgomery, Peck and Vining, Introduction to Linear Regression Analysis, example 7.1 (hardwood share, paper strength)
HARDWOOD = np.array([1, 1.5, 2, 3, 4, 4.5, 5, 5.5, 6, 6.5, 7, 8, 9, 10, 11, 12, 13, 14, 15])
STRENGTH = np.array(
    [6.3, 11.1, 20, 24, 26.1, 30, 33.8, 34, 38.1, 39.9, 42, 46.1, 53.1, 52, 52.5, 48, 42.8, 27.8, 21.9]
)  # fmt: skip


class Quadratic:
    """Least-squares quadratic in x - centre, with its covariance."""

    def __init__(self, x, y, centre=0.0):
        X = np.vander(x - centre, 3, increasing=True)
        self.b = np.linalg.lstsq(X, y, rcond=None)[0]
        self.df = len(x) - 3
        self.s2 = np.sum((y - X @ self.b) ** 2) / self.df
        self.V = self.s2 * np.linalg.inv(X.T @ X)
        self.t = float(stats.t.ppf(0.975, self.df))
        self.centre = centre

    def slopes(self, x):
        L = np.column_stack([np.zeros_like(x), np.ones_like(x), 2 * (x - self.centre)])
        return L @ self.b, np.sqrt(np.einsum("ij,jk,ik->i", L, self.V, L))

    @property
    def numbers(self):
        return {"v11": self.V[1, 1], "v12": self.V[1, 2], "v22": self.V[2, 2]}

    def fieller(self):
        return fieller(self.b[1], self.b[2], **self.numbers, critical=self.t, centre=self.centre)


B = Quadratic(B_X, B_Y)


def test_turning_point_of_the_set_with_a_bottom():
    """Fieller 1954; values computed apart."""
    assert B.b == pytest.approx([11.023629, -2.099673, 0.191047], rel=1e-5)
    found = B.fieller()
    assert found.estimate == pytest.approx(5.495189, rel=1e-6)
    assert found.g == pytest.approx(0.032970, rel=1e-4)
    assert (found.kind, found.located) == ("interval", True)
    assert found.pieces[0] == pytest.approx((5.223118, 5.749850), rel=1e-6)


def test_delta_interval_of_the_set_with_a_bottom():
    se = delta_std_error(B.b[1], B.b[2], **B.numbers)
    assert se == pytest.approx(0.119816, rel=1e-5)
    theta = B.fieller().estimate
    assert (theta - B.t * se, theta + B.t * se) == pytest.approx((5.236343, 5.754036), rel=1e-6)


def test_slope_and_its_error_of_the_set_with_a_bottom():
    slope, se = B.slopes(np.array([4.0]))
    assert slope[0] == pytest.approx(-0.571301, rel=1e-5)
    assert se[0] == pytest.approx(0.072035, rel=1e-4)


def test_both_ends_slope_apart():
    """Sasabuchi 1980; Lind and Mehlum 2010: p is the larger of the two one-sided ones."""
    slope, se = B.slopes(np.array([1.0, 11.0]))
    found = u_shape(slope[0], slope[1], se_low=se[0], se_high=se[1], df=B.df)
    assert (found.t_low, found.t_high) == pytest.approx((-10.797584, 12.053674), rel=1e-6)
    assert found.form == "valley"
    assert found.p == pytest.approx(3.667e-8, rel=1e-3)  # given to four digits


def test_value_at_the_turning_point():
    at = B.fieller().estimate
    row = np.array([1, at, at**2])
    assert row @ B.b == pytest.approx(5.254578, rel=1e-6)
    assert np.sqrt(row @ B.V @ row) == pytest.approx(0.207219, rel=1e-5)


def test_hardwood_share_of_strongest_paper():
    """Printed: coefficients 2.546 and -.635 about the mean 7.2632 (Montgomery, Peck and Vining, example 7.1).

    The turning point 9.269578, its Fieller interval 8.820116 to 9.843255 and the delta error 0.234373 were checked
    against inversion of the t test in R 4.2.
    """
    fit = Quadratic(HARDWOOD, STRENGTH, centre=HARDWOOD.mean())
    assert fit.b[1:] == pytest.approx([2.546, -0.635], abs=0.00051)
    found = fit.fieller()
    assert found.estimate == pytest.approx(9.269577701050393, rel=1e-8)
    assert found.pieces[0] == pytest.approx((8.820116246098358, 9.843254762188849), rel=1e-8)
    assert delta_std_error(fit.b[1], fit.b[2], **fit.numbers) == pytest.approx(0.23437315795029753, rel=1e-8)


@pytest.mark.parametrize("centre", [0.0, 7.0, -20.0])
def test_the_centre_is_undone(centre):
    found = Quadratic(HARDWOOD, STRENGTH, centre=centre).fieller()
    assert found.estimate == pytest.approx(9.269577701050393, rel=1e-8)
    assert found.pieces[0] == pytest.approx((8.820116246098358, 9.843254762188849), rel=1e-7)


def members(found, x):
    return np.any([(low <= x) & (x <= high) for low, high in found.pieces], axis=0)


@pytest.mark.parametrize("noise", [0.3, 4.0, 15.0, 40.0])
def test_the_set_is_every_place_where_a_zero_slope_is_not_rejected(noise):
    """Inverted t tests on a wide grid, whatever form the set takes."""
    rng = np.random.default_rng(int(noise))
    x = np.linspace(0, 10, 25)
    grid = np.linspace(-60, 70, 5001)
    for _ in range(30):
        fit = Quadratic(x, 0.4 * (x - 4) ** 2 + noise * rng.normal(size=25), centre=5.0)
        slope, se = fit.slopes(grid)
        clear = np.abs(np.abs(slope / se) - fit.t) > 1e-9
        assert np.array_equal(members(fit.fieller(), grid)[clear], (np.abs(slope / se) <= fit.t)[clear])


def test_all_three_forms_of_the_set_occur():
    rng = np.random.default_rng(0)
    x = np.linspace(0, 10, 25)
    kinds = {
        Quadratic(x, tilt * x + 0.1 * (x - 4) ** 2 + 4 * rng.normal(size=25)).fieller().kind
        for tilt in (0, 2)
        for _ in range(60)
    }
    assert kinds == {"interval", "everything", "outside an interval"}


def test_outside_of_an_interval_has_two_open_pieces_and_is_not_located():
    found = fieller(5.0, 0.1, v11=1.0, v12=0.0, v22=0.01, critical=2.0)
    assert found.kind == "outside an interval"
    assert not found.located
    (low, _), (_, high) = found.pieces
    assert (low, high) == (-np.inf, np.inf)
    assert found.g == pytest.approx(4.0)


def test_flat_data_are_said_not_to_locate_a_turning_point():
    """400 seeded sets without any curve: a set of finite length in no more than 5% and three standard errors."""
    rng = np.random.default_rng(33)
    x = np.linspace(0, 10, 30)
    located = sum(Quadratic(x, 3 + rng.normal(size=30), centre=5.0).fieller().located for _ in range(400))
    assert located <= 0.083 * 400


def test_the_set_covers_the_true_turning_point_where_the_delta_interval_does_not():
    """500 seeded weak quadratics: Fieller at 95% within three standard errors; delta intervals fall short."""
    rng = np.random.default_rng(4)
    x = np.linspace(0, 10, 30)
    exact = delta = 0
    for _ in range(500):
        fit = Quadratic(x, 0.02 * (x - 8) ** 2 + rng.normal(size=30), centre=5.0)
        found = fit.fieller()
        exact += bool(members(found, np.array([8.0]))[0])
        half = fit.t * delta_std_error(fit.b[1], fit.b[2], **fit.numbers)
        delta += abs(found.estimate - 8) <= half
    assert 0.92 * 500 <= exact <= 0.98 * 500
    assert delta < exact - 15


def test_no_square_no_turning_point():
    found = fieller(1.0, 0.0, v11=0.01, v12=0.0, v22=0.01, critical=2.0)
    assert np.isnan(found.estimate)
    assert not found.located


def test_an_exact_quadratic_turns_at_one_point():
    found = fieller(-4.0, 0.5, v11=0.0, v12=0.0, v22=0.0, critical=2.0)
    assert (found.estimate, found.kind) == (4.0, "interval")
    assert found.pieces[0] == pytest.approx((4.0, 4.0))


@pytest.mark.parametrize(
    ("low", "high", "form", "p"),
    [
        (-2.0, 3.0, "valley", stats.t.sf(2.0, 20)),
        (3.0, -1.0, "hill", stats.t.sf(1.0, 20)),
        (1.0, 3.0, "valley", stats.t.sf(-1.0, 20)),  # rises at both ends: no U
        (3.0, 1.0, "hill", stats.t.sf(-1.0, 20)),
    ],
)
def test_a_u_needs_both_ends(low, high, form, p):
    found = u_shape(low, high, se_low=1.0, se_high=1.0, df=20)
    assert (found.form, found.p) == (form, pytest.approx(p, rel=1e-12))


def test_the_flat_set_of_a_quadratic_is_its_fieller_set():
    found = flat_set(B.slopes, (1.0, 11.0), critical=B.t)
    assert found.located
    assert found.estimates == pytest.approx((5.495189,), rel=1e-6)
    assert found.pieces[0] == pytest.approx(B.fieller().pieces[0], rel=1e-9)


def test_the_flat_set_may_have_several_pieces():
    """Slope of a wave, sin x: turns at pi, 2 pi and 3 pi; flat where |sin x| <= 0.2 within (1, 10)."""
    found = flat_set(lambda x: (np.sin(x), np.full_like(x, 0.1)), (1.0, 10.0), critical=2.0)
    assert found.estimates == pytest.approx([np.pi, 2 * np.pi, 3 * np.pi], rel=1e-10)
    reach = np.arcsin(0.2)
    assert len(found.pieces) == 3
    for k, piece in enumerate(found.pieces, start=1):
        assert piece == pytest.approx((k * np.pi - reach, k * np.pi + reach), rel=1e-10)
    assert not found.located


def test_a_piece_that_runs_to_the_end_of_the_range_is_open_there():
    found = flat_set(lambda x: (x - 9.5, np.ones_like(x)), (0.0, 10.0), critical=2.0)
    assert (found.open_low, found.open_high, found.located) == (False, True, False)
    assert found.pieces == (pytest.approx((7.5, 10.0)),)
    flat = flat_set(lambda x: (0.1 * x, np.ones_like(x)), (0.0, 10.0), critical=2.0)
    assert flat.pieces == ((0.0, 10.0),)


def test_a_steep_turn_between_grid_points_is_not_missed():
    found = flat_set(lambda x: (1e6 * (x - np.e), np.ones_like(x)), (0.0, 10.0), critical=2.0, points=11)
    assert found.estimates == pytest.approx((np.e,), rel=1e-12)
    assert found.pieces[0] == pytest.approx((np.e - 2e-6, np.e + 2e-6), rel=1e-9)


def test_a_slope_that_jumps_turns_at_its_break_without_being_flat():
    found = flat_set(lambda x: (np.where(x < 4, -1.0, 1.0), np.full_like(x, 0.1)), (0.0, 10.0), critical=2.0)
    assert found.estimates == pytest.approx((4.0,), rel=1e-10)
    assert found.pieces == ()
    assert not found.located


def test_a_steady_curve_has_no_turning_point():
    found = flat_set(lambda x: (np.exp(x), np.full_like(x, 0.1)), (0.0, 3.0), critical=2.0)
    assert (found.estimates, found.pieces) == ((), ())
