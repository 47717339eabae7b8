"""A part of the full walk (`python tests/walk_everything.py`): each question has one answer, wherever it is read."""

from __future__ import annotations

import dataclasses
from typing import Any

import agreement
import pytest
from agreement import CASES, Found, compare, examined
from runner import ENGINES, Ran, run_script

#: each kind of remedy on some data set; the rest is left to the full walk
SAMPLED = {
    "castings": ("y ~ hinge x", "log y ~ bins5 x", "boxcox y ~ 1/x"),
    "glasshouse": ("y ~ s-curve x", "sqrt y ~ log x", "1/y ~ x", "log y ~ smooth x"),
    "pumps": ("y ~ poly2 x", "share y ~ spline4 x", "log y ~ x^p"),
    "hprice1": ("log y ~ log x", "weighted y ~ x", "loglink-gamma y ~ x"),
    "gpa2": ("y ~ log x", "log y ~ spline3 x"),
    "meap93": ("y ~ x", "log y ~ fp1 x", "loglink-gaussian y ~ log x"),
}


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_table_sentences_page_and_script_agree_to_the_printed_digit(case: agreement.Case) -> None:
    exam = examined(case, SAMPLED[case.name])
    turn = CASES.index(case)
    total = Found()
    for i, key in enumerate(exam):
        # one engine each by turns; the full walk takes both
        total.add(compare(exam, case, (ENGINES[(i + turn) % 2],), keys=[key]))
    assert not total.wrong, "\n".join(total.wrong)
    assert total.scripts == len(exam)
    assert total.statements.total() > 20 * len(exam)


def test_the_walk_notices_a_number_that_differs(monkeypatch: pytest.MonkeyPatch) -> None:
    """An effect, a coefficient or a prediction that is off in the fourth digit is found where it is compared."""

    def moved(*asked: Any, **more: Any) -> Ran:
        ran = run_script(*asked, **more)
        names = {**ran.names, "effect": 1.0005 * ran.names["effect"], "table": 1.0005 * ran.names["table"]}
        names["answer"], names["along"] = 1.0005 * names["answer"], [1.0005 * v for v in names["along"]]
        return dataclasses.replace(ran, names=names)

    monkeypatch.setattr(agreement, "run_script", moved)
    exam = examined(CASES[0], ["y ~ x", "log y ~ log x"])
    found = compare(exam, CASES[0], ENGINES[:1])
    kinds = {wrong.partition(":")[0] for wrong in found.wrong}
    assert {"table", "coefficients", "predict()", "sentences", "sentences, printed", "page, by script"} <= kinds
