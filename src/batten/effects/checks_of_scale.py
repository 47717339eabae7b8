"""Is it the right scale or power? Tests along the ladder, and whether the answer hangs on the unit of y."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from batten.diagnose.closed_test import closed_test
from batten.diagnose.influence import power_pull
from batten.diagnose.ladder_tests import pe_columns, power_step
from batten.effects.check import Check, Tested, Working, added_check, added_t, chance, plain_scale
from batten.effects.numbers import place, show
from batten.effects.tell import Names
from batten.effects.units import unit_change
from batten.families import parse
from batten.families.remedy import Remedy
from batten.families.shapes.straight import Straight
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

__all__ = ["checks_of_scale"]


def checks_of_scale(
    est: Estimate, work: Working, names: Names, *, span: tuple[float, float], errors: str, every: bool
) -> Iterator[Check | None]:
    """The unit of y where the scale holds one; every: also the tests along the ladder."""
    yield _unit_of_y(est, names, span)
    yield _clipped(est, names)
    if not every:
        return
    yield _square_of_fit(est, work, names, errors)
    yield _level_or_log(est, work, names, errors)
    yield _power_of_y(est, work, names, errors)
    yield _power_of_x(est, work, names, errors)
    yield from _powers_needed(est, work, names)


def _clipped(est: Estimate, names: Names) -> Check | None:
    """How much of the average that brings means back stands at the end of y's domain (Poirier 1978 on Box-Cox)."""
    if est.link is not None or est.scale.closed == "identity":
        return None
    low, high = est.scale.limits(est.c)
    if not (math.isfinite(low) or math.isfinite(high)):
        return None
    # pairs of a fitted value and another row's residual that leave the scale, counted by sorting
    e = np.sort(est.residual / est.rows.root_weight)
    below = np.searchsorted(e, low - est.eta, side="left").sum()
    above = len(e) * est.n - np.searchsorted(e, high - est.eta, side="right").sum()
    share, end = 100 * float(below + above) / est.n**2, low if below >= above else high
    stands = float(est.scale.inverse(np.array([end]), est.c)[0])
    if not math.isfinite(stands):  # such a fit is refused where any pair leaves the scale
        return None
    reading = (
        f"{show(share, '%')} of fitted values with a residual leave what {est.scale.key} can undo and count as "
        f"{place(stands, names.y_unit)}"
    )
    asked = f"how much of a mean stands at the end of what {names.y} can be?"
    return Check("beyond the scale", "scale", asked, share, "%", reading)


def _square_of_fit(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """Link test (Pregibon 1980): the squared fit beside the fit."""
    away = est.eta - est.eta.mean()
    if float(np.abs(away).max()) <= 1e-10 * float(np.abs(est.eta).max()):
        return None
    beside = np.column_stack([work.root, away * work.root])
    asked = "does the square of the fit, beside the fit, add anything (link test)?"
    return _t_check("square of the fit", asked, added_t(work, away**2, errors=errors, X0=beside), work, names)


def _level_or_log(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """PE test (MacKinnon, White and Davidson 1983) of y against log y with the same predictors."""
    log = est.remedy.left.key == "log y"
    if not (plain_scale(est) or log) or est.moving or est.rows.weights is not None or np.min(est.rows.y) <= 0:
        return None
    other = est.rows.y if log else np.log(est.rows.y)
    other_fit = work.q @ (work.q.T @ other)
    level_fit, log_fit = (other_fit, est.eta) if log else (est.eta, other_fit)
    name, rival = "level or log", names.y if log else f"log {names.y}"
    asked = f"does the same model of {rival} explain what this one leaves (PE)?"
    columns = pe_columns(level_fit, log_fit)
    if columns is None:
        lowest = float(np.min(level_fit))
        reading = f"not available: the fit of {names.y} itself falls to {show(lowest, names.y_unit)}, which has no log"
        return Check(name, "scale", asked, lowest, names.y_unit, reading)
    return _t_check(name, asked, added_t(work, columns[1] if log else columns[0], errors=errors), work, names)


def _power_of_y(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """Constructed variable for a power of y (Atkinson 1973)."""
    if not plain_scale(est) or est.rows.weights is not None or np.min(est.rows.y) <= 0:
        return None
    found = power_pull(work.X, est.rows.y)
    if found is None:
        return None
    logs = np.log(est.rows.y)
    check = _t_check(
        "power of y", f"would a power of {names.y} fit better than {names.y} itself (Atkinson)?",
        added_t(work, est.rows.y * (logs - logs.mean() - 1), errors=errors), work, names,
    )  # fmt: skip
    if check is None or not np.isfinite(found.without).any():
        return check
    row = int(np.nanargmax(np.abs(found.without - found.power)))
    more = (
        f"; the rows point to a power of about {show(found.power)} (1 is {names.y} itself, 0 its log), without row "
        f"{{row}} to {show(float(found.without[row]))}"
    )
    return Check(check.name, "scale", check.asked, check.size, check.unit, check.reading + more, check.test, row)


def _power_of_x(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """x log x beside x (Box and Tidwell 1962)."""
    alone = est.rows.modifier.shape[1] == 1 and bool((est.rows.modifier == 1).all())
    step = power_step(work.X, est.rows.x, work.z, root=work.root) if isinstance(est.shape, Straight) and alone else None
    if step is None:
        return None
    found = added_t(work, step.column, errors=errors)
    more = ""
    if found is not None and found[1].p < 0.05 and math.isfinite(step.power):
        more = f"; a first step goes to the power {show(step.power)} (1 is {names.x} itself, 0 its log)"
    asked = f"would a power of {names.x} fit better than {names.x} itself (Box-Tidwell)?"
    return _t_check("power of x", asked, found, work, names, more=more)


def _t_check(
    name: str, asked: str, found: tuple[object, Tested] | None, work: Working, names: Names, *, more: str = ""
) -> Check | None:
    if found is None:
        return None
    check = added_check(name, "scale", asked, found[0], work, names, more=more)  # type: ignore[arg-type]
    assert check is not None
    return Check(name, "scale", asked, check.size, check.unit, check.reading, found[1])


def _powers_needed(est: Estimate, work: Working, names: Names) -> Iterator[Check | None]:
    """Closed test of fractional polynomials (Royston and Altman 1994), for a fit that is one."""
    if est.link is not None or est.shape.group != "fractional" or not est.theta or est.rows.modifier.shape[1] > 1:
        return
    fits = {}
    for word in ("fp2 x", "fp1 x", "x"):
        fits[word] = estimate(est.rows, Remedy(est.remedy.left, parse(f"y ~ {word}").shape), c=est.c)
    two, one, line = (found for found in fits.values())
    if not (isinstance(two, Estimate) and isinstance(one, Estimate) and isinstance(line, Estimate)):
        return
    base = est.rows.weigh(est.rows.base)
    none = base @ np.linalg.lstsq(base, work.z, rcond=None)[0]
    rss = [float(v.residual @ v.residual) for v in (line, one, two)]
    found = closed_test(
        none=float(np.sum((work.z - none) ** 2)), straight=rss[0], one_power=rss[1], two_powers=rss[2], n=est.n,
        others=base.shape[1],
    )  # fmt: skip
    if found is None:
        return
    asked = {
        "no effect": f"do two powers of {names.x} fit better than none of it (closed test)?",
        "straight": "do they fit better than a straight line (closed test)?",
        "one power": "do they fit better than the best single power (closed test)?",
    }
    fitted = {"no effect": none / est.rows.root_weight, "straight": line.eta, "one power": one.eta}
    for name, step in (("no effect", found.no_effect), ("straight", found.straight), ("one power", found.one_power)):
        size = float(np.abs(two.eta - fitted[name]).max()) * work.lean
        reading = f"the two fits differ by up to {show(size, names.y_unit)}, {chance(step.p)}"
        reading += f"; the closed test ends here: {_VERDICTS[name]}" if name == found.verdict else ""
        test = Tested("F", step.statistic, step.df, step.p)
        yield Check(f"two powers against {_RIVALS[name]}", "scale", asked[name], size, names.y_unit, reading, test)
        if name == found.verdict:
            return


_RIVALS = {"no effect": "none", "straight": "a line", "one power": "one"}
_VERDICTS = {"no effect": "no effect shown", "straight": "a line will do", "one power": "one power will do"}


def _unit_of_y(est: Estimate, names: Names, span: tuple[float, float]) -> Check | None:
    """The same remedy with y in hundredths of its unit."""
    found = unit_change(est, span)
    if found is None:
        return None
    asked = f"would the answer be the same with {names.y} in hundredths of its unit?"
    words = found.sentence(names).text
    return Check("unit of y", "scale", asked, found.change, names.y_unit, words[0].lower() + words[1:].rstrip("."))
