"""The walk over a folder of check cases, where one lies beside the checkout; and that the walk can fail."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
import walk

CASES = sorted(walk.FOLDER.glob("*.json"))

#: numbers of other definitions
OTHERWISE = {
    # a root of y below zero stands for y = 0 in batten's averages, for its square in the case
    ("stat2-countyhealth-sqrty", "smearing_pred_at_3"),
}


@pytest.mark.skipif(not CASES, reason="no folder of check cases beside this checkout")
@pytest.mark.parametrize("path", CASES, ids=lambda path: path.stem)
def test_a_case_is_met(path: Path) -> None:
    ((name, judged),) = walk.walk([path])
    wrong = [j for j in judged if j.got is not None and not j.met]
    assert [j for j in wrong if (name, j.key) not in OTHERWISE] == []
    assert [j for j in judged if j.group == "published" and j.got is None] == []


def _case(**changes: Any) -> dict[str, Any]:
    """A case of its own: y = 2 + 3 x and a little more."""
    case: dict[str, Any] = {
        "id": "own", "kind": "baseline", "formula": "y ~ x", "response": "y", "focus": "x", "remedy": "", "note": "",
        "data_from": {"kind": "inline", "columns": ["x", "y"]},
        "data": {"x": [1, 2, 3, 4, 5, 6], "y": [5.1, 7.9, 11.1, 13.9, 17.1, 19.9]},
        "expect": {"n": 6, "coef:x": 3.0}, "tol": {"n": 0, "coef:x": 0.05}, "exact": {}, "exact_rel_tol": 1e-8,
    }  # fmt: skip
    return {**case, **changes}


def test_the_walk_succeeds_where_all_published_numbers_are_met(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "own.json").write_text(json.dumps(_case()))
    assert walk.main([str(tmp_path)]) == 0
    assert "0 published numbers missed." in capsys.readouterr().out


@pytest.mark.parametrize("key", ["coef:x", "coef:z", "unheard_of"])
def test_a_wrong_or_unknown_published_number_fails_the_walk(key: str, tmp_path: Path) -> None:
    (tmp_path / "own.json").write_text(json.dumps(_case(expect={key: 3.2}, tol={key: 0.05})))
    assert walk.main([str(tmp_path)]) == 1


def test_a_wrong_full_precision_number_is_told_but_does_not_fail_the_walk(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "own.json").write_text(json.dumps(_case(exact={"coef:x": 3.0})))
    assert walk.main([str(tmp_path)]) == 0
    assert "not 3 (exact)" in capsys.readouterr().out


def test_a_case_that_cannot_be_read_is_told_and_fails_the_walk(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "own.json").write_text(json.dumps(_case(formula="y ~ sin(x) + x")))
    assert walk.main([str(tmp_path)]) == 1
    assert "none of batten's shapes" in capsys.readouterr().out


def test_a_case_that_breaks_the_computation_fails_alone(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "a.json").write_text(json.dumps(_case(id="broken", focus="no such column")))
    (tmp_path / "b.json").write_text(json.dumps(_case()))
    assert walk.main([str(tmp_path)]) == 1
    told = capsys.readouterr().out
    assert "failed: KeyError" in told
    assert "2 published numbers missed." in told


def test_a_missing_folder_is_told(tmp_path: Path) -> None:
    assert walk.main([str(tmp_path / "none")]) == 2
