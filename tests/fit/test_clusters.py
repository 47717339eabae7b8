"""Rows that belong together: cluster-robust errors, left-out clusters, intervals for a row of a new cluster."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import statsmodels.api as sm

from batten.engine.clusters import Clusters
from batten.engine.rows import Array, Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means
from batten.fit.predict import predict
from batten.fit.slopes import average_slope

#: invented for these tests; the values they give were worked out by an independent script
X = np.array([1.0, 2, 3, 4, 5, 6, 8, 10, 12, 15, 18, 20])
Y = np.array([2.1, 3.9, 4.2, 7.5, 6.8, 11.2, 13.1, 21.7, 19.4, 35.0, 30.8, 52.3])
CODE = np.repeat([0, 1, 2, 3], 3)


def small() -> Rows:
    return Rows(Y, X, np.ones((12, 1)), np.ones((12, 1)), cluster=CODE)


def sample(groups: int = 15, seed: int = 0) -> Rows:
    rng = np.random.default_rng(seed)
    size = rng.integers(2, 7, groups)
    cluster = rng.permutation(np.repeat(np.arange(groups), size))
    n = len(cluster)
    x, shift = rng.uniform(1, 12, n), rng.normal(0, 0.3, groups)
    g = (rng.random(n) < 0.4).astype(float)
    y = np.exp(0.5 + 0.1 * x + 0.2 * g + shift[cluster] + rng.normal(0, 0.2, n))
    return Rows(y, x, np.column_stack([np.ones(n), g]), np.ones((n, 1)), cluster=cluster)


def fitted(rows: Rows, key: str) -> Estimate:
    done = estimate(rows, parse(key))
    assert isinstance(done, Estimate), (key, done)
    return done


def test_cluster_errors_have_their_published_forms() -> None:
    # CR0 and CR3 of Bell and McCaffrey 2002 (Cameron and Miller 2015, section VI); numbers of an independent script
    est = fitted(small(), "y ~ x")
    first = est.moves(leave_out=False)
    assert np.sqrt((first[:, 1] ** 2).sum()) == pytest.approx(0.125717, rel=1e-5)
    assert np.sqrt(est.covariance()[1, 1]) == pytest.approx(0.455238, rel=1e-6)
    assert est.df_error == 3


def test_first_order_cluster_errors_agree_with_statsmodels() -> None:
    rows = sample()
    est = fitted(rows, "log y ~ poly2 x")
    design = est.design_at(rows.x, rows.base, rows.modifier)
    model = sm.OLS(np.log(rows.y), design).fit(
        cov_type="cluster", cov_kwds={"groups": rows.cluster, "use_correction": False}
    )
    np.testing.assert_allclose(np.sqrt((est.moves(leave_out=False) ** 2).sum(axis=0)), model.bse, rtol=1e-9)


@pytest.mark.parametrize("weighted", [False, True])
@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "sqrt y ~ poly2 x", "y ~ spline4 x"])
def test_left_out_clusters_move_a_linear_fit_as_refits_do(key: str, weighted: bool) -> None:
    rows = sample()
    w = np.random.default_rng(1).uniform(0.4, 2, rows.count) if weighted else np.ones(rows.count)
    est = fitted(replace(rows, weights=w / w.mean() if weighted else None), key)
    design, z = est.design_at(rows.x, rows.base, rows.modifier), est.scale.forward(rows.y, est.c)
    for g in (0, 7, 14):
        kept = np.asarray(rows.cluster) != g
        again = sm.WLS(z[kept], design[kept], weights=w[kept]).fit().params
        np.testing.assert_allclose(est.coef + est.moves()[g], again, rtol=1e-8)
        lost = np.sqrt(w / w.mean())[~kept] * (z - design @ again)[~kept]
        np.testing.assert_allclose(est.left_out_residual[~kept], lost, rtol=1e-8)


@pytest.mark.parametrize("key", ["log y ~ x", "sqrt y ~ x", "loglink y ~ x"])
def test_the_span_effect_leaves_clusters_out(key: str) -> None:
    rows = sample()
    places = np.array([3.0, 9.0])
    est = fitted(rows, key)
    got = averaged_means(est, places)
    groups = int(np.asarray(rows.cluster).max()) + 1
    again = []
    for g in range(groups):
        part = rows.take(np.asarray(rows.cluster) != g)
        again.append(averaged_means(fitted(replace(part, cluster=None), key), places, root=False).value)
    left = np.array(again)
    error = np.sqrt((groups - 1) / groups * ((left - left.mean(axis=0)) ** 2).sum(axis=0))
    # one Newton step stands for the refit of a link
    np.testing.assert_allclose(got.error, error, rtol=2e-2 if "link" in key else 1e-8)
    assert got.df == groups - 1


def test_a_cluster_of_one_row_each_is_the_plain_fit() -> None:
    rows = sample()
    alone = replace(rows, cluster=np.arange(rows.count))
    for key in ("log y ~ x", "y ~ level-hyp x", "boxcox y ~ x", "loglink y ~ log x"):
        one, two = fitted(alone, key), fitted(replace(rows, cluster=None), key)
        np.testing.assert_allclose(one.moves(), two.moves(), rtol=1e-7, atol=1e-12)
        for of in ("mean", "median"):
            a, b = (average_slope(est, of=of, jackknife=False) for est in (one, two))
            # the factors for few clusters, sqrt((n - 1) / n) and its inverse, are all that differs
            np.testing.assert_allclose(a.error, b.error, rtol=2 / rows.count)


def test_a_new_row_comes_from_a_new_cluster() -> None:
    rows = sample(30, seed=3)
    est = fitted(rows, "log y ~ x")
    got = predict(est, np.array([6.0]), np.array([[1.0, 0.0]]), np.ones((1, 1)), kind="new row", level=0.8)
    design, z = est.design_at(rows.x, rows.base, rows.modifier), np.log(rows.y)
    values = np.empty(rows.count)
    for g in range(30):
        out = np.asarray(rows.cluster) == g
        b = np.linalg.lstsq(design[~out], z[~out], rcond=None)[0]
        values[out] = np.array([1.0, 0.0, 6.0]) @ b + (z - design @ b)[out]
    n, tail = rows.count, 0.1
    first = int(np.floor(tail * (n + 1) + 1e-9)) - 1
    ends = np.exp(np.sort(values)[[first, n - 1 - first]])
    np.testing.assert_allclose([got.low[0], got.high[0]], ends, rtol=1e-9)


def test_there_is_no_aicc_with_clusters() -> None:
    assert np.isnan(fitted(sample(), "y ~ x").aicc)


def scores_in_blocks(q: Array, e: Array, code: Array) -> Array:
    out = []
    for g in range(int(code.max()) + 1):
        part = q[code == g]
        out.append(part.T @ np.linalg.solve(np.eye(len(part)) - part @ part.T, e[code == g]))
    return np.array(out)


def test_many_clusters_are_worked_through_in_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(5)
    q, e, code = np.linalg.qr(rng.normal(size=(300, 6)))[0], rng.normal(size=300), rng.integers(0, 40, 300)
    monkeypatch.setattr("batten.engine.clusters.BLOCK", 36 * 20)
    np.testing.assert_allclose(Clusters(code).scores(q, e), scores_in_blocks(q, e, code), rtol=1e-10)


def test_a_cluster_that_owns_a_column_moves_nothing_along_it() -> None:
    x = np.column_stack([np.ones(12), CODE == 3])
    q = np.linalg.qr(x)[0]
    e = Y - q @ (q.T @ Y)
    moved = Clusters(CODE).scores(q, e)
    assert np.isfinite(moved).all()
    np.testing.assert_allclose(moved[3], 0.0, atol=1e-10)
