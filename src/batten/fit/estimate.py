"""One remedy fitted to one analysis sample, and what moves it."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property, partial

import numpy as np

from batten.engine.clusters import OWNS, Clusters
from batten.engine.linear import Factored, design
from batten.engine.penalised import Roughness
from batten.engine.rows import Array, Ints, Rows
from batten.families.base import Constants, Link, Scale, Shape
from batten.families.remedy import Remedy
from batten.fit.powers import in_lambda, likelihood_moves, own_units, pivot
from batten.fit.spread import Spread

__all__ = ["Estimate", "Kept"]


@dataclass(frozen=True, eq=False)
class Kept:
    """Response on the fitting scale, linear predictor and residuals (n,), as `Estimate` has them."""

    z: Array
    eta: Array
    residual: Array


@dataclass(frozen=True, eq=False)
class Estimate:
    """Frozen result of one fit; everything shown, predicted or emitted reads it.

    state, theta: the shape's constants (fixed by x; searched). c: the scale's constants.
    coef (p,): raw-unit coefficients of the design [base | focal columns]. kept: z, eta and residual, or None where they
    are made again when asked for. z (n,): response on the fitting scale times
    sqrt(w) (y for links). eta (n,): linear predictor. residual (n,): z - sqrt(w) eta, so that of a row of average
    weight; for links y - mu. factored: QR of the effective design (coefficients, then theta), rows times sqrt(w), and
    times the working weights for links. leverage (n,). sigma: residual SD on the fitting scale, of a row of average
    weight. log_likelihood: in units of y, None for a pseudo-likelihood. parameters: counted ones, sigma included.
    spread: what a `weighted` remedy learned; its weights are then among those of `rows`. roughness: of a penalised
    curve, whose orthonormal basis goes on in the penalty's rows and whose df_residual and parameters count effective
    degrees of freedom; None for others.
    """

    remedy: Remedy
    rows: Rows
    state: Constants
    theta: Constants
    c: Constants
    coef: Array
    kept: Kept | None
    factored: Factored
    df_residual: float
    sigma: float
    log_likelihood: float | None
    parameters: float
    notes: tuple[str, ...] = field(default=())
    spread: Spread | None = None
    roughness: Roughness | None = None

    @property
    def link(self) -> Link | None:
        return self.remedy.left if isinstance(self.remedy.left, Link) else None

    @property
    def scale(self) -> Scale:
        """The response scale; asked only where there is no link."""
        assert isinstance(self.remedy.left, Scale)
        return self.remedy.left

    @property
    def shape(self) -> Shape:
        return self.remedy.shape

    @property
    def n(self) -> int:
        return self.rows.count

    @property
    def z(self) -> Array:
        if self.kept is not None:
            return self.kept.z
        return self.rows.y if self.link is not None else self.rows.weigh(self.scale.forward(self.rows.y, self.c))

    @property
    def eta(self) -> Array:
        if self.kept is not None:
            return self.kept.eta
        return np.asarray(self.design_at(self.rows.x, self.rows.base, self.rows.modifier) @ self.coef)

    @property
    def residual(self) -> Array:
        if self.kept is not None:
            return self.kept.residual
        if self.link is not None:
            return self.rows.y - self.link.mean(self.eta)
        return np.asarray(self.z - self.rows.weigh(self.eta))

    @property
    def lean(self) -> Estimate:
        """The same without arrays as long as the rows, which are then made again whenever they are asked for."""
        bare = replace(self, kept=None, factored=self.factored.on(np.empty((0, len(self.factored.root)))))
        return replace(bare, factored=self.factored.on(partial(_basis, bare)))

    @property
    def full(self) -> Estimate:
        """The same with all arrays at hand."""
        if self.kept is not None:
            return self
        return replace(
            self, kept=Kept(self.z, self.eta, self.residual), factored=self.factored.on(self.factored.q)
        )  # fmt: skip

    @property
    def moving(self) -> int:
        """How many of theta move continuously (powers chosen from a finite set do not)."""
        return 0 if self.shape.finite else len(self.theta)

    @cached_property
    def clusters(self) -> Clusters | None:
        """Rows that belong together, or None where every row stands for itself."""
        return None if self.rows.cluster is None else Clusters(self.rows.cluster)

    @property
    def df_error(self) -> float:
        """Degrees of freedom of standard errors: residual ones, or clusters less one."""
        return self.df_residual if self.clusters is None else self.clusters.count - 1

    @property
    def mu(self) -> Array:
        """Fitted means of a link (n,)."""
        assert self.link is not None
        return self.link.mean(self.eta)

    @cached_property
    def leverage(self) -> Array:
        """h_i of the effective design (n,).

        Kept below 1: a row that owns a parameter has residual zero, and so says nothing once it is divided by 1 - h.
        """
        return np.minimum(self.factored.leverage, 1 - 1e-9)

    @property
    def aicc(self) -> float:
        """AICc in units of y (Hurvich and Tsai 1989).

        NaN for pseudo-likelihoods, with clusters, for few rows, and where cuts were searched: a jump that was looked
        for is worth more than the one parameter it counts.
        """
        k, n = self.parameters, self.n
        cut = self.shape.steps and bool(self.theta)
        if self.log_likelihood is None or self.clusters is not None or cut or n - k - 1 <= 0:
            return float("nan")
        return -2 * self.log_likelihood + 2 * k + 2 * k * (k + 1) / (n - k - 1)

    def design_at(self, x: Array, base: Array, modifier: Array) -> Array:
        """Design rows (k, p) at focal values x (k,) with covariate columns base (k, q), modifier (k, m)."""
        part = Rows(x, x, base, modifier, self.rows.intercept, self.rows.constant)
        return design(part, self.shape.columns(x, self.state, self.theta), own_level=self.shape.own_level)

    def jacobian_at(self, x: Array, base: Array, modifier: Array) -> Array:
        """d eta / d (coef, theta, c) (k, P); the columns of c are zero, since eta does not hold them."""
        exact = self.design_at(x, base, modifier)
        parts = [exact]
        if self.moving:
            parts.append(self.theta_pull(self.shape.theta_slopes(x, self.state, self.theta), modifier))
        searched = len(self.c) if self.remedy.left.searched else 0
        if searched:
            parts.append(np.zeros((len(x), searched)))
        return np.hstack(parts)

    def slopes_at(self, x: Array, modifier: Array) -> Array:
        """d eta / dx (k,)."""
        return self._focal(self.shape.slopes(x, self.state, self.theta), modifier)

    def slope_jacobian_at(self, x: Array, modifier: Array) -> Array:
        """d (d eta / dx) / d (coef, theta, c) (k, P); by central differences in x, which theta_slopes allow exactly.

        Between breaks a slope does not depend on where they are, so their part is zero.
        """
        s = self.shape.slopes(x, self.state, self.theta)
        p = len(self.coef)
        out = np.zeros((len(x), p + self.moving + (len(self.c) if self.remedy.left.searched else 0)))
        out[:, p - s.shape[1] * modifier.shape[1] : p] = (s[:, None, :] * modifier[:, :, None]).reshape(len(x), -1)
        if self.moving and self.shape.cuts(self.state, self.theta) is None:
            h = 1e-5 * (np.ptp(self.rows.x) or 1.0)
            up, down = (
                self.theta_pull(self.shape.theta_slopes(x + d, self.state, self.theta), modifier) for d in (h, -h)
            )
            out[:, p : p + self.moving] = (up - down) / (2 * h)
        return out

    def _focal(self, columns: Array, modifier: Array) -> Array:
        """Sum over shape columns and modifiers with the focal coefficients (k,)."""
        b = self.coef[len(self.coef) - columns.shape[1] * modifier.shape[1] :].reshape(modifier.shape[1], -1)
        return np.asarray(np.einsum("nk,nm,mk->n", columns, modifier, b))

    def theta_pull(self, theta_slopes: Array, modifier: Array) -> Array:
        """d eta / d theta (k, q) from the columns' theta slopes (q, k, columns)."""
        return np.column_stack([self._focal(t, modifier) for t in theta_slopes])

    @cached_property
    def residual_jacobian(self) -> Array:
        """-d residual / d (coef, theta, c) (n, P): how the fitting-scale residuals move with the parameters."""
        out = self.jacobian_at(self.rows.x, self.rows.base, self.rows.modifier)
        if self.remedy.left.searched:
            out[:, -1] = -self._scale_slope()
        return out if self.link is not None else self.rows.weigh(out)

    def _scale_slope(self) -> Array:
        """d z / d lambda (n,) beyond what `own_units` takes out, weights left aside."""

        def own(lam: float) -> Array:
            shift, stretch = own_units(self, lam)
            return (self.scale.forward(self.rows.y, (lam,)) - shift) / stretch

        return in_lambda(own, self.c[0])[0]

    @cached_property
    def pivot(self) -> tuple[float, float]:
        """Value and slope of the scale at the median of y (the value is 0 where no constant can take it up)."""
        return pivot(self, self.c[0])

    def moves(self, *, leave_out: bool = True) -> Array:
        """Change of (coef, theta, c) when row i, or cluster i, is left out: (n, P) or (G, P).

        Exact for linear remedies, else one step.
        leave_out=False gives the first-order influence (HC0-type) instead, with the same sign.
        """
        if self.remedy.left.searched:
            each = -self._without_drift(likelihood_moves(self)) * self._stretch(leave_out)[:, None]
            return each if self.clusters is None else self.clusters.sums(each)
        return self.linear_moves(leave_out=leave_out)

    def linear_moves(self, *, leave_out: bool = True) -> Array:
        """`moves` of (coef, theta) with the scale's constants held."""
        score = self._score()
        if self.clusters is not None:
            return -self.clusters.scores(self.factored.q, score, leave_out=leave_out) @ self.factored.root.T
        return -(self.factored.q @ self.factored.root.T) * (score * self._stretch(leave_out))[:, None]

    def _stretch(self, leave_out: bool) -> Array:
        """What leaving a row out makes of its residual, 1 / (1 - h) (n,); ones to first order.

        A row that owns a coefficient cannot be left out: its residual is zero, and it moves nothing else.
        """
        h = self.leverage
        return np.where(h < OWNS, 1.0 / (1.0 - h), 0.0) if leave_out else np.ones(self.n)

    @cached_property
    def left_out_residual(self) -> Array:
        """Residuals (n,) of the fits without the row itself, or without its cluster."""
        if self.clusters is None:
            return np.asarray(self.residual / (1 - self.leverage))
        lost = self.clusters.scores(self.factored.q, self.residual)
        return np.asarray(self.residual + (self.factored.q * lost[self.clusters.code]).sum(axis=1))

    def further_root(self, design: Array, weight: Array | None = None) -> Array:
        """Root of the weight (k,) of further rows with this design (k, p), that of a row of average weight being one.

        weight (k,): given with the rows, over the average one.
        """
        root = np.ones(len(design)) if weight is None else np.sqrt(weight)
        return root if self.spread is None else root * self.spread.root(design)

    def row_moves(self) -> Array:
        """`moves` by row (n, P): that of the row's cluster where there are clusters."""
        return self.moves() if self.clusters is None else self.moves()[self.clusters.code]

    def _without_drift(self, moved: Array) -> Array:
        """Coefficient moves less the part that only follows the scale's own change of place and length with lambda."""
        place, length = in_lambda(lambda v: np.array(own_units(self, v)), self.c[0])[0]
        drift = length * self.coef
        if self.rows.intercept is not None:
            drift[self.rows.intercept] += place - length * self.pivot[0]
        out = moved.copy()
        out[:, : len(drift)] -= moved[:, -1:] * drift
        return out

    @property
    def few_clusters(self) -> float:
        """sqrt((G - 1) / G) for G clusters left out in turn, 1 without clusters."""
        return 1.0 if self.clusters is None else float(np.sqrt(1 - 1 / self.clusters.count))

    def _score(self) -> Array:
        """Residual of the weighted least squares whose QR is `factored` (n,): for links sqrt(w) (y - mu) / sqrt V.

        With the sign of d mu / d eta, for the working weights hold its size only.
        """
        if self.link is None:
            return self.residual
        side = np.sign(self.link.mean_slope(self.eta))
        return self.rows.weigh(side * self.residual / np.sqrt(self.link.variance(self.mu)))

    def part(self, rows: Ints) -> Estimate:
        """The same fit seen on some of its rows only, an even part: what it leaves of them, and how they move it.

        Covariances of the part are n / len(rows) times those of the whole.
        """
        stretch = np.sqrt(self.n / len(rows))
        few = Factored(self.factored.q[rows] * stretch, self.factored.r / stretch, self.factored.length)
        part = replace(
            self, rows=self.rows.take(rows), factored=few,
            kept=Kept(self.z[rows], self.eta[rows], self.residual[rows]),
        )  # fmt: skip
        few.__dict__["root"] = self.factored.root * stretch
        # a row is left out of all rows, not of the part
        part.__dict__["leverage"] = np.minimum(few.leverage / stretch**2, 1 - 1e-9)
        return part

    @cached_property
    def bias_moves(self) -> Array:
        """What smoothing may have taken away, as moves of (coef, theta, c) of unit variance (r, P); none without it.

        A penalty stands for a curve whose roughness has some variance, as the errors have. With the errors' own moves
        these make up the covariance whose bands cover on average along the curve (Nychka 1988).
        """
        if self.roughness is None:
            return np.zeros((0, len(self.factored.root) + len(self.remedy.left.searched)))
        return np.asarray(self.sigma * self.roughness.pull @ self.factored.root.T)

    def covariance(self, kind: str = "robust") -> Array:
        """Covariance of (coef, theta, c) (P, P).

        "robust" is HC3 (MacKinnon and White 1985), with clusters CR3 (Bell and McCaffrey 2002); "constant" s2 (J'J)^-1.
        """
        if kind == "robust" or self.remedy.left.searched:
            d = self.moves() * self.few_clusters
            return np.asarray(d.T @ d + self.bias_moves.T @ self.bias_moves)
        return np.asarray(self.factored.inverse_cross * self.sigma**2)


def _basis(est: Estimate) -> Array:
    """The orthonormal basis (n, P) of an estimate's effective design, from its triangle."""
    rows = est.rows
    design = est.jacobian_at(rows.x, rows.base, rows.modifier)[:, : len(est.factored.root)]
    if est.link is None:
        return rows.weigh(design) @ est.factored.root
    eta = design[:, : len(est.coef)] @ est.coef
    weight = est.link.mean_slope(eta) ** 2 / est.link.variance(est.link.mean(eta))
    return rows.weigh(design * np.sqrt(weight)[:, None]) @ est.factored.root
