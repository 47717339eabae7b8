"""The bulging rule, computed from medians of thirds."""

from __future__ import annotations

import numpy as np
import pytest
from two_sets import A_X, A_Y, B_X, B_Y, shuffled

from batten.diagnose.bulging import bulge
from batten.diagnose.repeats import even_groups, repeat_groups


def ratio(x, y):
    (xl, xm, xr), (yl, ym, yr) = x, y
    return (yr - ym) / (xr - xm) / ((ym - yl) / (xm - xl))


def test_thirds_of_the_nearly_straight_set():
    """Velleman and Hoaglin 1981; values computed apart."""
    found = bulge(A_X, A_Y)
    assert found.x == (2.5, 7, 16.5)
    assert found.y == pytest.approx((4.05, 12.15, 32.9), rel=1e-12)
    assert found.slopes == pytest.approx((1.8, 2.184211), rel=1e-6)
    assert found.ratio == pytest.approx(1.213450, rel=1e-6)
    assert found.power_y == pytest.approx(0.812467, rel=1e-6)
    assert (found.move_y, found.move_x) == ("down", "up")


@pytest.mark.parametrize(
    ("change_x", "change_y", "expected"),
    [
        (np.asarray, np.sqrt, 0.723494),
        (np.asarray, np.log, 0.429503),
        (lambda x: x**1.5, np.asarray, 0.769390),
        (np.square, np.asarray, 0.490544),
    ],
    ids=["root of y", "log of y", "x to 1.5", "square of x"],
)
def test_ratio_after_a_power(change_x, change_y, expected):
    found = bulge(A_X, A_Y)
    assert ratio(change_x(np.array(found.x)), change_y(np.array(found.y))) == pytest.approx(expected, rel=1e-5)


@pytest.mark.parametrize("sign", [1, -1])
@pytest.mark.parametrize("p", [-2, -0.5, 0, 0.5, 2, 3])
def test_a_pure_power_law_is_straightened_by_its_own_power(p, sign):
    """Noise-free odd thirds: y = power of x, then x = power of y; the logarithm counts as power 0."""
    x = np.linspace(1, 9, 15)
    powered = np.log(x) if p == 0 else np.sign(p) * x**p
    found = bulge(x, sign * powered)
    assert found.power_x == pytest.approx(p, abs=1e-9)
    turned = bulge(sign * powered, x)
    assert turned.power_y == pytest.approx(p, abs=1e-9)
    assert (found.direction, turned.direction) == (("rising", "rising") if sign == 1 else ("falling", "falling"))


@pytest.mark.parametrize(
    ("curve", "moves"),
    [
        (lambda x: np.exp(x / 4), ("down", "up")),
        (np.log, ("up", "down")),
        (lambda x: 100 - np.exp(x / 3), ("up", "up")),
        (lambda x: np.exp(-x / 3), ("down", "down")),
    ],
    ids=["steepening rise", "levelling rise", "steepening fall", "levelling fall"],
)
def test_each_bulge_points_along_its_ladders(curve, moves):
    """Mosteller and Tukey 1977; the moves are confirmed by the powers that straighten."""
    x = np.linspace(1, 10, 30)
    found = bulge(x, curve(x))
    assert (found.move_y, found.move_x) == moves
    assert (found.power_x < 1) == (found.move_x == "down")
    if found.power_y is not None:
        assert (found.power_y < 1) == (found.move_y == "down")
    assert found.reading == "bends"


def test_a_curve_that_turns_has_no_rung():
    found = bulge(B_X, B_Y)
    assert found.direction == "turning"
    assert found.ratio < 0
    assert (found.move_y, found.move_x, found.power_y, found.power_x) == ("none", "none", None, None)
    assert found.reading == "turns"


def test_a_power_beyond_the_ladder_is_not_invented():
    x = np.linspace(1, 2, 30)
    assert bulge(x, x**9).power_x is None
    assert bulge(x - 5, x).power_x is None
    assert bulge(x, x - 5).power_y is None


def test_few_rows_and_much_noise_say_that_the_ladder_cannot_tell():
    found = bulge(A_X, A_Y, rng=np.random.default_rng(0))
    assert found.reading == "cannot tell"
    assert found.ratio_range.low < 1 < found.ratio_range.high
    assert found.power_y_range.low < found.power_y < found.power_y_range.high
    assert found.turning_share < 0.05


def test_sixteen_rows_of_a_valley_may_not_settle_that_it_turns():
    found = bulge(B_X, B_Y, rng=np.random.default_rng(0))
    assert found.direction == "turning"
    assert 0.5 < found.turning_share < 0.95
    assert (found.reading, found.ratio_range, found.power_y_range) == ("cannot tell", None, None)


@pytest.mark.parametrize(
    ("curve", "reading"), [(np.square, "bends"), (lambda x: 3 * x, "straight"), (lambda x: (x - 5.5) ** 2, "turns")]
)
def test_many_rows_settle_the_reading(curve, reading):
    rng = np.random.default_rng(1)
    x = rng.uniform(1, 10, 400)
    y = curve(x)
    assert bulge(x, y + 0.05 * y.std() * rng.normal(size=400), rng=rng).reading == reading


def test_bootstrap_range_covers_the_true_power():
    """y = (1 + 0.5 x)^2 with noise on the root: power 0.5; 60 seeded sets, 95% ranges, three standard errors below."""
    rng = np.random.default_rng(5)
    covered = 0
    for _ in range(60):
        x = rng.uniform(0, 10, 90)
        found = bulge(x, (3 + 0.5 * x + 0.3 * rng.normal(size=90)) ** 2, rng=rng, resamples=200)
        covered += found.power_y_range.low <= 0.5 <= found.power_y_range.high
    assert covered >= 52


def test_rows_resampled_do_not_hang_on_the_stored_order():
    rows = shuffled(16, 7)
    here, there = (bulge(x, y, rng=np.random.default_rng(2)) for x, y in ((A_X, A_Y), (A_X[::-1], A_Y[::-1])))
    assert here == there
    assert bulge(B_X[rows], B_Y[rows]) == bulge(B_X, B_Y)


def test_units_move_nothing_but_the_slopes():
    here, there = bulge(A_X, A_Y), bulge(A_X * 1000, A_Y / 7)
    assert there.ratio == pytest.approx(here.ratio, rel=1e-12)
    assert (there.power_x, there.power_y) == pytest.approx((here.power_x, here.power_y), rel=1e-9)


def test_two_places_of_x_make_no_thirds():
    assert bulge(np.repeat([1.0, 2.0], 5), np.arange(10.0)) is None


def test_thirds_keep_ties_together_and_mirror():
    x = np.array([1, 1, 1, 1, 2, 3, 3, 4, 5, 6, 6], dtype=float)
    assert np.bincount(even_groups(x, 3)).tolist() == [4, 3, 4]
    assert (2 - even_groups(-x, 3)).tolist() == even_groups(x, 3).tolist()
    for value in np.unique(x):
        assert len(set(even_groups(x, 3)[x == value])) == 1


def test_thirds_of_heavily_tied_values_are_never_empty():
    for counts in ([10, 1, 1, 1], [1, 1, 1, 10], [1, 10, 1, 1], [1, 1, 1]):
        values = np.repeat(np.arange(len(counts), dtype=float), counts)
        assert sorted(set(even_groups(values, 3))) == [0, 1, 2]
    assert even_groups(np.array([1.0, 1, 2]), 3) is None


@pytest.mark.parametrize(("n", "sizes"), [(9, [3, 3, 3]), (10, [3, 4, 3]), (11, [4, 3, 4])])
def test_sizes_of_thirds_are_those_of_the_resistant_line(n, sizes):
    """Velleman and Hoaglin 1981: outer thirds of equal size, the middle takes or gives the odd row."""
    assert np.bincount(even_groups(np.arange(n, dtype=float), 3)).tolist() == sizes


def test_repeats_are_whole_rows_up_to_rounding():
    X = np.array([[1.0, 0.1 + 0.2], [1.0, 0.3], [1.0, 0.30001], [0.5, 0.3]])
    codes = repeat_groups(X)
    assert codes[0] == codes[1] != codes[2]
    assert codes.tolist() == [1, 1, 2, 0]
