"""Numbers of one fit as a whole, and tests of it."""

from __future__ import annotations

import numpy as np
from asked import Asked, Placed, Rule
from case_fits import Fitted
from case_tables import NotDelivered

from batten.diagnose.tests_of_shape import AddOn, PureError, pure_error, reset
from batten.diagnose.tests_of_spread import SpreadTest, koenker, white_special

__all__ = ["PLACED", "RULES", "gaussian_deviance"]


def _spent(f: Fitted) -> int:
    """Coefficients beside the constant."""
    return f.fit.rows - f.fit.df_residual - int(f.fit.problem.rows.constant)


def _adjusted(f: Fitted) -> float:
    whole = f.fit.rows - int(f.fit.problem.rows.constant)
    return 1 - (f.rss / f.fit.df_residual) / (f.tss / whole)


def _f(f: Fitted) -> float:
    return (f.tss - f.rss) / _spent(f) / f.fit.sigma**2


def gaussian_deviance(f: Fitted) -> float:
    """n log(RSS/n) + n (1 + log 2 pi)."""
    return -2 * f.fit.log_likelihood


def _deviance(f: Fitted) -> float:
    link = f.fit.estimate.link
    return gaussian_deviance(f) if link is None else float(link.deviance(f.y, f.fit.estimate.mu).sum())


def _nonlinear_f(a: Asked) -> float:
    """F of everything beyond the straight part."""
    straight, f = a.other(a.form.left, "x"), a.fitted
    extra = straight.fit.df_residual - f.fit.df_residual
    return (straight.rss - f.rss) / extra / f.fit.sigma**2


def _spread(a: Asked) -> SpreadTest:
    """Koenker's test on all predictors."""
    f = a.fitted
    found = koenker(f.z - f.eta, f.design[:, np.ptp(f.design, axis=0) > 0])
    assert found is not None
    return found


def _special(a: Asked) -> SpreadTest:
    found = white_special(a.fitted.z - a.fitted.eta, a.fitted.eta)
    assert found is not None
    return found


def _reset(a: Asked) -> AddOn:
    found = reset(a.fitted.design, a.fitted.z)
    assert found is not None
    return found


def _lack(a: Asked) -> PureError:
    found = pure_error(a.fitted.design, a.fitted.z)
    if found is None:
        raise NotDelivered("no rows repeat")
    return found


RULES: dict[str, Rule] = {
    "coef": lambda a, t: a.fitted.coefficient(t)[0],
    "se": lambda a, t: a.fitted.coefficient(t)[1],
    "se_hc1": lambda a, t: a.fitted.hc1(t),
    "n": lambda a, _: a.fitted.fit.rows,
    "df_resid": lambda a, _: a.fitted.fit.df_residual,
    "rss": lambda a, _: a.fitted.rss * a.form.factor**2,
    "resid_sd": lambda a, _: a.fitted.fit.sigma * abs(a.form.factor),
    "mse": lambda a, _: (a.fitted.fit.sigma * a.form.factor) ** 2,
    "r2": lambda a, _: 1 - a.fitted.rss / a.fitted.tss,
    "adj_r2": lambda a, _: _adjusted(a.fitted),
    "f": lambda a, _: _f(a.fitted),
    "x_mean": lambda a, _: a.fitted.x.mean(),
    "f_nonlinear": lambda a, _: _nonlinear_f(a),
    "deviance": lambda a, _: _deviance(a.fitted),
    "loglik": lambda a, _: a.fitted.fit.log_likelihood,
    "sigma_pearson": lambda a, _: a.fitted.fit.sigma,
    "ss_between": lambda a, _: a.fitted.tss - a.fitted.rss,
    "ss_within": lambda a, _: a.fitted.rss,
    "df_between": lambda a, _: _spent(a.fitted),
    "df_within": lambda a, _: a.fitted.fit.df_residual,
    "bp_lm": lambda a, _: _spread(a).statistic,
    "bp_lm_p": lambda a, _: _spread(a).p,
    "bp_f": lambda a, _: _spread(a).f,
    "bp_f_p": lambda a, _: _spread(a).f_p,
    "bp_aux_r2": lambda a, _: _spread(a).r2,
    "white_special_lm": lambda a, _: _special(a).statistic,
    "white_special_p": lambda a, _: _special(a).p,
    "white_special_aux_r2": lambda a, _: _special(a).r2,
    "reset_f": lambda a, _: _reset(a).statistic,
    "reset_p": lambda a, _: _reset(a).p,
    "reset_df1": lambda a, _: _reset(a).df[0],
    "reset_df2": lambda a, _: _reset(a).df[1],
    "lof_f": lambda a, _: _lack(a).statistic,
    "lof_p": lambda a, _: _lack(a).p,
    "lof_ss": lambda a, _: _lack(a).sum_lack,
    "pe_ss": lambda a, _: _lack(a).sum_pure,
    "lof_df": lambda a, _: _lack(a).df[0],
    "pe_df": lambda a, _: _lack(a).df[1],
}

PLACED: tuple[Placed, ...] = ((r"(linear)_deviance", lambda a, _: gaussian_deviance(a.other(a.form.left, "x"))),)
