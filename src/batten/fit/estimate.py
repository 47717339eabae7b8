"""One remedy fitted to one analysis sample, or the reason why it cannot be."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from batten.engine.irls import Mean, iterate
from batten.engine.linear import Factored, design, factor, solve
from batten.engine.power import Power, best_power
from batten.engine.rows import Array, Ints, Rows
from batten.engine.search import Searched, search
from batten.engine.threads import MANY_ROWS
from batten.errors import Refusal
from batten.families.base import Constants, Link, Scale, Shape
from batten.families.remedy import Remedy
from batten.fit.guard import domain_trouble, meets_constant, not_offered, too_few
from batten.fit.powers import in_lambda, likelihood_moves, own_units, pivot

#: (shape's key, theta) -> design and its QR, on one set of rows
Designs = dict[tuple[str, Constants], tuple[Array, Factored]]

__all__ = ["Designs", "Estimate", "estimate", "scale_power", "searched_model"]


#: leverage from which a row is taken to own a coefficient
OWNS = 1 - 1e-8


@dataclass(frozen=True, eq=False)
class Estimate:
    """Frozen result of one fit; everything shown, predicted or emitted reads it.

    state, theta: the shape's constants (fixed by x; searched). c: the scale's constants.
    coef (p,): raw-unit coefficients of the design [base | focal columns]. z (n,): response on the fitting scale (y for
    links). eta (n,): linear predictor. residual (n,): z - eta, for links y - mu. factored: QR of the effective design
    (coefficients, then theta; weighted for links). leverage (n,). sigma: residual SD on the fitting scale.
    log_likelihood: in units of y, None for a pseudo-likelihood. parameters: counted ones, sigma included.
    """

    remedy: Remedy
    rows: Rows
    state: Constants
    theta: Constants
    c: Constants
    coef: Array
    z: Array
    eta: Array
    residual: Array
    factored: Factored
    df_residual: int
    sigma: float
    log_likelihood: float | None
    parameters: int
    notes: tuple[str, ...] = field(default=())

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
        return len(self.z)

    @property
    def moving(self) -> int:
        """How many of theta move continuously (powers chosen from a finite set do not)."""
        return 0 if self.shape.finite else len(self.theta)

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
        """AICc in units of y (Hurvich and Tsai 1989); NaN for pseudo-likelihoods and where n is too small for it."""
        k, n = self.parameters, self.n
        if self.log_likelihood is None or n - k - 1 <= 0:
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
        return out

    def _scale_slope(self) -> Array:
        """d z / d lambda (n,) beyond what `own_units` takes out."""

        def own(lam: float) -> Array:
            shift, stretch = own_units(self, lam)
            return (self.scale.forward(self.rows.y, (lam,)) - shift) / stretch

        return in_lambda(own, self.c[0])[0]

    @cached_property
    def pivot(self) -> tuple[float, float]:
        """Value and slope of the scale at the median of y (the value is 0 where no constant can take it up)."""
        return pivot(self, self.c[0])

    def moves(self, *, leave_out: bool = True, rows: Ints | slice = slice(None)) -> Array:
        """Change of (coef, theta, c) when row i is left out, (n, P); exact for linear remedies, else one step.

        rows: only these.

        leave_out=False gives the first-order influence (HC0-type) instead, with the same sign.
        """
        h = self.leverage
        # a row that owns a coefficient cannot be left out: its residual is zero, and it moves nothing else
        weight = np.where(h < OWNS, 1.0 / (1.0 - h), 0.0) if leave_out else np.ones(self.n)
        if self.remedy.left.searched:
            return (-self._without_drift(likelihood_moves(self)) * weight[:, None])[rows]
        score = self.residual if self.link is None else self._link_score()
        return -(self.factored.q[rows] @ self.factored.root.T) * (score * weight)[rows, None]

    def _without_drift(self, moved: Array) -> Array:
        """Coefficient moves less the part that only follows the scale's own change of place and length with lambda."""
        place, length = in_lambda(lambda v: np.array(own_units(self, v)), self.c[0])[0]
        drift = length * self.coef
        if self.rows.intercept is not None:
            drift[self.rows.intercept] += place - length * self.pivot[0]
        out = moved.copy()
        out[:, : len(drift)] -= moved[:, -1:] * drift
        return out

    def _link_score(self) -> Array:
        """Score residual on the weighted scale: (y - mu) / sqrt V."""
        assert self.link is not None
        return np.asarray(self.residual / np.sqrt(self.link.variance(self.mu)))

    def covariance(self, kind: str = "robust") -> Array:
        """Covariance of (coef, theta, c) (P, P): "robust" is HC3 (MacKinnon and White 1985), "constant" s2 (J'J)^-1."""
        if kind == "robust" or self.remedy.left.searched:
            d = self.moves()
            return np.asarray(d.T @ d)
        return np.asarray(self.factored.inverse_cross * self.sigma**2)


def estimate(
    rows: Rows,
    remedy: Remedy,
    *,
    theta: Constants | None = None,
    c: Constants | None = None,
    designs: Designs | None = None,
) -> Estimate | Refusal:
    """Fit a remedy; a remedy that cannot be used on these rows comes back as a Refusal.

    designs: designs and their factors on these rows, shared by the remedies of one shape; filled along the way.
    theta, c: constants set by hand (a profile, a dragged lambda); learned from the rows when None.
    """
    refusal = not_offered(remedy) or remedy.left.refuse(rows.y) or remedy.shape.refuse(rows.x) or too_few(rows, remedy)
    if refusal:
        return refusal
    state = remedy.shape.learn(rows.x, constant=meets_constant(rows, remedy.shape))
    if isinstance(remedy.left, Link):
        return _fit_link(rows, remedy, state, theta)
    return _fit_scale(rows, remedy, state, theta, c, {} if designs is None else designs)


def searched_model(rows: Rows, shape: Shape, state: Constants) -> Searched:
    """The shape's search on these rows, for variable projection."""
    none = np.empty((rows.count, 0))
    lower, upper = shape.bounds(rows.x, state)
    alone = rows.modifier.shape[1] == 1 and bool((rows.modifier == 1).all())
    bare = Rows(rows.y, rows.x, none, rows.modifier, None, False)

    def columns(t: Array) -> Array:
        found = shape.columns(rows.x, state, tuple(t))
        return found if alone else design(bare, found)

    def slopes(t: Array) -> Array:
        found = shape.theta_slopes(rows.x, state, tuple(t))
        return found if alone else np.stack([design(bare, s) for s in found])

    return Searched(
        fixed=design(rows, none, own_level=shape.own_level), columns=columns, slopes=slopes,
        candidates=shape.candidates(rows.x, state),
        rebuild=lambda which: searched_model(rows.take(which), shape, state), lower=lower, upper=upper,
        finite=shape.finite, corners=np.unique(rows.x) if shape.corners else None,
    )  # fmt: skip


def _fit_scale(
    rows: Rows,
    remedy: Remedy,
    state: Constants,
    theta: Constants | None,
    c: Constants | None,
    designs: Designs,
) -> Estimate | Refusal:
    scale, shape = remedy.left, remedy.shape
    assert isinstance(scale, Scale)
    by_hand = (theta is not None and bool(shape.searched)) or (c is not None and bool(scale.searched))
    constants = _constants(rows, remedy, state, theta, c)
    if isinstance(constants, Refusal):
        return constants
    t, c = constants
    if (shape.key, t) not in designs:
        x = design(rows, shape.columns(rows.x, state, t), own_level=shape.own_level)
        if not np.isfinite(x).all():
            return Refusal("The predictor's columns are not all finite.", f"{shape.key} on these rows.", "Rescale x.")
        designs[shape.key, t] = x, factor(x)
    x, linear = designs[shape.key, t]
    if linear.aliased:
        return _aliased(remedy, linear.aliased, x.shape[1])
    z = scale.forward(rows.y, c)
    coef, residual = solve(linear, x, z)
    eta = z - residual
    trouble = domain_trouble(scale, c, eta, residual)
    if trouble:
        return trouble
    df = rows.count - x.shape[1] - (0 if shape.finite else len(t))
    rss = float(residual @ residual)
    est = Estimate(
        remedy=remedy, rows=rows, state=state, theta=t, c=c, coef=coef, z=z, eta=eta, residual=residual,
        factored=linear, df_residual=df, sigma=float(np.sqrt(rss / df)),
        log_likelihood=_likelihood(rss, rows.count, scale.log_jacobian(rows.y, c)),
        parameters=x.shape[1] + 1 + len(t) + (1 if scale.searched else 0),
        notes=("constant set by hand; not ranked",) if by_hand else (),
    )  # fmt: skip
    if not est.moving:
        return est
    full = est.jacobian_at(rows.x, rows.base, rows.modifier)
    full = full[:, :-1] if scale.searched else full
    effective = factor(full)
    return _not_settled(shape) if effective.aliased else replace(est, factored=effective)


def _constants(
    rows: Rows, remedy: Remedy, state: Constants, theta: Constants | None, c: Constants | None
) -> tuple[Constants, Constants] | Refusal:
    """The searched constants (theta, c); where both are searched, each in turn until neither moves."""
    scale, shape = remedy.left, remedy.shape
    assert isinstance(scale, Scale)
    search_t, search_c = bool(shape.searched) and theta is None, bool(scale.searched) and c is None
    t: Constants = theta or ()
    if c is None:
        c = (1.0,) if scale.searched else scale.learn(rows.y)
    model = searched_model(rows, shape, state) if search_t else None
    for turn in range(40 if search_t and search_c else 1):
        before = (*t, *c)
        if model is not None:
            found = search(
                model, scale.forward(rows.y, c), start=np.array(t) if turn else None,
                precision=1e-13 if rows.count <= MANY_ROWS else 1e-10,
            )  # fmt: skip
            if not found.settled:
                return _not_settled(shape)
            t = tuple(float(v) for v in found.theta)
        if search_c:
            x = design(rows, shape.columns(rows.x, state, t), own_level=shape.own_level)
            lam, inside = best_power(scale_power(scale), rows.y, factor(x).q, start=c[0] if turn else None)
            if not inside:
                return _edge(scale, lam)
            c = (lam,)
        if turn and max(abs(new - old) for new, old in zip((*t, *c), before, strict=True)) < 1e-9:
            break
    return t, c


def scale_power(scale: Scale) -> Power:
    """The scale seen as a one-constant family, for the likelihood search."""
    low, high = scale.search()
    return Power(lambda y, v: scale.forward(y, (v,)), lambda y, v: scale.log_jacobian(y, (v,)), low, high)


def _likelihood(rss: float, n: int, log_jacobian: Array) -> float | None:
    """Gaussian log-likelihood on z plus the log-Jacobian: units of y (Box and Cox 1964). None for a perfect fit."""
    if rss <= 0:
        return None
    return float(-0.5 * n * (np.log(2 * np.pi * rss / n) + 1) + log_jacobian.sum())


def _fit_link(rows: Rows, remedy: Remedy, state: Constants, theta: Constants | None) -> Estimate | Refusal:
    link, shape = remedy.left, remedy.shape
    assert isinstance(link, Link)
    t = theta or ()
    if shape.searched and theta is None:
        return Refusal(
            "A link with a shape whose constant is searched is not offered.", f"{remedy.key}.",
            "Use a spline under the link, or the same shape on log y.",
        )  # fmt: skip
    x = design(rows, shape.columns(rows.x, state, t), own_level=shape.own_level)
    aliased = factor(x).aliased
    if aliased:
        return _aliased(remedy, aliased, x.shape[1])
    model = Mean(link.mean, link.mean_slope, link.variance, link.deviance)
    done = iterate(model, x, rows.y, eta=link.start(rows.y), offset=rows.offset)
    if not done.settled or not np.isfinite(done.mu).all():
        return Refusal(
            "The fit of this mean model does not settle.",
            "A coefficient runs away: some pattern of the predictors may hold only zeros, or fits perfectly.",
            "A scale of y (log y, sqrt y) or fewer columns.",
        )
    df = rows.count - x.shape[1]
    residual = rows.y - done.mu
    pearson = float((residual**2 / link.variance(done.mu)).sum())
    return Estimate(
        remedy=remedy, rows=rows, state=state, theta=t, c=(), coef=done.coef, z=rows.y, eta=done.eta,
        residual=residual, factored=factor(x * np.sqrt(done.weight)[:, None]), df_residual=df,
        sigma=float(np.sqrt(pearson / df)), log_likelihood=link.log_likelihood(rows.y, done.mu),
        parameters=x.shape[1] + 1,
    )  # fmt: skip


def _not_settled(shape: Shape) -> Refusal:
    return Refusal(
        wrong=f"These rows do not settle the constant of {shape.key}.",
        seen=f"The best {' and '.join(shape.searched)} lies at the edge of what can be searched.",
        instead="A spline (spline4 x) follows the same bend without that constant.",
    )


def _edge(scale: Scale, lam: float) -> Refusal:
    return Refusal(
        wrong="These rows do not settle the power of y.",
        seen=f"The likelihood still rises at {lam:.3g}, the edge of the search.",
        instead="A named scale: log y, sqrt y or 1/y.",
    )


def _aliased(remedy: Remedy, count: int, total: int) -> Refusal:
    return Refusal(
        wrong="Some columns of this remedy repeat others on these rows.",
        seen=f"{count} of {total} columns of {remedy.key} are combinations of the rest.",
        instead="A simpler shape, or covariates that do not repeat the predictor.",
    )
