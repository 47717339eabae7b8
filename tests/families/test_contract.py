"""What every member of every family must keep, whoever adds it: found by folder, tested alike."""

from __future__ import annotations

import pickle
import re
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from itertools import pairwise
from typing import Any

import numpy as np
import pytest
from members import (
    ALL_LINKS,
    ALL_SCALES,
    ALL_SHAPES,
    PREDICTORS,
    RESPONSES,
    central,
    run,
    scale_cases,
    scale_settings,
    shape_cases,
    shape_settings,
)

from batten.families import parse
from batten.families.base import Array, Constants, Link, Scale, Shape

SCALES, SHAPES = scale_cases(), shape_cases()


def on_scales(test: Callable[..., None]) -> Callable[..., None]:
    """Run a test on every scale with every sample it accepts, for several constants."""

    def each(scale: Scale, sample: str) -> None:
        for c in scale_settings(scale, sample):
            with noted(f"constants {c}"):
                test(scale, sample, c)

    return found_by_pytest(test, each, ("scale", "sample"), SCALES)


def on_shapes(test: Callable[..., None]) -> Callable[..., None]:
    """Run a test on every shape and curve with every sample it accepts, with and without a constant in the span."""

    def each(shape: Shape, sample: str) -> None:
        for constant, state, theta in shape_settings(shape, sample):
            with noted(f"constant {constant}, theta {theta}"):
                test(shape, sample, constant, state, theta)

    return found_by_pytest(test, each, ("shape", "sample"), SHAPES)


def found_by_pytest(
    test: Callable[..., None], each: Callable[..., None], arguments: tuple[str, str], cases: list[Any]
) -> Callable[..., None]:
    each.__name__, each.__doc__ = test.__name__, test.__doc__
    return pytest.mark.parametrize(arguments, cases, ids=[f"{member.key}-{name}" for member, name in cases])(each)


@contextmanager
def noted(setting: str) -> Iterator[None]:
    try:
        yield
    except Exception as error:
        error.add_note(setting)
        raise


on_links = pytest.mark.parametrize("link", ALL_LINKS, ids=lambda link: link.key)
MEMBERS = [*ALL_SCALES, *ALL_LINKS, *ALL_SHAPES]


def sealed(values: Array) -> Array:
    values = values.copy()
    values.setflags(write=False)
    return values


# Every member


@pytest.mark.parametrize("member", MEMBERS, ids=lambda m: m.key)
def test_a_member_is_frozen_pickles_and_reads_its_own_key(member: Any) -> None:
    assert pickle.loads(pickle.dumps(member)) == member
    assert hash(member) == hash(pickle.loads(pickle.dumps(member)))
    key = f"y ~ {member.key}" if isinstance(member, Shape) else f"{member.key} ~ x"
    found = parse(key)
    assert (found.shape if isinstance(member, Shape) else found.left) == member
    assert found.key == key


@pytest.mark.parametrize("member", MEMBERS, ids=lambda m: m.key)
def test_display_words_hold_the_users_name_and_no_placeholder(member: Any) -> None:
    words = member.words("{mass} & <b>")
    assert "{mass} & <b>" in words
    assert not re.search(r"\b[xy]\b", words.replace("{mass} & <b>", ""))


@pytest.mark.parametrize("member", MEMBERS, ids=lambda m: m.key)
def test_refusals_have_three_parts_that_end_as_sentences(member: Any) -> None:
    awkward = [
        np.zeros(12), np.full(12, -3.0), np.array([-1.0, 0.0, 1.0] * 4), np.full(12, 2.0), np.array([1.0, 2.0] * 6),
    ]  # fmt: skip
    for values in awkward:
        refusal = member.refuse(sealed(values))
        if refusal is not None:
            for part in (refusal.wrong, refusal.seen, refusal.instead):
                assert part[0] == part[0].upper() or part.split()[0] in refusal.instead
                assert part.endswith((".", " x.")), part


@pytest.mark.parametrize("member", MEMBERS, ids=lambda m: m.key)
@pytest.mark.parametrize("values", [[-3.0, -0.5, 2.0, 7.0, 9.0, 30.0], [0.0, 0.2, 0.4, 0.6, 0.9, 1.0],
                                    [-1.0, -2.0, -3.0, 0.0, -5.0, -6.0], [1.0, 2, 3, 4, 5, 6, 7, 8]])  # fmt: skip
def test_a_refusal_counts_the_values_that_are_not_taken(member: Scale | Shape | Link, values: list[float]) -> None:
    lost = int((~member.takes(sealed(np.array(values)))).sum())
    refusal = member.refuse(sealed(np.array(values)))
    if lost:
        assert refusal is not None
        assert str(lost) in refusal.seen or "above zero, " in refusal.seen  # a reciprocal counts both sides
    taken = np.array(values)[member.takes(np.array(values))]
    assert member.takes(sealed(taken)).all()


# Scales


@on_scales
def test_the_inverse_undoes_the_scale(scale: Scale, sample: str, c: Constants) -> None:
    y = sealed(RESPONSES[sample])
    z = scale.forward(y, c)
    assert np.isfinite(z).all()
    # a negative power squeezes large y towards its limit: up to (1 + max|y|)^2.5, about 300, roundings of 1e-16
    np.testing.assert_allclose(scale.inverse(sealed(z), c), y, rtol=1e-12, atol=1e-12)


@on_scales
def test_slopes_and_jacobian_are_reciprocals_of_each_other(scale: Scale, sample: str, c: Constants) -> None:
    y = RESPONSES[sample][RESPONSES[sample] != 0]
    slope = scale.inverse_slope(scale.forward(y, c), c)
    np.testing.assert_allclose(np.abs(slope) * np.exp(scale.log_jacobian(sealed(y), c)), 1, rtol=1e-11)


@on_scales
def test_slope_of_the_inverse_matches_finite_differences(scale: Scale, sample: str, c: Constants) -> None:
    y = RESPONSES[sample]
    z = scale.forward(y, c)
    low, high = scale.limits(c)
    # step: a thousandth of the distance to a limit or of the size of z, so that the inverse is smooth across it
    step = 1e-3 * np.minimum(1 + np.abs(z), np.minimum(z - low, high - z))
    inside = step > 0
    z, step = z[inside], step[inside]
    got = central(lambda at: scale.inverse(at, c), z, step)
    np.testing.assert_allclose(got, scale.inverse_slope(sealed(z), c), rtol=1e-8, atol=1e-9)


@on_scales
def test_interval_ends_keep_their_order_beyond_the_limits(scale: Scale, sample: str, c: Constants) -> None:
    """An interval for a new row is mapped end by end, so the inverse must stay monotone where it is clipped."""
    z = scale.forward(RESPONSES[sample], c)
    wide = np.linspace(z.min() - 5 * np.ptp(z), z.max() + 5 * np.ptp(z), 401)
    back = scale.inverse(wide, c)
    falling = scale.forward(np.sort(RESPONSES[sample]), c)[0] > scale.forward(np.sort(RESPONSES[sample]), c)[-1]
    if falling:  # a reciprocal: each side of zero on its own
        low, high = scale.limits(c)
        inside = (wide > low) & (wide < high)
        assert (np.diff(back[inside]) <= 0).all()
        assert np.isinf(back[~inside]).all()
    else:
        assert not np.isnan(back).any()
        assert (back[1:] >= back[:-1]).all()


@on_scales
def test_missing_values_stay_missing_on_a_scale(scale: Scale, sample: str, c: Constants) -> None:
    nothing = np.array([np.nan])
    assert np.isnan(scale.forward(nothing, c)).all()
    assert np.isnan(scale.inverse(nothing, c)).all()


@on_scales
def test_the_written_scale_agrees(scale: Scale, sample: str, c: Constants) -> None:
    y = RESPONSES[sample]
    z = scale.forward(y, c)
    wide = np.concatenate([z, np.linspace(z.min() - np.ptp(z), z.max() + np.ptp(z), 50)])
    got = run(scale.code("minutes", c), y=y, z=wide)
    np.testing.assert_allclose(got["z"], z, rtol=1e-12, atol=1e-12)
    np.testing.assert_allclose(got["inverse"], scale.inverse(wide, c), rtol=1e-12, atol=1e-12)
    assert got.get("check", True)


@on_scales
def test_a_change_of_units_is_absorbed_exactly_where_a_scale_says_so(scale: Scale, sample: str, c: Constants) -> None:
    """T(k y) = a + b T(y) means the same fit in other units; bounds of a logit are in units of y themselves."""
    if scale.family == "logit":
        return
    y = RESPONSES[sample]
    design = np.column_stack([np.ones_like(y), scale.forward(y, c)])
    z = scale.forward(1000 * y, c)
    residual = z - design @ np.linalg.lstsq(design, z, rcond=None)[0]
    absorbed = np.linalg.norm(residual) < 1e-9 * np.linalg.norm(z)
    straight = scale.family == "yeojohnson" and c == (1.0,)
    assert absorbed == (scale.unit_free or straight)


# Shapes


@on_shapes
def test_columns_slopes_and_names_have_one_size(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = sealed(PREDICTORS[sample])
    columns = shape.columns(x, state, theta)
    assert columns.shape[0] == len(x)
    assert np.isfinite(columns).all()
    assert columns.dtype == np.float64
    assert shape.slopes(x, state, theta).shape == columns.shape
    names = shape.names("mass_kg", state, theta)
    assert len(names) == columns.shape[1] == len(set(names))
    assert len(theta) == len(shape.searched) == len(shape.constant_words("mass_kg", "minutes"))
    assert isinstance(state, tuple)
    assert all(type(v) is float for v in state)


@on_shapes
def test_slopes_match_finite_differences(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    data = PREDICTORS[sample]
    if shape.steps:
        assert np.isnan(shape.slopes(data, state, theta)).all()
        return
    places = np.array([-state[0] if shape.group == "fractional" else 0.0, *(shape.cuts(state, theta) or ())])
    x = np.linspace(data.min(), data.max(), 60)[1:]  # a shifted power is flat below the lowest value
    step = np.minimum(1e-3 * np.ptp(x), 0.01 * np.abs(x[:, None] - places).min(axis=1))  # no cut within the stencil
    x, step = x[step > 1e-6 * np.ptp(x)], step[step > 1e-6 * np.ptp(x)]
    count = shape.columns(x[:1], state, theta).shape[1]
    got = np.column_stack(
        [central(lambda at, j=j: shape.columns(at, state, theta)[:, j], x, step) for j in range(count)]
    )
    exact = shape.slopes(sealed(x), state, theta)
    # relative to each column's largest slope or rise per range: the difference quotient knows no smaller scale
    size = np.maximum(np.abs(exact).max(axis=0), np.abs(shape.columns(x, state, theta)).max(axis=0) / np.ptp(x))
    np.testing.assert_allclose(got / size, exact / size, atol=1e-6)


@on_shapes
def test_theta_slopes_match_finite_differences(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = PREDICTORS[sample]
    exact = shape.theta_slopes(sealed(x), state, theta)
    if shape.finite or not theta:
        assert exact.shape == (0, *shape.columns(x, state, theta).shape)
        return
    low, high = shape.bounds(x, state)
    for j in range(len(theta)):
        step = 1e-4 * min(high[j] - low[j], abs(theta[j]) or 1.0)
        away = np.abs(x - theta[j]) > 3 * step if shape.family == "hinge" else np.full(len(x), True)

        def moved(t: Array, j: int = j) -> Array:
            return shape.columns(x, state, (*theta[:j], float(t[0]), *theta[j + 1 :]))

        got = central(moved, np.array([theta[j]]), np.array([step]))
        # below this size the difference quotient of the column holds rounding only
        rounding = 1e-9 * np.abs(shape.columns(x, state, theta)).max() / step
        size = max(np.abs(exact[j][away]).max(), rounding)
        np.testing.assert_allclose(got[away] / size, exact[j][away] / size, atol=1e-6)


@on_shapes
def test_new_rows_use_the_learned_state_alone(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = PREDICTORS[sample]
    order = np.random.default_rng(1).permutation(len(x))
    whole = shape.columns(x, state, theta)
    np.testing.assert_array_equal(shape.columns(x[order], state, theta), whole[order])
    np.testing.assert_array_equal(shape.columns(x[:3], state, theta), whole[:3])
    assert shape.learn(x[order], constant=constant) == state


@on_shapes
def test_missing_x_gives_missing_columns(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = np.array([PREDICTORS[sample][0], np.nan])
    columns = shape.columns(x, state, theta)
    assert np.isfinite(columns[0]).all()
    assert np.isnan(columns[1]).all()


@on_shapes
def test_far_outside_the_data_nothing_warns(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = PREDICTORS[sample]
    far = np.array([x.min() - 1000 * np.ptp(x), 0.0, -0.0, x.max() + 1000 * np.ptp(x)])
    for part in (shape.columns(far, state, theta), shape.slopes(far, state, theta)):
        assert not np.isinf(part).any()
    assert not np.isinf(shape.theta_slopes(far, state, theta)).any()


@on_shapes
def test_candidates_lie_within_their_bounds(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = sealed(PREDICTORS[sample])
    grid = shape.candidates(x, state)
    low, high = shape.bounds(x, state)
    assert grid.shape[1] == len(low) == len(high) == len(theta)
    assert len(np.unique(grid, axis=0)) == len(grid)
    assert (grid >= low).all()
    assert (grid <= high).all()


@on_shapes
def test_the_written_shape_agrees(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    x = PREDICTORS[sample]
    columns = shape.columns(x, state, theta)
    code = shape.code("mass_kg", state, theta)
    got = run(code, x=x)
    assert got.pop("check", True)
    assert len(got) == columns.shape[1]
    for j, column in enumerate(got.values()):
        size = np.abs(columns[:, j]).max()
        np.testing.assert_allclose(column, columns[:, j], rtol=1e-12, atol=1e-12 * size)
    missing = run(code, x=np.array([np.nan, x[0]]))
    missing.pop("check", None)
    assert all(np.isnan(column[0]) for column in missing.values())


@on_shapes
def test_a_change_of_units_of_x_keeps_the_span(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    """With a constant in the span, the candidates of x and of k x, one by one, describe the same curves.

    Places given by hand are in units of x; without a constant a log needs its unit.
    """
    if not constant or "(" in shape.key:
        return
    x, k = PREDICTORS[sample], 2.54
    other = shape.learn(k * x, constant=True)
    grid, moved = shape.candidates(x, state), shape.candidates(k * x, other)
    assert grid.shape == moved.shape
    for row in sorted({0, len(grid) // 3, len(grid) - 1}):
        left = with_level(shape, x, state, tuple(grid[row]))
        right = with_level(shape, k * x, other, tuple(moved[row]))
        # the smooth and high degrees are nearly collinear, so the projection itself keeps some 8 digits
        np.testing.assert_allclose(left @ np.linalg.lstsq(left, right, rcond=None)[0], right, atol=1e-7)


def with_level(shape: Shape, x: Array, state: Constants, theta: Constants) -> Array:
    columns = shape.columns(x, state, theta)
    columns = columns if shape.own_level else np.column_stack([np.ones_like(x), columns])
    return np.asarray(columns / np.linalg.norm(columns, axis=0))


@on_shapes
def test_between_cuts_every_column_is_a_cubic_or_less(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    cuts = shape.cuts(state, theta)
    if cuts is None:
        assert shape.penalty(state) is None
        return
    x = PREDICTORS[sample]
    ends = np.array([x.min() - np.ptp(x), *cuts, x.max() + np.ptp(x)])
    for low, high in pairwise(ends):
        inside = np.linspace(low, high, 9)[:-1]
        columns = shape.columns(inside, state, theta)
        size = np.abs(columns).max(axis=0) + 1e-300
        # fourth differences of a cubic vanish; eight-fold rounding of the columns remains
        np.testing.assert_allclose(np.diff(columns, n=4, axis=0) / size, 0, atol=1e-10)


@on_shapes
def test_a_penalty_is_a_quadratic_form_on_the_columns(
    shape: Shape, sample: str, constant: bool, state: Constants, theta: Constants
) -> None:
    penalty = shape.penalty(state)
    assert (penalty is not None) == (shape.group == "smooth")
    if penalty is not None:
        k = shape.columns(PREDICTORS[sample][:1], state, theta).shape[1]
        assert penalty.shape == (k, k)
        np.testing.assert_array_equal(penalty, penalty.T)
        assert np.linalg.eigvalsh(penalty).min() > -1e-12 * np.abs(penalty).max()


@pytest.mark.parametrize("shape", ALL_SHAPES, ids=lambda s: s.key)
def test_any_training_set_teaches_something(shape: Shape) -> None:
    """Down to a single row: a fold may be poor, but it must not fail or warn."""
    rng = np.random.default_rng(9)
    for sample, x in PREDICTORS.items():
        for size in (1, 2, 3, 4, 6, 9) if shape.refuse(x) is None else ():
            few = rng.choice(x, size)
            if "ties" in sample:
                few = np.sort(few)[:1].repeat(size)
            for constant in (True, False):
                state = shape.learn(few, constant=constant)
                low, high = shape.bounds(few, state)
                assert (low <= high).all()
                theta = tuple(float(t) for t in shape.candidates(few, state)[0])
                columns = shape.columns(x, state, theta)
                assert np.isfinite(columns).all()
                assert len(shape.names("mass", state, theta)) == columns.shape[1]
                assert shape.slopes(x, state, theta).shape == columns.shape
                penalty = shape.penalty(state)
                assert penalty is None or penalty.shape == (columns.shape[1],) * 2


@pytest.mark.parametrize("shape", ALL_SHAPES, ids=lambda s: s.key)
def test_zeros_alone_in_a_training_set_teach_something(shape: Shape) -> None:
    x = np.concatenate([np.zeros(30), np.arange(1.0, 13)])
    if shape.refuse(x) is None:
        state = shape.learn(np.zeros(5))
        theta = tuple(float(t) for t in shape.candidates(np.zeros(5), state)[0])
        assert np.isfinite(shape.columns(x, state, theta)).all()


# Links


def etas(link: Link) -> Array:
    """Linear predictors that have a mean."""
    return np.linspace(-4, 4, 41) if np.isfinite(link.mean(np.array([-4.0]))).all() else np.linspace(0.2, 4, 41)


@on_links
def test_a_links_mean_slope_matches_finite_differences(link: Link) -> None:
    eta = sealed(etas(link))
    got = central(link.mean, eta, 1e-3 * np.minimum(1.0, np.abs(eta) + (eta == 0)))
    np.testing.assert_allclose(got, link.mean_slope(eta), rtol=1e-9)
    # monotone, so that a turning point of eta is one of the mean
    assert len(set(np.sign(link.mean_slope(eta)))) == 1


@on_links
def test_a_deviance_is_zero_at_a_perfect_fit_and_falls_towards_it(link: Link) -> None:
    """Its slope in mu is -2 (y - mu) / V(mu), the quasi-score (Wedderburn 1974)."""
    y, mu = RESPONSES["share"], RESPONSES["share"][::-1].copy()
    np.testing.assert_allclose(link.deviance(y, y), 0, atol=1e-14)
    got = central(lambda at: link.deviance(y, at), mu, 1e-3 * np.minimum(mu, 1 - mu))
    np.testing.assert_allclose(got, -2 * (y - mu) / link.variance(mu), rtol=1e-7, atol=1e-9)
    assert (link.deviance(y, mu) >= 0).all()


@on_links
def test_a_links_start_has_means_and_follows_y_or_is_its_mean(link: Link) -> None:
    y = np.concatenate([[0.0, 1.0], RESPONSES["share"]])
    mu = link.mean(link.start(sealed(y)))
    assert np.isfinite(mu).all()
    follows = np.ptp(mu) > 0 and np.corrcoef(mu, y)[0, 1] > 0.9
    assert follows or mu == pytest.approx(np.full(len(y), y.mean()), rel=1e-12)


@on_links
def test_the_written_link_agrees(link: Link) -> None:
    eta = np.linspace(-4, 4, 41)
    got = run(link.code("minutes"), y=RESPONSES["share"], z=eta)
    np.testing.assert_allclose(got["inverse"], link.mean(eta), rtol=1e-12)  # missing where it is missing
    assert got.get("check", True)
    assert link.refuse(RESPONSES["share"]) is None
