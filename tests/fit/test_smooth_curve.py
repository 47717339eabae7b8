"""The smooth curve as a remedy: what is counted, its errors, its invariances, interactions, average coverage."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import t as student

from batten.engine.linear import design
from batten.engine.penalised import joined, smooth
from batten.engine.rows import Rows
from batten.errors import Refusal
from batten.families import parse
from batten.fit.averaged import interval
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means
from batten.fit.predict import new_row_interval, predict, total
from batten.fit.slopes import averaged_slopes
from batten.fit.smoothing import roughness_rows

PLACES = np.array([1.5, 4.0, 7.0, 11.0])


def rows(n: int = 80, seed: int = 0, noise: float = 0.6) -> Rows:
    rng = np.random.default_rng(seed)
    x, g = rng.uniform(1, 12, n), (rng.random(n) < 0.4).astype(float)
    y = 8 + 2 * np.sin(x / 2) + g + rng.normal(0, noise, n)
    return Rows(y, x, np.column_stack([np.ones(n), g]), np.ones((n, 1)))


def crossed(data: Rows) -> Rows:
    return replace(data, modifier=data.base.copy())


def fit(data: Rows, key: str = "y ~ smooth x") -> Estimate:
    done = estimate(data, parse(key))
    assert isinstance(done, Estimate), done
    return done


def dense(est: Estimate) -> tuple[np.ndarray, np.ndarray]:
    """The design and (X'X + penalty)^-1."""
    x = est.design_at(est.rows.x, est.rows.base, est.rows.modifier)
    assert est.roughness is not None
    return x, np.linalg.inv(x.T @ x + est.roughness.rows.T @ est.roughness.rows)


@pytest.mark.parametrize("key", ["y ~ smooth x", "log y ~ smooth x", "sqrt y ~ smooth x", "boxcox(0.3) y ~ smooth x"])
def test_effective_degrees_of_freedom_are_counted(key: str) -> None:
    est = fit(rows(), key)
    x, inverse = dense(est)
    edf = np.trace(inverse @ x.T @ x)
    assert est.leverage.sum() == pytest.approx(edf, rel=1e-8)
    assert est.df_residual == pytest.approx(80 - edf, rel=1e-9)
    assert est.parameters == pytest.approx(edf + 1, rel=1e-9)
    assert est.sigma**2 == pytest.approx(est.residual @ est.residual / (80 - edf), rel=1e-9)
    k, likelihood = edf + 1, est.log_likelihood
    assert likelihood is not None
    # Hurvich and Tsai 1989
    assert est.aicc == pytest.approx(-2 * likelihood + 2 * k + 2 * k * (k + 1) / (80 - k - 1), rel=1e-9)


def test_errors_count_noise_and_what_smoothing_takes() -> None:
    """Constant errors: s2 (X'X + penalty)^-1 (Nychka 1988). Robust ones replace its part that stems from the errors,
    s2 A X'X A, by HC3 (MacKinnon and White 1985) and keep the other, s2 A penalty A."""
    est = fit(rows())
    x, inverse = dense(est)
    assert est.roughness is not None
    penalty = est.roughness.rows.T @ est.roughness.rows
    np.testing.assert_allclose(est.covariance("constant"), est.sigma**2 * inverse, rtol=1e-6, atol=1e-12)
    bread = x @ inverse * (est.residual / (1 - est.leverage))[:, None]
    robust = bread.T @ bread + est.sigma**2 * inverse @ penalty @ inverse
    np.testing.assert_allclose(est.covariance("robust"), robust, rtol=1e-6, atol=1e-12)


def test_moves_equal_refits_with_the_same_knots_and_amount() -> None:
    est = fit(rows())
    moves, (x, _) = est.moves(), dense(est)
    d = roughness_rows(est.rows, est.shape, est.state)
    assert d is not None
    assert est.roughness is not None
    for i in (0, 33, 79):
        rest = np.arange(80) != i
        again = smooth(x[rest], joined(x[rest], d), est.z[rest], d, log_amount=np.log(est.roughness.amount))
        np.testing.assert_allclose(est.coef + moves[i], again.coef, rtol=1e-8, atol=1e-9)


@pytest.mark.parametrize("key", ["y ~ smooth x", "log y ~ smooth x"])
def test_left_out_means_lie_near_refits_that_choose_everything_again(key: str) -> None:
    """Knots and amount are held while rows are left out; choosing them again moves a mean by less than its error."""
    data = rows()
    est = fit(data, key)
    held = averaged_means(est, PLACES)
    for i in range(0, 80, 8):
        again = fit(data.take(np.arange(80) != i), key)
        moved = averaged_means(again, PLACES, root=False).value - held.value
        assert (np.abs(moved) < held.error).all()


def test_units_and_order_of_rows_change_nothing() -> None:
    data = rows()
    order = np.random.default_rng(1).permutation(80)
    est, mixed = fit(data), fit(data.take(order))
    other = fit(replace(data, y=1e3 * data.y, x=2.54 * data.x))
    one, two, three = (averaged_means(e, p) for e, p in ((est, PLACES), (mixed, PLACES), (other, 2.54 * PLACES)))
    np.testing.assert_allclose(two.value, one.value, rtol=1e-9)
    np.testing.assert_allclose(three.value, 1e3 * one.value, rtol=1e-9)
    np.testing.assert_allclose(two.error, one.error, rtol=1e-7)
    np.testing.assert_allclose(three.error, 1e3 * one.error, rtol=1e-7)


def test_each_group_has_a_curve_of_its_own_however_it_is_coded() -> None:
    data = rows(120)
    g = data.base[:, 1]
    est = fit(crossed(data))
    own = np.column_stack([1 - g, g])
    other = fit(replace(data, base=own, modifier=own, intercept=None))
    np.testing.assert_allclose(other.eta, est.eta, rtol=1e-9)
    assert other.parameters == pytest.approx(est.parameters, rel=1e-9)
    # with one weight the two curves are fitted side by side
    assert est.roughness is not None
    for level in (0.0, 1.0):
        some = g == level
        part = data.take(some)
        part = replace(part, base=part.base[:, :1])
        x = design(part, est.shape.columns(part.x, est.state))
        d = roughness_rows(part, est.shape, est.state)
        assert d is not None
        alone = smooth(x, joined(x, d), part.y, d, log_amount=np.log(est.roughness.amount))
        np.testing.assert_allclose(part.y - alone.residual, est.eta[some], rtol=1e-9)


def test_a_group_within_a_narrow_range_is_held_by_the_penalty() -> None:
    data = rows(120)
    low = np.where(data.base[:, 1] == 1, 2 + data.x / 10, data.x)
    est = fit(crossed(replace(data, x=low)))
    assert np.isfinite(est.eta).all()
    assert np.linalg.matrix_rank(est.design_at(low, data.base, est.rows.modifier)) < len(est.coef)


def test_more_columns_than_rows_are_held_by_the_penalty() -> None:
    """Eight groups of ten rows, each with its curve: 8 + 8 x 13 columns on 80 rows."""
    data = rows(80)
    own = np.eye(8)[np.arange(80) % 8]
    est = fit(replace(data, base=own, modifier=own, intercept=None))
    assert len(est.coef) == 112
    assert 16 < est.parameters < 60
    x, inverse = dense(est)
    assert est.leverage.sum() == pytest.approx(np.trace(inverse @ x.T @ x), rel=1e-6)
    assert np.isfinite(averaged_means(est, PLACES).error).all()


def test_a_curve_through_every_row_is_refused() -> None:
    x = np.arange(8.0)
    data = Rows(10 * np.cos(x), x, np.ones((8, 1)), np.ones((8, 1)))
    found = estimate(data, parse("y ~ smooth x"))
    assert isinstance(found, Refusal)
    assert "runs through the rows" in found.wrong


def test_without_intercept_a_line_is_free_and_the_rest_is_held() -> None:
    data = rows()
    est = fit(replace(data, base=np.empty((80, 0)), intercept=None, constant=False))
    x, inverse = dense(est)
    assert est.leverage.sum() == pytest.approx(np.trace(inverse @ x.T @ x), rel=1e-8)
    line = fit(replace(data, y=3 * data.x, base=np.empty((80, 0)), intercept=None, constant=False))
    np.testing.assert_allclose(line.eta, 3 * data.x, rtol=1e-10)


def test_variance_weights_are_repeated_rows_up_to_the_error_variance() -> None:
    """Twice the weight is the row twice; the restricted likelihood counts rows, so the amount differs a little."""
    data = rows()
    est = fit(replace(data, weights=np.ones(80)))
    np.testing.assert_allclose(est.eta, fit(data).eta, rtol=1e-12)
    w = np.linspace(0.5, 1.5, 80)
    weighted = fit(replace(data, weights=w / w.mean()))
    x = weighted.rows.weigh(weighted.design_at(data.x, data.base, data.modifier))
    assert weighted.roughness is not None
    r = weighted.roughness.rows
    coef = np.linalg.solve(x.T @ x + r.T @ r, x.T @ weighted.z)
    np.testing.assert_allclose(x @ coef, weighted.rows.weigh(weighted.eta), rtol=1e-8)


@pytest.mark.parametrize("key", ["y ~ smooth x", "log y ~ smooth x"])
def test_intervals_count_smoothing_once(key: str) -> None:
    """Leaving rows out and their influence agree, and exceed the noise alone; so do constant errors where spread is
    even, up to the sample's own unevenness."""
    est = fit(rows(400, noise=0.5), key)
    jack, influence = averaged_means(est, PLACES), averaged_means(est, PLACES, jackknife=False)
    np.testing.assert_allclose(jack.error, influence.error, rtol=0.05)
    if key == "y ~ smooth x":
        np.testing.assert_allclose(averaged_means(est, PLACES, errors="constant").error, jack.error, rtol=0.25)
    noise = replace(jack, bias=None)
    assert (noise.error < jack.error).all()
    gap = jack.combine(np.array([[1.0], [-1], [0], [0]]))
    root = jack.root[:, 0] - jack.root[:, 1]
    assert gap.error[0] == pytest.approx(np.sqrt(root @ root), rel=1e-12)


def test_bands_cover_on_average_along_the_curve() -> None:
    """Nychka 1988: 95% pointwise bands hold the true curve at some 95% of its places, on average."""
    truth = 8 + 2 * np.sin(np.linspace(1.5, 11.5, 21) / 2)
    held = []
    for seed in range(60):
        data = rows(90, seed=seed, noise=1.0)
        data = replace(data, y=data.y - data.base[:, 1], base=data.base[:, :1])
        low, high = interval(averaged_means(fit(data), np.linspace(1.5, 11.5, 21)), 0.95)
        held.append(((low < truth) & (truth < high)).mean())
    # 60 samples of 21 dependent places: a standard error of about 0.01
    assert 0.93 < np.mean(held) < 0.985


def test_slopes_follow_the_curve_and_totals_its_sums() -> None:
    est = fit(rows())
    step = 1e-4
    up, down = (averaged_means(est, PLACES + d, root=False).value for d in (step, -step))
    found = averaged_slopes(est, PLACES)
    np.testing.assert_allclose(found.value, (up - down) / (2 * step), rtol=1e-6, atol=1e-7)
    assert (found.error > 0).all()
    where = PLACES, np.tile([1.0, 0.5], (4, 1)), np.ones((4, 1))
    summed = total(est, *where)
    assert summed.estimate == pytest.approx(predict(est, *where).estimate.sum(), rel=1e-12)
    v = est.design_at(*where).sum(axis=0)
    assert summed.shared_error**2 == pytest.approx(v @ est.covariance() @ v, rel=1e-8)


def test_a_new_row_under_even_spread_is_the_t_interval_of_the_penalised_fit() -> None:
    est = fit(rows())
    where = PLACES, np.tile([1.0, 0.0], (4, 1)), np.ones((4, 1))
    low, high = new_row_interval(est, *where, level=0.9, errors="constant")
    x, (_, inverse) = est.design_at(*where), dense(est)
    half = student.ppf(0.95, est.df_residual) * est.sigma * np.sqrt(1 + np.einsum("kp,pq,kq->k", x, inverse, x))
    np.testing.assert_allclose((high - low) / 2, half, rtol=1e-7)


def test_a_line_comes_out_straight() -> None:
    data = rows()
    straight = fit(replace(data, y=2 + 3 * data.x))
    assert straight.roughness is not None
    assert straight.roughness.end == "straight"
    assert straight.parameters == pytest.approx(4, abs=1e-3)


@pytest.mark.parametrize(
    ("key", "wrong"),
    [("boxcox y ~ smooth x", "not searched together"), ("loglink y ~ smooth x", "under a link is not offered")],
)
def test_what_is_not_offered_says_what_is(key: str, wrong: str) -> None:
    found = estimate(rows(), parse(key))
    assert isinstance(found, Refusal)
    assert wrong in found.wrong
    assert "smooth x" in found.instead
