"""Every number on the widget is the table's, the sentences' and the code's, to the printed digit.

The source of all of them is one fit; what is compared here is text against text: what a reader sees in the panels, what
`exam.table()` holds, and the numbers that the emitted script asserts. Made-up data, so the truth of the numbers is not
the question here (tests of effects and of emitted code answer it).
"""

from __future__ import annotations

import re
from collections.abc import Iterator

import numpy as np
import pytest
from test_widget import CODE, EFFECT, TRY, show_panel
from widget_reading import Rounded, agreeing, all_html, parts_of, printed, words

import batten
from batten.exam import Examination
from batten.notebook.panels import desk, remedy_panels
from batten.notebook.widget import ExamWidget, widget_for

ASKED: dict[str, tuple[str, dict[str, str], list[str] | None]] = {
    "castings": ("minutes ~ mass_kg + C(alloy)", {"minutes": "min", "mass_kg": "kg"}, None),
    "glasshouse": ("yield_kg ~ Q('daily light') + C(cultivar) + bed_age", {"yield_kg": "kg"}, None),
    "pumps": ("energy ~ flow * C(pump)", {}, ["polynomials", "groups", "hinges", "links", "y ~ log x"]),
}
INTERVAL = r"(\S+) \((\S+) to ([^\s)]+)\)"


@pytest.fixture(scope="module", params=list(ASKED))
def exam(request: pytest.FixtureRequest) -> Examination:
    formula, units, only = ASKED[request.param]
    frame = batten.sample(request.param).iloc[::2]
    return batten.examine(formula, frame, only=only, folds=4, repeats=1, units=units, frame_name=request.param)


@pytest.fixture(scope="module")
def shown(exam: Examination) -> Iterator[ExamWidget]:
    """The widget with a tab for every remedy."""
    with pytest.MonkeyPatch.context() as patch:
        # figures have tests of their own
        patch.setattr(remedy_panels, "fit_figure", lambda *fits, **more: None)
        patch.setattr(desk, "img_html", lambda picture: "")
        box = widget_for(exam, cell_id=None, token="t")
        parts = parts_of(box)
        for key in exam:
            if key not in parts.keys:
                parts.picker.field.value = key
        yield parts
        box.close()


def test_every_remedy_has_a_tab_and_none_changed_the_examination(shown: ExamWidget, exam: Examination) -> None:
    assert set(shown.keys) == set(exam)
    assert len(exam) >= 15
    assert shown.desk.exam is exam


def test_effect_panels_agree_with_the_table_and_with_the_sentences(shown: ExamWidget, exam: Examination) -> None:
    table = exam.table()
    told = 0
    for key in exam:
        said = words(show_panel(shown, key, EFFECT).box)
        for sentence in exam[key].sentences():
            assert re.sub(r"\s+", " ", str(sentence)) in said
        row = table.loc[key, ["difference", "difference_low", "difference_high"]]
        if np.isfinite(row.to_numpy(float)).all():
            unit = exam.problem.unit(exam.problem.response)
            name = f"difference, {unit}" if unit else "difference"
            assert printed(rf"^{name} {INTERVAL}", said) == agreeing(*row)
            told += 1
    assert told >= 15


def test_code_panels_assert_the_difference_that_the_effect_panels_show(shown: ExamWidget, exam: Examination) -> None:
    compared = 0
    for key in exam:
        said = words(show_panel(shown, key, EFFECT).box)
        shown_difference = re.search(rf"^difference[^+−\-\d]* {INTERVAL}", said, flags=re.MULTILINE)
        code = words(show_panel(shown, key, CODE).box)
        wanted = re.search(r"want = \[(.*?)\]", code, flags=re.DOTALL)
        assert wanted, key
        if shown_difference:
            numbers = [float(number) for number in wanted[1].split(",")]
            assert any(Rounded(number) == shown_difference[1] for number in numbers), key
            compared += 1
    assert compared >= 15


def test_a_typed_row_agrees_with_predict_for_every_remedy(shown: ExamWidget, exam: Examination) -> None:
    for key in exam:
        panel = show_panel(shown, key, TRY)
        said, row = words(panel.shown), panel.row()
        mean = exam[key].predict(row, interval="estimate").iloc[0][["estimate", "low", "high"]]
        new = exam[key].predict(row, interval="new row").iloc[0]
        if np.isfinite(mean.to_numpy(float)).all():
            assert printed(r"^mean (\S+) (\S+) to (\S+)$", said) == agreeing(*mean)
        assert printed(r"^one new row like this (\S+) to (\S+)$", said) == agreeing(new["low"], new["high"])


def test_the_tables_of_the_comparison_agree_with_the_table(shown: ExamWidget, exam: Examination) -> None:
    shown.tabs.selected_index = 0
    shown.compare.pages.buttons.index = 3
    html = "\n".join(all_html(shown.compare.pages.panels[3].box))
    row = r'<div class="batten-key batten-under">(.*?)</div>.*?</th><td class="batten-number">(.*?)</td>'
    cells = dict(re.findall(row, html))
    assert {key: Rounded(float(rmse)) for key, rmse in exam.table()["rmse"].items()} == cells
