"""Computes the numbers of a published case through batten.

A case is a dict as SCHEMA.md of the check cases describes it: data, formula, keys. `compute` answers every key that
batten offers and says why for the others.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from functools import cache, cached_property
from typing import Any

import numpy as np
import pandas as pd
from asked import FORMS, Asked
from case_arithmetic import arithmetic
from case_curves import CurveFit, certified, in_letters, own_curve
from case_fits import Fitted
from case_forms import Form, read_form
from case_numbers import RULES, number
from case_tables import NotDelivered, table, without_dropped
from case_written import Written
from numbers_of_effect import ABOUT_X

import batten

__all__ = ["Answers", "compute"]

Case = Mapping[str, Any]


@dataclass(frozen=True)
class Answers:
    """numbers by key; missing: key -> why batten does not deliver it."""

    numbers: dict[str, float] = field(default_factory=dict)
    missing: dict[str, str] = field(default_factory=dict)


def compute(case: Case) -> Answers:
    """All keys of a case, published and exact."""
    keys = list(dict.fromkeys([*case["expect"], *case["exact"]]))
    out = Answers()
    try:
        ask = _asker(case)
    except NotDelivered as why:
        return Answers({}, dict.fromkeys(keys, str(why)))
    for key in keys:
        try:
            out.numbers[key] = ask(key)
        except NotDelivered as why:
            out.missing[key] = str(why)
        except batten.BattenError as error:
            out.missing[key] = f"refused: {' '.join(str(error).split())}"
    return out


def _asker(case: Case) -> Callable[[str], float]:
    if case["data_from"]["kind"] == "none":
        known = arithmetic(case)
        return lambda key: _known(known, key)
    return (_Curves if case["kind"] in ("curve", "nist-nonlinear") else _Regressions)(case, table(case)).number


def _known(numbers: Mapping[str, float], key: str) -> float:
    if key not in numbers:
        raise NotDelivered(f"no rule for {key}")
    return numbers[key]


class _Regressions:
    """Keys about fixed forms; a prefix names a second form or a part of the rows."""

    def __init__(self, case: Case, frame: pd.DataFrame) -> None:
        self.case, self.frame = case, frame
        given = case.get("given") or {}
        self.at, self.level = dict(given.get("at", {})), given.get("level", 0.95)
        self.x = given.get("x", self.at.get(case["focus"]))
        self.asked = cache(self._asked)

    def number(self, key: str) -> float:
        prefix, key = _split(key)
        return number(self.asked(self._form_of_test(prefix, key), self._focus(key)), key)

    def _asked(self, prefix: str, focus: str) -> Asked:
        other = {**self.case, "focus": focus}
        form = self.form(prefix) if focus == self.case["focus"] else read_form(other, self.frame)
        return Asked(Fitted(form, self.level), self.at, self.x)

    def _focus(self, key: str) -> str:
        """A turning point or slope of another predictor is asked with that one as the focal predictor."""
        name, _, term = key.partition(":")
        plain = re.sub(r"^log\((\w+)\)$", r"\1", term)
        return plain if name in ABOUT_X and plain in self.frame else self.case["focus"]

    def _form_of_test(self, prefix: str, key: str) -> str:
        """Some notes say that a test belongs to the straight line."""
        group = re.search(r"(\w+)_\* is for the straight line", self.case.get("note", ""))
        return "linear" if group and not prefix and key.startswith(f"{group[1]}_") else prefix

    @cached_property
    def base(self) -> Form:
        return read_form(self.case, self.frame)

    def form(self, prefix: str) -> Form:
        """The form that a prefix names."""
        if not prefix:
            return self.base
        numbered = re.fullmatch(r"set(\d)(q?)", prefix)
        if numbered:
            return self._numbered(numbered[1], squared=bool(numbered[2]))
        if prefix == "unrounded":
            return read_form(self.case, table(self.case, rounded=False))
        some = without_dropped(self.case, self.frame, prefix)
        if some is not None:
            return read_form(self.case, some)
        return self._same_rows(prefix)

    def _same_rows(self, prefix: str) -> Form:
        """Another remedy on the same rows."""
        base = self.base
        link = base.left.startswith("loglink")
        if prefix == "log":
            return base if link else base.with_key("log y", "x")
        if prefix == "logx":
            return base.with_key(base.left, "log x")
        if prefix == "raw":
            return base.with_key(base.left, base.right)
        if prefix in ("linear", "lin", "level", "levels"):
            return base.plain
        if prefix == f"{base.focus}_linear":
            return base.with_key(base.left, "x")
        if prefix == "interaction":
            return replace(base, crossed=base.covariates)
        if prefix == "inverse":
            return replace(base, left="invlink-gamma y")
        if prefix == "glm_gaussian_log":
            return base.with_key("loglink-gaussian y", "x")
        if prefix in FORMS:
            return base.with_key(*FORMS[prefix])
        raise NotDelivered(f"no form {prefix}")

    def _numbered(self, which: str, *, squared: bool) -> Form:
        """One of several sets in one table: x1, y1, x2, y2, ..."""
        frame = pd.DataFrame({"x": self.frame[f"x{which}"], "y": self.frame[f"y{which}"]})
        return Form(frame, "y", "x").with_key("y", "poly2 x" if squared else "x")


class _Curves(_Regressions):
    """Keys about a curve written out in its parameters; a prefix names a form that gives it a start."""

    @cached_property
    def base(self) -> Form:
        return Form(self.frame, self.case["response"], self.case["focus"])

    @cached_property
    def sides(self) -> tuple[str, str]:
        left, right = self.case["formula"].split("~", 1)
        return left.strip(), right.strip()

    @cached_property
    def written(self) -> Written:
        return Written.read(self.sides[1], {str(c): self.frame[c].to_numpy() for c in self.frame})

    @cached_property
    def curve(self) -> CurveFit:
        if self.sides[0] == self.case["response"]:
            try:
                return own_curve(self.written, self.base)
            except NotDelivered:
                pass
        given = self.case.get("given") or {}
        starts = [np.array(v, float) for k, v in sorted(given.items()) if k.startswith("start") and isinstance(v, list)]
        y = Written.read(self.sides[0], {str(c): self.frame[c].to_numpy() for c in self.frame}).value(np.empty(0))
        return certified(self.written, y, starts)

    def number(self, key: str) -> float:
        prefix, key = _split(key)
        if not prefix:
            return self.curve.number(key)
        if key in self.written.parameters:
            fitted = self.asked(prefix, self.case["focus"]).fitted
            b = in_letters(self.written, fitted.back(fitted.eta))
            return float(b[self.written.parameters.index(key)])
        return number(self.asked(prefix, self.case["focus"]), key)


def _split(key: str) -> tuple[str, str]:
    """Prefix and key; "" where the key has no prefix."""
    if key.endswith("_linear_model"):
        return "linear", key.removesuffix("_linear_model")
    first, colon, rest = key.partition(":")
    return (first, rest) if colon and first not in RULES and first != "fitted_at" else ("", key)
