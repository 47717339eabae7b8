"""Scripts stay short enough to be read aloud: at most 60 lines of 120 letters, for every remedy of the default grid."""

from __future__ import annotations

import pytest
from agreement import CASES, examined

LINES, WIDTH = 60, 120

#: remedies whose scripts are longer, and how long they may be. A searched power of y counts in every interval, so the
#: script holds its likelihood, the scale by any power and back, and a step of all that was estimated for each row
LONGER = {"boxcox": 75, "yeojohnson": 82}
#: a penalised curve is no model of statsmodels, so its script holds the columns, the penalty and the fit of its own
SMOOTH = 78


@pytest.mark.parametrize("case", CASES[:3], ids=lambda case: case.name)
def test_every_script_of_the_default_grid_is_short(case: object) -> None:
    exam = examined(case)  # type: ignore[arg-type]
    lengths = {}
    for key in exam:
        lines = exam.code(key).splitlines()
        assert max(map(len, lines)) <= WIDTH, key
        lengths[key] = len(lines)
    allowed = {key: SMOOTH if "smooth" in key else LONGER.get(key.split()[0], LINES) for key in exam}
    assert {key: n for key, n in lengths.items() if n > allowed[key]} == {}
    assert len(lengths) > 50


def test_a_searched_power_of_a_response_with_negative_values() -> None:
    """Yeo-Johnson stands in the grid only where the response is not positive."""
    case = CASES[0]
    moved = case.frame().assign(minutes=lambda d: d["minutes"] - 12)
    exam = examined(case, ["yeojohnson y ~ x", "yeojohnson y ~ log x"], frame=moved)
    for key in exam:
        lines = exam.code(key).splitlines()
        assert max(map(len, lines)) <= WIDTH, key
        assert len(lines) <= LONGER["yeojohnson"], (key, len(lines))
