"""Turning points: exact sets for quadratics, sets for other curves, and plain words where there is none."""

from __future__ import annotations

import numpy as np
import pytest
from data import A_X, A_Y, B_X, B_Y, fitted, rows_of
from scipy.stats import t as student

from batten.effects.profile import profile_of_shape
from batten.effects.turn import NOT_LOCATED, turning_point
from batten.engine.rows import Rows

A, B = rows_of(A_X, A_Y), rows_of(B_X, B_Y)
# Montgomery, Peck and Vining, Introduction to Linear Regression Analysis, Example 7.1
HARDWOOD_X = [1, 1.5, 2, 3, 4, 4.5, 5, 5.5, 6, 6.5, 7, 8, 9, 10, 11, 12, 13, 14, 15]
HARDWOOD_Y = [
    6.3, 11.1, 20, 24, 26.1, 30, 33.8, 34, 38.1, 39.9, 42, 46.1, 53.1, 52, 52.5, 48, 42.8, 27.8, 21.9,
]  # fmt: skip


def test_the_vertex_of_a_quadratic_and_its_exact_set():
    """Fieller 1954, delta error, ends (Lind and Mehlum 2010); closed forms computed apart."""
    found = turning_point(fitted("y ~ poly2 x", B), errors="constant", unit="kg")
    assert found.estimate == pytest.approx(5.495189, abs=5e-7)
    np.testing.assert_allclose(found.pieces, [(5.223118, 5.749850)], atol=1e-6)
    assert found.std_error == pytest.approx(0.119816, abs=1e-6)
    assert (found.ends.t_low, found.ends.t_high) == pytest.approx((-10.797584, 12.053674), abs=1e-6)
    assert found.ends.p == pytest.approx(3.667e-8, rel=1e-3)
    assert found.located
    assert found.reading == "lowest at 5.50 kg (95% interval 5.22 to 5.75 kg)"
    assert found.height.estimate == pytest.approx(5.254578, abs=5e-7)
    assert (found.height.high - found.height.estimate) / student.ppf(0.975, 13) == pytest.approx(0.207219, abs=1e-6)


def test_the_hardwood_maximum_lies_where_the_published_fit_puts_it():
    """-b1 / (2 b2) of the published coefficients 2.546 and -0.635 about the mean 7.2632; the set by Fieller, apart."""
    est = fitted("y ~ poly2 x", rows_of(np.array(HARDWOOD_X), np.array(HARDWOOD_Y)))
    found = turning_point(est, errors="constant", unit="%")
    assert found.estimate == pytest.approx(7.2632 + 2.546 / (2 * 0.635), abs=0.01)
    assert found.estimate == pytest.approx(9.269577701050393, rel=1e-9)
    np.testing.assert_allclose(found.pieces, [(8.820116246098358, 9.843254762188849)], rtol=1e-8)
    assert found.reading == "highest at 9.27% (95% interval 8.82 to 9.84%)"


@pytest.mark.parametrize("key", ["log y ~ poly2 x", "sqrt y ~ poly2 x", "1/y ~ poly2 x", "loglink y ~ poly2 x"])
def test_a_transformed_response_is_lowest_where_the_mean_curve_is(key):
    from batten.fit.means import averaged_means

    est = fitted(key, B)
    found = turning_point(est)
    around = averaged_means(est, found.estimate + np.array([-0.5, 0.0, 0.5])).value
    assert found.form == "lowest"
    assert around[1] < min(around[0], around[2])


def test_flat_data_locate_no_turning_point_in_at_least_95_of_100_simulations():
    rng = np.random.default_rng(11)
    x = np.linspace(1, 10, 30)
    located = sum(
        turning_point(fitted("y ~ poly2 x", rows_of(x, rng.normal(size=30))), errors="constant").located
        for _ in range(200)
    )  # fmt: skip
    assert located <= 10


def test_a_quadratic_that_hardly_bends_says_so():
    found = turning_point(fitted("y ~ poly2 x", A), unit="kg")
    assert not found.located
    assert found.reading == NOT_LOCATED
    assert len(found.pieces) == 2


def test_a_vertex_beyond_the_data_is_not_located_inside_them():
    x = np.linspace(1, 6, 20)
    y = (x - 8) ** 2 + 0.05 * np.sin(np.arange(20.0))
    found = turning_point(fitted("y ~ poly2 x", rows_of(x, y)), unit="kg")
    assert found.estimate == pytest.approx(8, abs=0.1)
    assert not found.located
    assert found.reading.startswith("no turning point inside the data: it would lie at 7.9")


def test_a_broken_line_turns_at_its_break_with_the_breaks_own_set():
    est = fitted("y ~ hinge x", B)
    found = turning_point(est, errors="constant", unit="kg")
    assert found.estimate == est.theta[0]
    assert found.pieces == profile_of_shape(est).pieces
    assert found.located
    assert found.reading == "lowest at 5.90 kg (95% interval 5.61 to 6.27 kg)"
    given = turning_point(fitted("y ~ hinge(6) x", B), unit="kg")
    assert given.pieces == ((6.0, 6.0),)


def test_a_broken_line_that_only_steepens_does_not_turn():
    x = np.linspace(0, 10, 30)
    y = x + 2 * np.maximum(x - 6, 0) + 0.1 * np.sin(np.arange(30.0) * 5)
    found = turning_point(fitted("y ~ hinge x", rows_of(x, y)), unit="kg")
    assert not found.located
    assert found.reading == "no turning point: the slope keeps its sign from 0 to 10 kg"


@pytest.mark.parametrize("key", ["y ~ spline4 x", "y ~ poly3 x", "log y ~ spline3 x"])
def test_other_curves_have_the_set_where_the_simultaneous_band_of_the_slope_holds_zero(key):
    found = turning_point(fitted(key, B), errors="constant", unit="kg")
    assert found.located
    ((low, high),) = found.pieces
    assert low < found.estimate < high
    quadratic = turning_point(fitted("y ~ poly2 x", B), errors="constant")
    # a band for the whole curve is wider than one place's interval
    assert high - low > 0.3 * (quadratic.pieces[0][1] - quadratic.pieces[0][0])


@pytest.mark.parametrize(
    ("key", "reading"),
    [
        ("y ~ x", "this shape cannot turn inside the data"),
        ("log y ~ log x", "this shape cannot turn inside the data"),
        ("y ~ bins3 x", "groups have no turning point"),
        ("y ~ exponential x", "this shape cannot turn inside the data"),
    ],
)
def test_shapes_that_cannot_turn_say_so(key, reading):
    found = turning_point(fitted(key, A))
    assert (found.reading, found.located, found.pieces) == (reading, False, ())
    assert np.isnan(found.estimate)


def test_under_an_interaction_the_averaged_curve_is_asked():
    group = np.array([0.0, 1.0] * 8)
    base = np.column_stack([np.ones(16), group])
    rows = Rows(y=B_Y + group * B_X, x=B_X, base=base, modifier=np.column_stack([np.ones(16), group]))
    est = fitted("y ~ poly2 x", rows)
    found = turning_point(est, errors="constant")
    # average of the two groups' slopes, by hand
    b = est.coef[2:] @ np.kron([[1], [group.mean()]], np.eye(2))
    assert found.estimate == pytest.approx(-b[0] / (2 * b[1]) + est.state[0], rel=1e-6)
