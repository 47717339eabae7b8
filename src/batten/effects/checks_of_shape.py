"""Is the mean's shape along the predictor right? Left-over bend, repeats, order along x, kinks and cuts, groups."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from scipy.special import ndtri
from scipy.stats import t as student

from batten.diagnose.bend import knots_for
from batten.diagnose.searched_places import candidate_places, davies, hinge_columns, place_t, searched_cut_p, sup_f
from batten.diagnose.tests_along_x import harvey_collier, rainbow
from batten.diagnose.tests_of_shape import add_on, add_on_robust, pure_error
from batten.effects.check import Check, Tested, Working, added, added_check, chance
from batten.effects.numbers import show
from batten.effects.tell import Names
from batten.engine.rows import Array
from batten.families.shapes.hinge import Hinge
from batten.families.shapes.spline import Spline
from batten.fit.estimate import Estimate

__all__ = ["bending_columns", "checks_of_shape"]

#: rows up to which a search is repeated on resamples, and up to which rows are predicted in turn
RESAMPLED, IN_TURN = 5_000, 20_000
#: resamples of a search
RESAMPLES = 999


def checks_of_shape(est: Estimate, work: Working, names: Names, *, errors: str, every: bool) -> Iterator[Check | None]:
    """The spline's bends come first: the one test fixed beforehand. every: also those that repeat a question.

    A penalised curve holds that spline's bends, only held back: beside it no test of the shape along x says anything.
    """
    smooth = est.roughness is not None
    if not smooth:
        yield _bend(est, work, names, errors)
    yield _powers_of_fit(est, work, names, errors)
    if not smooth:
        yield _repeats(est, work, names)
    yield _same_shape(est, work, names, errors)
    hinge, alone = isinstance(est.shape, Hinge), est.rows.modifier.shape[1] == 1
    if est.link is None and est.theta and alone and not est.remedy.left.searched:
        if hinge:
            yield _kink(est, work, names)
        elif est.shape.steps and est.shape.finite:
            yield _cut(est, work, names)
        if hinge and every:
            yield _kink_resampled(est, work, names, errors)
    if every:
        other, how = ("constant", "even spread") if errors == "robust" else ("robust", "any spread")
        yield _powers_of_fit(est, work, names, other, how=how)
    if every and not smooth:
        yield _in_turn(est, work, names)
        yield _middle(est, work, names)


def bending_columns(est: Estimate) -> Array | None:
    """Bends (n, k) of a spline whose knots the number of rows fixes, for every modifier."""
    spline = Spline(knots_for(est.n))
    if spline.refuse(est.rows.x):
        return None
    columns = spline.columns(est.rows.x, spline.learn(est.rows.x))[:, 1:]
    return np.asarray((columns[:, None, :] * est.rows.modifier[:, :, None]).reshape(est.n, -1))


def _bend(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    extra = bending_columns(est)
    if extra is None:
        return None
    asked = f"does a spline in {names.x}, added to this remedy, find more bend?"
    return added_check("left-over bend", "shape", asked, added(work, extra, errors=errors), work, names)


def _powers_of_fit(est: Estimate, work: Working, names: Names, errors: str, *, how: str = "") -> Check | None:
    """Squares and cubes of the fit (Ramsey 1969). how: words for errors other than those in use."""
    away, size = est.eta - est.eta.mean(), float(np.std(est.eta))
    if size <= 1e-10 * float(np.abs(est.eta).max()):
        return None
    extra = np.column_stack([(away / size) ** 2, (away / size) ** 3])
    told = f", {how}" * bool(how)
    asked = f"do the square and the cube of the fit add anything (RESET{told})?"
    return added_check(f"powers of the fit{told}", "shape", asked, added(work, extra, errors=errors), work, names)


def _repeats(est: Estimate, work: Working, names: Names) -> Check | None:
    """Lack of fit against the spread of rows that repeat in all predictors; a searched break or power counts."""
    if est.link is not None or est.remedy.left.searched:
        return None
    found = pure_error(work.X / work.root[:, None], work.z / work.root, weights=est.rows.weights)
    if found is None:
        return None
    size = found.gap_rms * work.lean
    reading = (
        f"means of repeated rows lie {show(size, names.y_unit)} from the fit, {chance(found.p)}; "
        f"repeats spread by {show(found.sd * work.lean, names.y_unit)}"
    )
    asked = "do rows with equal predictors average to the fit (pure error)?"
    test = Tested("F", found.statistic, found.df, found.p)
    return Check("repeated rows", "shape", asked, size, names.y_unit, reading, test)


def _in_turn(est: Estimate, work: Working, names: Names) -> Check | None:
    """Each row predicted from those with smaller x (Harvey and Collier 1977)."""
    if est.link is not None or est.moving or est.n > IN_TURN:
        return None
    found = harvey_collier(work.X, work.z, along=est.rows.x)
    if found is None:
        return None
    size = found.mean * work.lean
    way = "above" if size > 0 else "below"
    reading = (
        f"they lie {show(abs(size), names.y_unit)} {way} on average, {chance(found.p)} "
        "(above: the curve turns up along the way; below: it turns down)"
    )
    asked = f"where do rows lie, each predicted from those with smaller {names.x} (Harvey-Collier)?"
    test = Tested("t", found.statistic, (found.df,), found.p)
    return Check("rows in turn", "shape", asked, size, names.y_unit, reading, test)


def _middle(est: Estimate, work: Working, names: Names) -> Check | None:
    """The half of the rows in the middle against all (Utts 1982)."""
    if est.link is not None or est.moving:
        return None
    found = rainbow(work.X, work.z)
    if found is None:
        return None
    every, centre = found.sd_all * work.lean, found.sd_centre * work.lean
    reading = (
        f"errors spread by {show(centre, names.y_unit)} around a fit to the {found.rows} rows in the middle, by "
        f"{show(every, names.y_unit)} around the fit to all, {chance(found.p)}"
    )
    asked = "do the rows in the middle fit better by themselves (rainbow)?"
    test = Tested("F", found.statistic, found.df, found.p)
    return Check("middle rows", "shape", asked, every - centre, names.y_unit, reading, test)


def _same_shape(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """Whether the interaction's columns are needed: the fit without them, and what they add."""
    m = est.rows.modifier.shape[1]
    constant = [j for j in range(m) if (est.rows.modifier[:, j] == 1).all()]
    if m < 2 or not constant or est.moving:
        return None
    k = est.shape.columns(est.rows.x[:1], est.state, est.theta).shape[1]
    first = len(est.coef) - m * k
    plain = [j for j in range(len(est.coef)) if j < first or (j - first) // k in constant]
    crossed = [j for j in range(len(est.coef)) if j not in plain]
    if errors == "robust":
        found = add_on_robust(work.X[:, plain], work.X[:, crossed], work.z, cluster=work.cluster)
    else:
        found = add_on(work.X[:, plain], work.X[:, crossed], work.z)
    asked = f"is the shape along {names.x} the same in every group?"
    return added_check("same shape in every group", "shape", asked, found, work, names)


def _kink(est: Estimate, work: Working, names: Names) -> Check | None:
    """The break was found by looking, so p pays for the search (Davies 1987)."""
    rows = est.rows
    t, df = place_t(_line(est), rows.weigh(hinge_columns(rows.x, candidate_places(rows.x))), work.z)
    found = davies(t, df=df)
    if found is None:
        return None
    size, per, turned = _turned(est, work, names)
    reading = f"{turned}, {chance(found.p)} (searched places counted)"
    test = Tested("t", found.largest, (), found.p)
    return Check("kink", "shape", "is there a kink anywhere (Davies)?", size, per, reading, test)


def _kink_resampled(est: Estimate, work: Working, names: Names, errors: str) -> Check | None:
    """The largest F over many places, searched again in resamples (Hansen 1996, 2017)."""
    if est.n > RESAMPLED:
        return None
    rows, line = est.rows, _line(est)
    columns = rows.weigh(hinge_columns(rows.x, candidate_places(rows.x)))
    found = sup_f(
        line, columns, work.z, rng=np.random.default_rng(0), resamples=RESAMPLES, wild=errors == "robust",
        cluster=work.cluster,
    )  # fmt: skip
    if found is None:
        return None
    size, per, turned = _turned(est, work, names)
    reading = f"{turned}, {chance(found.p)} (places searched again in {found.resamples} resamples)"
    test = Tested("F", found.statistic, (1, est.n - line.shape[1] - 1), found.p)
    asked = "is there a kink anywhere (largest F, resampled)?"
    return Check("kink, resampled", "shape", asked, size, per, reading, test)


def _line(est: Estimate) -> Array:
    """Design of the straight line in the break's place."""
    return est.rows.weigh(np.column_stack([est.rows.base, est.rows.x]))


def _turned(est: Estimate, work: Working, names: Names) -> tuple[float, str, str]:
    """Change of the slope at the (last) break, its unit, and words."""
    size, per = float(np.abs(est.coef[-1])) * work.lean, f"{names.y_unit or names.y} per {names.one}"
    return size, per, f"the slope changes by {show(size, per)} at the break"


def _cut(est: Estimate, work: Working, names: Names) -> Check:
    step = est.rows.weigh(np.asarray(est.rows.x >= est.theta[0], dtype=float))[:, None]
    t, df = place_t(est.rows.weigh(est.rows.base), step, work.z)
    # by the smaller tail, for the larger loses its digits
    score = -float(ndtri(max(float(student.sf(abs(t[0]), df)), 1e-300)))
    p, size = searched_cut_p(score), abs(float(est.coef[-1])) * work.lean
    reading = f"the step is {show(size, names.y_unit)}, {chance(p)} (searched places counted)"
    asked = "is there a step anywhere (Miller-Siegmund)?"
    return Check("cut", "shape", asked, size, names.y_unit, reading, Tested("t", float(t[0]), (df,), p))
