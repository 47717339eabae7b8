"""Walks through every panel of remedies and compares what a reader sees with the table, the sentences and the code.

    python tests/notebook/widget_walk.py          # every remedy on all rows of three data sets: some minutes

Text against text: the panels' words, the public tables, and what the inserted code prints when it is run.
"""

from __future__ import annotations

import io
import re
import sys
import warnings
from collections import Counter
from collections.abc import Iterable, Iterator
from contextlib import contextmanager, redirect_stdout

import numpy as np
import pandas as pd
import pytest
from widget_reading import Rounded, agreeing, all_html, parts_of, printed, words

import batten
from batten.exam import Examination
from batten.notebook.panels import desk, remedy_panels
from batten.notebook.widget import ExamWidget, widget_for

__all__ = ["ASKED", "compare_tables", "examined", "opened", "walked"]

#: formula, units
ASKED: dict[str, tuple[str, dict[str, str]]] = {
    "castings": ("minutes ~ mass_kg + C(alloy)", {"minutes": "min", "mass_kg": "kg"}),
    "glasshouse": ("yield_kg ~ Q('daily light') + C(cultivar) + bed_age", {"yield_kg": "kg"}),
    "pumps": ("energy ~ flow * C(pump)", {}),
}
FIT, LEFT, EFFECT, TRY, CODE, HOW = range(6)
NUMBER = r"[+\-−]?[\d,.]+(?:e[+\-]?\d+)?"
INTERVAL = rf"({NUMBER}) \(({NUMBER}) to ({NUMBER})\)"


def examined(name: str, **options: object) -> Examination:
    """All rows, every remedy of the default grid."""
    formula, units = ASKED[name]
    return batten.examine(formula, batten.sample(name), units=units, frame_name=name, **options)  # type: ignore[arg-type]


@contextmanager
def opened(exam: Examination, keys: Iterable[str]) -> Iterator[ExamWidget]:
    """The widget with a tab for each key; figures have tests of their own and are not drawn."""
    with pytest.MonkeyPatch.context() as patch:
        for name in ("fit_figure", "left_figure"):
            patch.setattr(remedy_panels, name, lambda *fits, **more: None)
        patch.setattr(desk, "img_html", lambda picture: "")
        box = widget_for(exam, cell_id=None, token="t")
        shown = parts_of(box)
        for key in keys:
            if key not in shown.keys:
                shown.picker.field.value = key
        assert set(keys) <= set(shown.keys)
        yield shown
        box.close()


def walked(shown: ExamWidget, frame: pd.DataFrame, key: str) -> Counter[str]:
    """Compare all panels of one remedy; returns how many numbers were compared, by where they stood."""
    exam = shown.desk.exam
    shown.tabs.selected_index = 1 + shown.keys.index(key)
    pages, seen = shown.remedies[key].pages, {}
    for place in (FIT, EFFECT, TRY, CODE, HOW):
        pages.buttons.index = place
        assert pages.message.box.value == "", words(pages.message.box)
        seen[place] = words(pages.panels[place].box)
    counted = Counter(remedies=1)
    counted["sentences"] += _sentences(exam, key, seen)
    counted["effects"] += _effects(exam, key, seen[EFFECT])
    counted["predictions"] += _predictions(exam, key, pages.panels[TRY])
    counted["coefficients"] += _coefficients(exam, key, seen[HOW])
    counted["code"] += _code(exam, key, seen, frame)
    return counted


def _sentences(exam: Examination, key: str, seen: dict[int, str]) -> int:
    told = [re.sub(r"\s+", " ", str(sentence)) for sentence in exam[key].sentences()]
    assert told[0] in seen[FIT]
    for sentence in told:
        assert sentence in seen[EFFECT]
    return len(told)


def _effects(exam: Examination, key: str, said: str) -> int:
    """The small table against `exam.table()` (mean) and the fit's own effects (mean and median)."""
    problem, fit, count = exam.problem, exam[key], 0
    unit = problem.unit(problem.response)
    row = exam.table([key]).iloc[0]
    both = [fit.span_effect(of=of) for of in ("mean", "median")]
    if np.isfinite(row[["difference", "difference_low", "difference_high"]].to_numpy(float)).all():
        first = printed(rf"^difference{f', {unit}' if unit else ''} {INTERVAL}", said)
        assert first == agreeing(row["difference"], row["difference_low"], row["difference_high"])
        count += 3
    for start, name in ((f"difference{f', {unit}' if unit else ''}", "difference"), ("ratio", "ratio"),
                        ("slope over the span, .* per [^+\\-\\d]*", "span_slope")):  # fmt: skip
        effects = [getattr(effect, name) for effect in both]
        if all(np.isfinite([e.estimate, e.low, e.high]).all() for e in effects):
            numbers = printed(rf"^{start} {INTERVAL} {INTERVAL}$", said)
            assert numbers == agreeing(*(v for e in effects for v in (e.estimate, e.low, e.high)))
            count += 6
    return count


def _predictions(exam: Examination, key: str, panel: object) -> int:
    """The tried row against `predict`, the table at round values against `lookup`."""
    fit, count = exam[key], 0
    said, row = words(panel.shown), panel.row()  # type: ignore[attr-defined]
    for of in ("mean", "median"):
        told = fit.predict(row, of=of, interval="estimate").iloc[0][["estimate", "low", "high"]].to_numpy(float)
        if np.isfinite(told).all():
            assert printed(rf"^{of} ({NUMBER}) ({NUMBER}) to ({NUMBER})$", said) == agreeing(*told)
            count += 3
    new = fit.predict(row, interval="new row").iloc[0]
    if np.isfinite([new["low"], new["high"]]).all():
        ends = printed(rf"^one new row like this ({NUMBER}) to ({NUMBER})$", said)
        assert ends == agreeing(new["low"], new["high"])
        count += 2
    panel.several.value = True  # type: ignore[attr-defined]
    lines = words(panel.table).split("\n")  # type: ignore[attr-defined]
    for x, told in fit.lookup().iterrows():
        numbers = told[["mean", "median", "low", "high"]].to_numpy(float)
        (cells,) = [line.split()[1:] for line in lines if line.split()[0] == f"{x:g}"]
        if np.isfinite(numbers).all():
            assert tuple(cells) == agreeing(*numbers)
            count += 4
    panel.several.value = False  # type: ignore[attr-defined]
    assert words(panel.table) == ""  # type: ignore[attr-defined]
    return count


def _coefficients(exam: Examination, key: str, said: str) -> int:
    count = 0
    for name, row in exam[key].coefficients.iterrows():
        values = row.to_numpy(float)
        if np.isfinite(values).all():
            line = rf"^{re.escape(' '.join(str(name).split()))} ({NUMBER}) ({NUMBER}) ({NUMBER}) ({NUMBER})$"
            assert printed(line, said) == agreeing(*values), name
            count += 4
    return count


def _code(exam: Examination, key: str, seen: dict[int, str], frame: pd.DataFrame) -> int:
    """The code in the panel is the fit's own; run, it prints the effect that the panels show."""
    code = exam[key].code()
    assert re.sub(r"\s+", " ", code).strip() in re.sub(r"\s+", " ", seen[CODE])
    said = io.StringIO()
    with redirect_stdout(said), warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of the libraries that the script uses
        exec(compile(code, key, "exec"), {exam.problem.frame_name: frame.copy()})
    row = exam.table([key]).iloc[0]
    wanted = [float(row[name]) for name in ("difference", "difference_low", "difference_high")]
    if not np.isfinite(wanted).all():
        return 0
    line = rf"mean at .*: ({NUMBER}) ?[^\d]*\(\d+% ({NUMBER}) to ({NUMBER})\)"
    assert printed(line, said.getvalue()) == agreeing(*wanted)
    return 3


def compare_tables(shown: ExamWidget) -> int:
    """The table of all against `exam.table()`: held-out errors, gaps, differences; returns how many rows."""
    exam = shown.desk.exam
    shown.tabs.selected_index = 0
    shown.compare.pages.buttons.index = 3
    html = "\n".join(all_html(shown.compare.pages.panels[3].box))
    number = r'<td class="batten-number">(.*?)</td>'
    found = re.findall(rf'<div class="batten-key batten-under">(.*?)</div>.*?</th>{number}{number}{number}', html)
    table = exam.table()
    assert [key for key, *_ in found] == list(table.index)
    for key, rmse, gap, difference in found:
        row = table.loc[key]
        assert Rounded(float(row["rmse"])) == rmse
        assert ("(tied)" in gap or gap == "lowest") == bool(row["tied"])
        assert gap == "lowest" or Rounded(float(row["rmse_gap"])) == gap.removesuffix(" (tied)")
        numbers = row[["difference", "difference_low", "difference_high"]].to_numpy(float)
        if np.isfinite(numbers).all():
            assert printed(rf"^{INTERVAL}$", difference) == agreeing(*numbers), key
    return len(found)


def main() -> None:
    total: Counter[str] = Counter()
    for name in ASKED:
        exam, frame = examined(name), batten.sample(name)
        with opened(exam, list(exam)) as shown:
            total["table rows"] += compare_tables(shown)
            for key in exam:
                try:
                    total += walked(shown, frame, key)
                except Exception as error:
                    total["failures"] += 1
                    print(f"{name}, {key}: {type(error).__name__} {str(error)[:400]}", file=sys.stderr)
        print(name, dict(total), flush=True)
    sys.exit(bool(total["failures"]))


if __name__ == "__main__":
    main()
