"""A case's formula as batten takes it: plain response and focal predictor, the forms in a remedy's key.

`log(y) ~ x + I(x**2) + log(z)` is the remedy `log y ~ poly2 x` on `y ~ x + np.log(z)`. Each focal term of the
published formula is kept with what it is in the remedy, so that its coefficient can be found again.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
import pandas as pd
import patsy
from case_tables import NotDelivered, definitions
from case_terms import Term, focal_term, shape_of, unwrapped, usual_terms

__all__ = ["Form", "read_form"]

Case = Mapping[str, Any]

_LINKS = {"poisson": "loglink y", "gamma": "loglink-gamma y", "gaussian": "loglink-gaussian y"}
_LEFT = {"log": ("log y", 1.0), "log10": ("log y", 1 / math.log(10)), "sqrt": ("sqrt y", 1.0)}


@dataclass(frozen=True, eq=False)
class Form:
    """One regression on a table.

    left, right: the remedy's key. covariates: further terms as batten's formula takes them. crossed: those that
    multiply the focal predictor. terms: published term (blanks removed) -> Term, for terms in the focal predictor.
    factor, shift: published scale of the response = factor times ours + shift. centre: place from which the published
    powers are counted. percent: length of one natural log in published units of y where y was logged beforehand.
    levels: of a focal predictor that is no number and stands as 0, 1, ...
    """

    frame: pd.DataFrame
    response: str
    focus: str
    left: str = "y"
    right: str = "x"
    covariates: tuple[str, ...] = ()
    crossed: tuple[str, ...] = ()
    intercept: bool = True
    terms: Mapping[str, Term] = field(default_factory=dict)
    factor: float = 1.0
    shift: float = 0.0
    centre: float = 0.0
    percent: float | None = None
    levels: tuple[str, ...] = ()

    @property
    def key(self) -> str:
        return f"{self.left} ~ {self.right}"

    @property
    def formula(self) -> str:
        """For batten: response and focal predictor untransformed."""
        right = [self.focus, *self.covariates, *(f"{self.focus}:{c}" for c in self.crossed)]
        return f"{self.response} ~ {' + '.join(right)}{'' if self.intercept else ' - 1'}"

    @property
    def plain(self) -> Form:
        """Everything untransformed."""
        bare = (re.sub(r"^np\.\w+\((\w+)\)$", r"\1", c) for c in self.covariates if not c.startswith("I("))
        return self.with_key("y", "x", covariates=tuple(dict.fromkeys(bare)))

    def with_key(self, left: str, right: str, **changes: Any) -> Form:
        """Another remedy on the same table, its terms named as one would type them."""
        usual: dict[str, Any] = {"terms": usual_terms(self.focus, right), "factor": 1.0, "shift": 0.0, "centre": 0.0}
        return replace(self, left=left, right=right, **usual, **changes)


def read_form(case: Case, frame: pd.DataFrame) -> Form:
    """The form of the case's own formula."""
    special = _family(case, frame)
    if special is not None:
        return special
    text, counted = _without_remarks(case["formula"], frame)
    frame, levels = _numbered(frame, case["focus"])
    form = Form(frame, case["response"], case["focus"], levels=levels)
    try:
        left, right = (side.strip() for side in _with_numpy(text).split("~"))
        terms = patsy.ModelDesc.from_formula(f"response ~ {right}").rhs_termlist
    except (ValueError, patsy.PatsyError) as error:
        raise NotDelivered(f"formula not read: {case['formula']}") from error
    factors = [tuple(f.name() for f in term.factors) for term in terms]
    form = _response(case, replace(form, intercept=() in factors), left)
    if counted is None:
        return _link(case, _predictors(form, factors))
    name, centre = counted
    focal = [tuple(re.sub(rf"\b{name}\b", form.focus, f) for f in term) for term in factors]
    form = _predictors(replace(form, centre=centre), focal)
    named = {re.sub(rf"\b{form.focus}\b", name, term): found for term, found in form.terms.items()}
    return _link(case, replace(form, terms=named))


def _family(case: Case, frame: pd.DataFrame) -> Form | None:
    """Formulas that name a family of forms instead of columns."""
    form, text = Form(frame, case["response"], case["focus"]), case["formula"]
    knots = re.search(r"rcs\(\w+, *(\d) knots(?: at quantiles ([\d. ]+))?", text)
    if knots and len(frame) < 100 and knots[2]:  # where batten puts the outer knots at the fifth values
        places = np.quantile(frame[form.focus].dropna(), [float(q) for q in knots[2].split()])
        return replace(form, right=f"spline({', '.join(repr(float(p)) for p in places)}) x")
    if knots:
        return replace(form, right=f"spline{knots[1]} x")
    if "_+" in text:
        return replace(form, right="hinge x")
    return form if re.search(r" against |~ *(?:FP|fp|polynomial)\(", text) else None


def _without_remarks(formula: str, frame: pd.DataFrame) -> tuple[str, tuple[str, float] | None]:
    """The formula alone, and a predictor defined after a comma: its name and the place it counts from."""
    text = re.sub(r" \((?=[^()]*link)[^()]*\)\s*$", "", formula)
    defined = re.fullmatch(r"(.+), (\w+) = (\w+) *- *(?:mean\((\w+)\)|([\d.]+))", text)
    if not defined:
        return text, None
    place = float(defined[5]) if defined[5] else float(frame[defined[4]].mean())
    return defined[1], (defined[2], place)


def _numbered(frame: pd.DataFrame, focus: str) -> tuple[pd.DataFrame, tuple[str, ...]]:
    """Groups without numbers stand as 0, 1, ... in the order of their names."""
    if pd.api.types.is_numeric_dtype(frame[focus]):
        return frame, ()
    codes, levels = pd.factorize(frame[focus], sort=True)
    return frame.assign(**{focus: np.where(codes < 0, np.nan, codes)}), tuple(str(v) for v in levels)


def _with_numpy(text: str) -> str:
    return re.sub(r"\b(?<!\.)(log10|log2|log|sqrt|exp|maximum)\(", r"np.\1(", text)


def _response(case: Case, form: Form, left: str) -> Form:
    """Scale and unit of the response."""
    bare, y = unwrapped(left), re.escape(form.response)
    function, power = re.fullmatch(rf"(\w+)\({y}\)", bare), re.fullmatch(rf"{y}\*\*\(?(-?[\d.]+)\)?", bare)
    if bare == form.response:
        return form
    if bare in (f"log({form.response}+1)", f"log1p({form.response})"):
        return replace(form, left="log1p y")
    if bare == f"1/{form.response}":
        return replace(form, left="1/y")
    if function and function[1] in _LEFT:
        scale, factor = _LEFT[function[1]]
        return replace(form, left=scale, factor=factor)
    if power:
        exponent = float(power[1])
        return replace(form, left=f"boxcox({exponent!r}) y", factor=exponent, shift=1.0)
    if bare in form.frame:
        return replace(form, response=bare, percent=_logged(case, bare))
    raise NotDelivered(f"response {left} has no scale")


def _logged(case: Case, name: str) -> float | None:
    """Units of a column in one natural log of the response, where `prep` made it a multiple of its logarithm."""
    made = re.match(r"(?:([\d.]+) *\* *)?(log|log10)\(\w+\)(?: rounded|$)", definitions(case).get(name, ""))
    return None if made is None else float(made[1] or 1) * (1 / math.log(10) if made[2] == "log10" else 1)


def _predictors(form: Form, factors: list[tuple[str, ...]]) -> Form:
    """Focal terms, covariates, interactions."""
    terms: dict[str, Term] = {}
    covariates, crossed = [], []
    for term in filter(None, factors):
        focal = {f: found for f in term if (found := focal_term(f, form.focus, form.frame)) is not None}
        others = [f for f in term if f not in focal]
        if len(focal) > 1 or any(re.search(rf"\b{re.escape(form.focus)}\b", f) for f in others):
            raise NotDelivered(f"term {':'.join(term)} is none of batten's shapes of {form.focus}")
        if focal and others:
            crossed.append(":".join(others))
        elif focal:
            terms |= {f.replace(" ", "").replace("np.", ""): found for f, found in focal.items()}
        else:
            covariates.append(":".join(term))
    form = replace(form, covariates=tuple(covariates), crossed=tuple(crossed), terms=terms)
    return replace(form, right=shape_of(terms, form.frame[form.focus])) if terms else _standing_in(form)


def _standing_in(form: Form) -> Form:
    """A formula without the focal predictor: it stands there in bands, or another column takes its place."""
    x, bands = form.frame[form.focus], _bands(form)
    if bands:
        lowest = {name: float(x[form.frame[name] == 1].min()) for name in bands}
        starts = sorted([*lowest.values(), float(x[form.frame[bands].sum(axis=1) == 0].min())])
        rest = tuple(c for c in form.covariates if c not in bands)
        key = f"bins({', '.join(map(repr, starts[1:]))}) x"
        terms = {name: Term("band", starts.index(low)) for name, low in lowest.items()}
        return replace(form, right=key, covariates=rest, terms=terms)
    plain = [c for c in form.covariates if c in form.frame and pd.api.types.is_numeric_dtype(form.frame[c])]
    if not plain:
        raise NotDelivered("no predictor stands plain in the formula")
    rest = tuple(c for c in form.covariates if c != plain[0])
    return replace(form, focus=plain[0], covariates=rest, terms={plain[0]: Term("power", 1)})


def _bands(form: Form) -> list[str]:
    """Yes/no covariates that are 1 on one stretch of the focal predictor and overlap nowhere."""
    frame, x = form.frame, form.focus
    found = []
    for name in form.covariates:
        if name not in frame or not set(frame[name].dropna().unique()) <= {0, 1}:
            continue
        inside, outside = frame[x][frame[name] == 1], frame[x][frame[name] == 0]
        if len(inside) and not outside.between(inside.min(), inside.max()).any():
            found.append(name)
    return found if len(found) > 1 and (frame[found].sum(axis=1) <= 1).all() else []


def _link(case: Case, form: Form) -> Form:
    """A generalised linear model's distribution stands beside its formula."""
    if case["kind"] != "glm-log":
        return form
    said = f"{case['formula']} {case['remedy']}".lower()
    family = next((name for name in _LINKS if name in said), None)
    if family is None:
        raise NotDelivered("distribution not read")
    return replace(form, left=_LINKS[family])
