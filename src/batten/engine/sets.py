"""All training sets at once: searched constants and mean models refitted by batches of small products.

At a few hundred rows the cost of refitting is the number of Python calls, not arithmetic, so sets are stacked: every
array has a leading axis S, and `mask` (S, n) holds which rows each set trains on.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from batten.engine.irls import Mean
from batten.engine.rows import Array, Ints
from batten.engine.search import SCAN_ROWS, Searched

__all__ = ["TrainedMeans", "masks", "search_sets", "solve_means"]

#: numbers held at once
BLOCK = 4_000_000


def masks(n: int, held: list[Ints]) -> Array:
    """1 where a set trains on a row, 0 where the row is held out (S, n)."""
    out = np.ones((len(held), n))
    for s, rows in enumerate(held):
        out[s, rows] = 0.0
    return out


@dataclass(frozen=True, eq=False)
class _Problem:
    """The fixed columns' orthonormal basis (n, p), its inverse cross-product in each set, z projected in each set, and
    the residual sum of squares without the searched columns (S,)."""

    model: Searched
    mask: Array
    z: Array
    inverse: Array
    right: Array
    total: Array

    @classmethod
    def of(cls, model: Searched, z: Array, mask: Array) -> _Problem:
        q = model.basis
        cross = np.matmul(q.T, mask[:, :, None] * q)
        inverse, right = np.linalg.inv(cross), (mask * z) @ q
        return cls(model, mask, z, inverse, right, mask @ z**2 - np.einsum("sp,spr,sr->s", right, inverse, right))

    def some(self, which: Ints) -> _Problem:
        """The same for some of the sets."""
        return _Problem(self.model, self.mask[which], self.z, self.inverse[which], self.right[which], self.total[which])

    def gram(self, u: Array) -> tuple[Array, Array]:
        """Cross-products of columns u (S, n, k) with the fixed ones projected out: u'u (S, k, k) and u'z (S, k)."""
        masked = u * self.mask[:, :, None]
        qu = np.matmul(self.model.basis.T, masked)
        along = np.matmul(self.inverse, qu)
        left = masked.transpose(0, 2, 1)
        square = np.matmul(left, u) - np.matmul(qu.transpose(0, 2, 1), along)
        return square, left @ self.z - np.einsum("spk,sp->sk", along, self.right)

    def columns(self, theta: Array) -> Array:
        return np.stack([self.model.columns(t) for t in theta])

    def rss(self, theta: Array) -> Array:
        """Residual sum of squares at theta (S, q): (S,), inf where the columns cannot be solved."""
        return self.total - _gain(*self.gram(self.columns(theta)))[0]


def _gain(square: Array, right: Array) -> tuple[Array, Array]:
    """right' square^-1 right and square^-1 right for each set; -inf where square is singular."""
    size = np.sqrt(np.maximum(np.einsum("skk->sk", square), 0.0))
    good = np.isfinite(square).all(axis=(1, 2)) & np.isfinite(right).all(axis=1) & (size > 0).all(axis=1)
    size = np.where(good[:, None], size, 1.0)
    scaled = np.where(good[:, None], right / size, 0.0)
    if size.shape[1] == 1:
        return np.where(good, scaled[:, 0] ** 2, -np.inf), scaled / size
    unit = np.where(good[:, None, None], square / (size[:, :, None] * size[:, None, :]), np.eye(square.shape[1]))
    sound = np.linalg.eigvalsh(unit)[:, 0] > 1e-12
    unit = np.where(sound[:, None, None], unit, np.eye(unit.shape[1]))
    good &= sound
    coef = np.linalg.solve(unit, scaled[:, :, None])[:, :, 0]
    return np.where(good, (scaled * coef).sum(axis=1), -np.inf), coef / size


def search_sets(model: Searched, z: Array, mask: Array, start: Array, *, steps: int = 40) -> Array:
    """Best theta of every training set (S, q): from `start` (q,) or a better place of the grid, by Gauss-Newton."""
    problem = _Problem.of(model, z, mask)
    theta, rss = _starts(problem, np.tile(start, (len(mask), 1)))
    if model.finite:
        return theta
    live = np.flatnonzero(np.isfinite(rss))
    for _ in range(steps):
        if not len(live):
            break
        part = problem.some(live)
        step, promised = _steps(part, theta[live])
        near = promised <= 1e-7 * rss[live]
        trial = theta[live] + step
        inside = ((trial > model.lower) & (trial < model.upper)).all(axis=1)
        settled = near & inside
        # close to the optimum the RSS cannot show a step's gain: full steps are taken until they are small
        theta[live[settled]] = trial[settled]
        done = (promised <= 1e-15 * rss[live]) | ~np.isfinite(step).all(axis=1) | (near & ~inside)
        far = ~near & ~done
        if far.any():
            improved = _descend(part.some(np.flatnonzero(far)), theta, rss, step[far], live[far])
            done[np.flatnonzero(far)[~improved]] = True
        live = live[~done]
    if model.corners is not None and theta.shape[1] == 1:
        theta = _walk(problem, theta)
    return theta


def _starts(problem: _Problem, theta: Array) -> tuple[Array, Array]:
    """The warm start or, where it is better, the best candidate of the grid."""
    model = problem.model
    if len(problem.z) > SCAN_ROWS and not model.finite:
        # at large n a training set's optimum lies beside the all-rows one, which the whole grid has been searched for
        return theta, problem.rss(theta)
    best = theta.copy()
    low = np.full(len(theta), np.inf) if model.finite else problem.rss(theta)
    for k, candidate in enumerate(model.candidates):
        block = np.broadcast_to(model.grid[k], (len(theta), *model.grid[k].shape))
        new = problem.total - _gain(*problem.gram(block))[0]
        better = new < low
        best[better], low = candidate, np.where(better, new, low)
    return best, low


def _steps(problem: _Problem, theta: Array) -> tuple[Array, Array]:
    """Gauss-Newton steps (S, q) and the fall of the RSS that each promises (S,)."""
    block = problem.columns(theta)
    k = block.shape[2]
    coef = _gain(*problem.gram(block))[1]
    pull = np.stack([np.einsum("qnk,k->nq", problem.model.slopes(t), c) for t, c in zip(theta, coef, strict=True)])
    both, to_z = problem.gram(np.concatenate([block, pull], axis=2))
    with np.errstate(all="ignore"):
        across = np.matmul(_inverses(both[:, :k, :k]), both[:, :k, k:])
        square = both[:, k:, k:] - np.matmul(both[:, k:, :k], across)
        right = to_z[:, k:] - np.einsum("skq,sk->sq", across, to_z[:, :k])
    promised, step = _gain(square, right)
    return step, promised


def _inverses(square: Array) -> Array:
    if square.shape[1] == 1:
        return np.asarray(1 / square)
    return np.asarray(np.linalg.pinv(square, rcond=1e-12, hermitian=True))


def _descend(problem: _Problem, theta: Array, rss: Array, step: Array, place: Ints) -> npt.NDArray[np.bool_]:
    """Step the sets at `place`, each step shortened until its RSS falls; theta and rss are changed there.

    Returns which of them improved.
    """
    model, fraction = problem.model, 1.0
    waiting = np.arange(len(place))
    for _ in range(6):
        at = place[waiting]
        trial = np.clip(theta[at] + fraction * step[waiting], model.lower, model.upper)
        new = problem.some(waiting).rss(trial)
        better = new < rss[at]
        theta[at[better]], rss[at[better]] = trial[better], new[better]
        waiting = waiting[~better]
        if not len(waiting):
            break
        fraction *= 0.2
    return ~np.isin(np.arange(len(place)), waiting)


def _walk(problem: _Problem, theta: Array) -> Array:
    """Along the corners beside each set's place, as long as one of them is better."""
    corners = problem.model.corners
    assert corners is not None
    rss = problem.rss(theta)
    moving = np.arange(len(theta))
    for _ in range(60):
        part, moved = problem.some(moving), np.zeros(len(moving), dtype=bool)
        before = np.searchsorted(corners, theta[moving, 0], side="left") - 1
        after = np.searchsorted(corners, theta[moving, 0], side="right")
        for place in (before, after):
            trial = np.clip(corners[np.clip(place, 0, len(corners) - 1)], problem.model.lower, problem.model.upper)
            new = part.rss(trial[:, None])
            better = new < rss[moving] * (1 - 1e-13)
            theta[moving[better], 0], rss[moving[better]] = trial[better], new[better]
            moved |= better
        moving = moving[moved]
        if not len(moving):
            break
    return theta


@dataclass(frozen=True, eq=False)
class TrainedMeans:
    """Coefficients (S, p), linear predictor of every row (S, n), and which sets settled (S,)."""

    coef: Array
    eta: Array
    settled: Array


def solve_means(model: Mean, x: Array, y: Array, mask: Array, start: Array, *, steps: int = 30) -> TrainedMeans:
    """Iteratively reweighted least squares in every training set.

    x (n, p), or (S, n, p) where sets have columns of their own. mask (S, n): weights of the rows, 0 where held out.
    start (p,) or (S, p): coefficients to start from.
    """
    count, n = mask.shape
    length = np.sqrt((x * x).sum(axis=-2, keepdims=True))
    unit = np.broadcast_to(x / length, (count, n, x.shape[-1]))
    b = np.broadcast_to(start, (count, x.shape[-1])) * length.reshape(-1, x.shape[-1])

    def deviance(b: Array) -> tuple[Array, Array]:
        eta = np.matmul(unit, b[:, :, None])[:, :, 0]
        with np.errstate(all="ignore"):
            total = (model.deviance(np.broadcast_to(y, eta.shape), known(model.mean(eta))) * mask).sum(axis=1)
        return eta, total

    def known(mu: Array) -> Array:
        """A held-out row may have no mean; it counts for nothing, so any number will do."""
        return mu if np.isfinite(mu).all() else np.where((mask == 0) & ~np.isfinite(mu), 1.0, mu)

    eta, now = deviance(b)
    settled = np.zeros(count, dtype=bool)
    for _ in range(steps):
        mu, slope = known(model.mean(eta)), known(model.slope(eta))
        weight = slope / model.variance(mu) * mask
        left = unit.transpose(0, 2, 1)
        cross = np.matmul(left, unit * (weight * slope)[:, :, None])
        score = np.matmul(left, (weight * (y - mu))[:, :, None])[:, :, 0]
        step = _solve_all(cross, score)
        fraction = np.ones(count)
        for _ in range(20):
            trial_eta, trial = deviance(b + fraction[:, None] * step)
            worse = ~(trial <= now * (1 + 1e-12) + 1e-300)
            if not worse.any():
                break
            fraction = np.where(worse, fraction / 2, fraction)
        b = b + fraction[:, None] * step
        eta, now = trial_eta, trial
        settled = np.abs(fraction[:, None] * step).max(axis=1) <= 1e-10 * np.maximum(1.0, np.abs(b).max(axis=1))
        if settled.all():
            break
    return TrainedMeans(b / length.reshape(-1, x.shape[-1]), eta, settled)


def _solve_all(cross: Array, score: Array) -> Array:
    """cross^-1 score for each set; zero where a set has lost a direction (it then never settles)."""
    values = np.linalg.eigvalsh(cross)
    sound = values[:, 0] > 1e-13 * values[:, -1]
    safe = np.where(sound[:, None, None], cross, np.eye(cross.shape[1]))
    step = np.linalg.solve(safe, score[:, :, None])[:, :, 0]
    return np.where(sound[:, None], step, np.nan)
