"""Penalised fits against dense algebra, mixed models and additive models of a general library."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import minimize_scalar
from statsmodels.gam.api import BSplines, GLMGam
from statsmodels.regression.mixed_linear_model import VCSpec

from batten.engine.penalised import Smoothed, joined, penalty_rows, smooth, smooth_sets

ONE = np.ones((1, 1))
#: a falling and rising response; line segments that may bend at five places
X = np.array([1, 1, 2, 3, 3, 4, 5, 5, 6, 7, 7, 8, 9, 9, 10, 11.0])
Y = np.array([9.1, 8.6, 7.9, 6.8, 7.2, 5.6, 4.9, 5.3, 4.4, 5.6, 5.1, 6.9, 7.8, 8.4, 9.6, 10.3])
BREAKS = np.array([2.5, 4, 5.5, 7, 8.5])


def segments(x: np.ndarray) -> np.ndarray:
    return np.column_stack([np.ones_like(x), x, np.maximum(x[:, None] - BREAKS, 0)])


D = penalty_rows(np.diag([0.0, 1, 1, 1, 1, 1]), ONE, 1)


def fit(y: np.ndarray, design: np.ndarray, rows: np.ndarray, log_amount: float | None = None) -> Smoothed:
    return smooth(design, joined(design, rows), y, rows, log_amount=log_amount)


def restricted(log_amount: float, y: np.ndarray, design: np.ndarray, rows: np.ndarray) -> float:
    """Minus the restricted log-likelihood, from the dense covariance I + Z Z' / amount of the responses."""
    size = np.abs(rows).max()
    free = np.linalg.svd(rows / size)[2][len(rows) :].T
    z = design @ np.linalg.pinv(rows)
    f = design @ free
    v = np.eye(len(y)) + z @ z.T / np.exp(log_amount)
    inverse = np.linalg.inv(v)
    cross = f.T @ inverse @ f
    e = y - f @ np.linalg.solve(cross, f.T @ inverse @ y)
    df = len(y) - f.shape[1]
    s2 = float(e @ inverse @ e) / df
    # the volume of the free coefficients is that of their own columns
    scale = np.linalg.slogdet(free[:2, :2])[1] if f.shape[1] == 2 else 0.0
    dets = np.linalg.slogdet(v)[1] + np.linalg.slogdet(cross)[1] - 2 * scale
    return 0.5 * (df * (np.log(2 * np.pi * s2) + 1) + dets)


def test_a_given_amount_meets_independent_values() -> None:
    """Penalised line segments (Ruppert, Wand and Carroll 2003) with amount 1; generalised cross-validation by Craven
    and Wahba 1979. Independent computation, six decimals."""
    found = fit(Y, segments(X), D, 0.0)
    rss, edf = float(found.residual @ found.residual), found.roughness.edf
    assert edf == pytest.approx(4.546447, abs=1e-6)
    assert rss == pytest.approx(1.413502, abs=1e-6)
    assert 16 * rss / (16 - edf) ** 2 == pytest.approx(0.172399, abs=1e-6)


def test_generalised_cross_validation_would_take_less_and_meets_independent_values() -> None:
    """Craven and Wahba 1979: its optimum lies at amount 0.289721 with edf 5.490850, GCV 0.152201 (independent
    computation). The product takes the restricted likelihood, which is steadier (Reiss and Ogden 2009)."""

    def gcv(log_amount: float) -> tuple[float, float]:
        found = fit(Y, segments(X), D, log_amount)
        edf = found.roughness.edf
        return 16 * float(found.residual @ found.residual) / (16 - edf) ** 2, edf

    best = minimize_scalar(lambda v: gcv(v)[0], bounds=(-4, 1), method="bounded", options={"xatol": 1e-9})
    assert np.exp(best.x) == pytest.approx(0.289721, abs=2e-6)
    assert gcv(best.x) == (pytest.approx(0.152201, abs=1e-6), pytest.approx(5.490850, abs=2e-5))


def test_the_amount_of_highest_restricted_likelihood_meets_independent_values() -> None:
    """Patterson and Thompson 1971: amount 0.136426, edf 6.009858, -log REML 13.708222; at x = 5 the curve 4.964196,
    its Bayesian error 0.171556 (Nychka 1988), its frequentist one 0.161728. Independent computation, six decimals."""
    found = fit(Y, segments(X), D)
    edf, at = found.roughness.edf, segments(np.array([5.0]))[0]
    assert found.roughness.amount == pytest.approx(0.136426, abs=1e-6)
    assert edf == pytest.approx(6.009858, abs=1e-6)
    assert restricted(np.log(found.roughness.amount), Y, segments(X), D) == pytest.approx(13.708222, abs=1e-6)
    assert at @ found.coef == pytest.approx(4.964196, abs=1e-6)
    sigma = np.sqrt(found.residual @ found.residual / (16 - edf))
    push = found.factored.root.T @ at
    assert sigma * np.linalg.norm(push) == pytest.approx(0.171556, abs=1e-6)
    assert sigma * np.linalg.norm(found.factored.q @ push) == pytest.approx(0.161728, abs=1e-6)


def bumps(n: int, noise: float, seed: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    x = np.sort(rng.uniform(0, 12, n))
    return x, np.sin(x) + 0.3 * x + rng.normal(0, noise, n)


@pytest.mark.parametrize(("n", "noise"), [(20, 0.2), (60, 0.5), (60, 1.0), (200, 1.0)])
def test_the_amount_is_the_optimum_of_the_dense_likelihood(n: int, noise: float) -> None:
    x, y = bumps(n, noise, seed=n)
    found = fit(y, segments(x), D)
    grid = np.linspace(-12, 12, 97)
    start = grid[np.argmin([restricted(v, y, segments(x), D) for v in grid])]
    best = minimize_scalar(
        restricted, bounds=(start - 0.5, start + 0.5), args=(y, segments(x), D), method="bounded",
        options={"xatol": 1e-9},
    )  # fmt: skip
    # function values settle a minimum to half their digits
    assert np.log(found.roughness.amount) == pytest.approx(best.x, abs=1e-5)


def test_a_penalised_fit_is_least_squares_on_further_rows() -> None:
    x, y = bumps(40, 0.5, seed=2)
    found = fit(y, segments(x), D)
    r = found.roughness.rows
    plain = sm.OLS(np.append(y, np.zeros(len(r))), np.vstack([segments(x), r])).fit()
    np.testing.assert_allclose(found.coef, plain.params, rtol=1e-10)
    root = found.factored.root
    np.testing.assert_allclose(root @ root.T, plain.normalized_cov_params, rtol=1e-9, atol=1e-12)
    hat = plain.get_influence().hat_matrix_diag
    np.testing.assert_allclose((found.factored.q**2).sum(axis=1), hat[:40], rtol=1e-10)
    np.testing.assert_allclose((found.roughness.pull**2).sum(axis=1), hat[40:], rtol=1e-9)
    assert found.roughness.edf == pytest.approx(hat[:40].sum(), rel=1e-12)


def test_leaving_a_row_out_is_exact_for_a_given_amount() -> None:
    x, y = bumps(30, 0.5, seed=3)
    found = fit(y, segments(x), D)
    h = (found.factored.q**2).sum(axis=1)
    moves = -(found.factored.q @ found.factored.root.T) * (found.residual / (1 - h))[:, None]
    for i in (0, 7, 29):
        rest = np.arange(30) != i
        again = fit(y[rest], segments(x[rest]), D, np.log(found.roughness.amount))
        np.testing.assert_allclose(found.coef + moves[i], again.coef, rtol=1e-9, atol=1e-11)


def test_the_fit_is_that_of_a_mixed_model() -> None:
    """statsmodels' REML, whose optimiser stops at some five digits of the variance ratio."""
    x, y = bumps(80, 0.4, seed=4)
    found = fit(y, segments(x), D)
    spec = VCSpec(["bend"], [[[f"b{i}" for i in range(5)]]], [[segments(x)[:, 2:]]])
    model = sm.MixedLM(y, segments(x)[:, :2], groups=np.ones(80), exog_vc=spec)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # it warns of what it assumes about one group
        other = model.fit(reml=True)
    assert found.roughness.amount == pytest.approx(other.scale / other.vcomp[0], rel=1e-3)
    assert found.residual @ found.residual / (80 - found.roughness.edf) == pytest.approx(other.scale, rel=1e-4)
    np.testing.assert_allclose(y - found.residual, other.fittedvalues, atol=1e-4)


def test_a_b_spline_basis_under_its_own_penalty_is_that_of_an_additive_model() -> None:
    """statsmodels' GLMGam, whose alpha stands for half the amount."""
    x, y = bumps(80, 0.4, seed=5)
    basis = BSplines(x[:, None], df=[12], degree=[3])
    other = GLMGam(y, exog=np.ones((80, 1)), smoother=basis, alpha=[3.0]).fit()
    values, vectors = np.linalg.eigh(basis.smoothers[0].cov_der2)
    kept = values > 1e-10 * values.max()
    rows = np.hstack([np.zeros((kept.sum(), 1)), (vectors[:, kept] * np.sqrt(values[kept])).T])
    found = fit(y, np.column_stack([np.ones(80), basis.basis]), rows, np.log(6.0))
    assert found.roughness.edf == pytest.approx(other.edf.sum(), rel=1e-9)
    np.testing.assert_allclose(y - found.residual, other.fittedvalues, rtol=1e-8)


def test_a_straight_line_comes_out_straight_and_an_exact_curve_free() -> None:
    x = bumps(50, 0.0, seed=6)[0]
    line = fit(3 - 2 * x, segments(x), D)
    assert line.roughness.end == "straight"
    assert line.roughness.edf == pytest.approx(2, abs=1e-4)
    np.testing.assert_allclose(line.coef[:2], [3, -2], rtol=1e-10)
    bent = segments(x) @ np.array([1.0, 2, 0.5, -1, 2, 1, -3])
    free = fit(bent, segments(x), D)
    assert free.roughness.end == "free"
    np.testing.assert_allclose(free.residual, 0, atol=1e-4)


def test_the_penalty_holds_columns_that_the_rows_do_not_tell_apart() -> None:
    """Rows beyond the third break only: two of the columns are lines there."""
    x, y = bumps(40, 0.3, seed=7)
    x = 6 + x / 3
    assert np.linalg.matrix_rank(segments(x)) < 7
    found = fit(y, segments(x), D)
    assert not joined(segments(x), D).aliased
    r = found.roughness.rows
    dense = np.linalg.solve(segments(x).T @ segments(x) + r.T @ r, segments(x).T @ y)
    np.testing.assert_allclose(segments(x) @ dense, y - found.residual, rtol=1e-8)


def test_units_of_the_response_and_of_the_columns_change_nothing() -> None:
    x, y = bumps(40, 0.5, seed=8)
    found = fit(y, segments(x), D)
    size = np.array([1.0, 1e3, *[1e3] * 5])
    other = fit(1e-4 * y, segments(x) * size, D * size)
    np.testing.assert_allclose(other.coef * size, 1e-4 * found.coef, rtol=1e-9)
    assert other.roughness.edf == pytest.approx(found.roughness.edf, rel=1e-10)


def test_the_penalty_of_several_curves_does_not_hang_on_how_groups_are_coded() -> None:
    penalty = np.array([[0.0, 0, 0], [0, 2, 0.5], [0, 0.5, 1]])
    treatment = np.array([[1.0, 0, 0], [1, 1, 0], [1, 0, 1]])
    own = np.eye(3)
    one, two = (penalty_rows(penalty, curves, 2) for curves in (treatment, own))
    recode = np.eye(11)
    recode[2:, 2:] = np.kron(treatment, np.eye(3))
    np.testing.assert_allclose(one.T @ one, recode.T @ two.T @ two @ recode, atol=1e-12)
    np.testing.assert_allclose((two.T @ two)[2:, 2:], np.kron(own, penalty), atol=1e-12)


def test_many_sets_at_once_are_many_fits() -> None:
    sets = [bumps(n, noise, seed=n) for n, noise in ((25, 0.3), (40, 0.5), (60, 3.0))]
    both = [np.column_stack([y, y**2]) for _, y in sets]
    found = smooth_sets(
        np.stack([segments(x).T @ segments(x) for x, _ in sets]),
        np.stack([segments(x).T @ z for (x, _), z in zip(sets, both, strict=True)]),
        np.stack([(z * z).sum(axis=0) for z in both]), np.array([25.0, 40, 60]), np.stack([D] * 3),
    )  # fmt: skip
    assert found is not None
    at = segments(np.array([2.0, 6.0, 9.0]))
    for s, (x, _) in enumerate(sets):
        for e in range(2):
            alone = fit(both[s][:, e], segments(x), D)
            # cross-products keep half the digits of the columns
            np.testing.assert_allclose(at @ found.coef[s, :, e], at @ alone.coef, rtol=1e-6)
            assert found.edf[s, e] == pytest.approx(alone.roughness.edf, rel=1e-6)
            spread = ((at @ found.spread[s, e]) ** 2).sum(axis=1)
            np.testing.assert_allclose(spread, ((at @ alone.factored.root) ** 2).sum(axis=1), rtol=1e-6)


def test_a_set_without_a_free_direction_has_no_fits() -> None:
    x, y = bumps(30, 0.5, seed=9)
    lost = segments(x)
    lost[:, 1] = lost[:, 0]
    cross, right = (lost.T @ lost)[None], (lost.T @ y)[None, :, None]
    assert smooth_sets(cross, right, np.array([[y @ y]]), np.array([30.0]), D[None]) is None
