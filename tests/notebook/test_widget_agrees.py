"""Every number on the widget is the table's, the sentences' and the code's, to the printed digit.

Made-up data, so the truth of the numbers is not the question here (tests of effects and of emitted code answer it):
what a reader sees in the panels is compared with what the public tables hold and what the inserted code prints when it
is run. The suite walks through some remedies of each data set; `python tests/notebook/widget_walk.py` through all.
"""

from __future__ import annotations

from collections import Counter

import pytest
from widget_walk import ASKED, compare_tables, examined, opened, walked

import batten

#: of some sixty remedies, every so many are walked through, from another one in each data set
EVERY = 16


@pytest.mark.parametrize("name", list(ASKED))
def test_panels_tables_sentences_and_the_code_that_is_inserted_say_the_same(name: str) -> None:
    exam = examined(name, repeats=1)
    keys = list(exam)[2 * list(ASKED).index(name) :: EVERY]
    assert len(exam) >= 45
    with opened(exam, keys) as shown:
        assert compare_tables(shown) == len(exam)
        assert shown.desk.exam is exam
        counted = sum((walked(shown, batten.sample(name), key) for key in keys), Counter())
    assert counted["remedies"] == len(keys) >= 3
    for kind in ("sentences", "effects", "predictions", "coefficients", "code"):
        assert counted[kind] >= len(keys), kind
