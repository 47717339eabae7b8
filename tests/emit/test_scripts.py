"""What a script promises: it checks itself, needs no batten, reads well, and its deletions are real refits."""

from __future__ import annotations

import itertools
import subprocess
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from cases import agrees, foundry, write
from matrix import combinations
from runner import ENGINES, run_script

import batten

FORMULA = "minutes ~ mass_kg + C(alloy) + depth"


@pytest.mark.parametrize("engine", ENGINES)
def test_a_changed_row_trips_the_assert(engine: str) -> None:
    data = foundry(60)
    for key in ("log y ~ spline4 x", "y ~ x", "loglink y ~ x"):
        written = write(key, FORMULA, data)
        changed = data.copy()
        changed.loc[20, "minutes"] *= 1.001
        ran = run_script(written.source, {"castings": changed}, engine)
        assert "`castings` differs from the rows of this script" in ran.error
        fewer = run_script(written.source, {"castings": data.drop(index=11)}, engine)
        assert "differs from the rows" in fewer.error


def test_a_value_the_scale_cannot_take_is_named() -> None:
    data = foundry(60)
    written = write("log y ~ x", FORMULA, data)
    ran = run_script(written.source, {"castings": data.assign(minutes=data["minutes"] - 10)})
    assert "AssertionError: the log needs minutes above zero" in ran.error


def test_deletions_are_real_refits() -> None:
    """Closed forms against refits without each row (Allen 1974); for a log link one Newton step, so only near."""
    data = foundry(40)
    after = """
refits = []
for i in range(len(rows)):
    less = rows.drop(index=rows.index[i])
    refits.append(FIT.params.to_numpy())
refits = np.array(refits)
"""
    ols = after.replace("FIT", 'smf.ols(MODEL, less.assign(log_y=np.log(less["y"]))).fit()')
    ran = agrees(write("log y ~ spline4 x", FORMULA, data), data, after=ols)
    np.testing.assert_allclose(ran.names["without"], ran.names["refits"], rtol=1e-10)
    glm = after.replace("FIT", "smf.glm(MODEL, less, family=families.Poisson()).fit()")
    ran = agrees(write("loglink y ~ x", FORMULA, data), data, after=glm)
    moved = ran.names["refits"] - ran.names["b"]
    step = ran.names["without"] - ran.names["b"]
    assert np.abs(step - moved).max() < 0.1 * np.abs(moved).max()  # second-order terms of a single row in forty


def test_the_jackknife_of_the_span_is_the_textbook_one() -> None:
    """sqrt((n - 1)/n sum (T_i - mean T)^2) over complete refits (Efron and Tibshirani 1993, ch. 11)."""
    data = foundry(35)
    after = """
def whole(rows):
    model = smf.ols(MODEL, rows.assign(log_y=np.log(rows["y"]))).fit()
    ends = [np.exp(model.predict(rows.assign(x=at, log_x=np.log(at)))).mean() for at in SPAN]
    return np.exp(model.resid).mean() * (ends[1] - ends[0])
left = np.array([whole(rows.drop(index=i)) for i in rows.index])
error = np.sqrt((len(left) - 1) / len(left) * ((left - left.mean()) ** 2).sum())
"""
    ran = agrees(write("log y ~ log x", "minutes ~ mass_kg + C(alloy)", data), data, after=after)
    assert ran.names["half"] == pytest.approx(ran.names["T95"] * ran.names["error"], rel=1e-10)


@pytest.mark.parametrize("errors", ["robust", "constant"])
def test_many_rows_use_influence_and_few_rows_the_t_interval(errors: str) -> None:
    many, few = foundry(3200), foundry(20)
    for key in ("y ~ x", "log y ~ log x", "sqrt y ~ x", "boxcox(0.3) y ~ x", "loglink y ~ x", "y ~ hinge x"):
        formula = FORMULA.replace("minutes", "kinked" if "hinge" in key else "minutes")
        written = write(key, formula, many, errors=errors)
        assert "leaving out each row" not in written.source
        # gradients are central differences in the fit, exact in the script
        agrees(written, many, rtol=1e-7, engines=ENGINES[:1])
        agrees(write(key, formula, few, errors=errors), few, engines=ENGINES[1:])


def test_other_levels() -> None:
    data = foundry(60)
    for level in (0.8, 0.9, 0.99, 0.999):
        for key in ("log y ~ x", "loglink y ~ x"):
            agrees(write(key, FORMULA, data, level=level), data, engines=ENGINES[:1])


def test_a_row_alone_in_its_group_cannot_be_left_out() -> None:
    data = foundry(60)
    data.loc[7, "alloy"] = "zinc"
    for key in ("y ~ x", "log y ~ x", "loglink y ~ x"):
        # the residual of such a row is rounding error, magnified: seven digits are left
        agrees(write(key, "minutes ~ mass_kg + C(alloy)", data), data, rtol=1e-7)


def test_a_row_that_carries_the_correction_leaves_no_interval() -> None:
    data = foundry(60)
    data["minutes"] = data["minutes"] ** 3
    data.loc[7, "minutes"] *= 40
    written = write("log y ~ x", FORMULA, data)
    assert "half" not in written.source
    agrees(written, data)


def test_a_question_without_an_answer_is_said_in_words() -> None:
    data = foundry(60)
    written = write("y ~ bins(40) x", FORMULA, data, span=(10.0, 20.0))
    assert "# No effect over the span: this grouping cannot answer" in written.source
    agrees(written, data)


def test_a_perfect_fit_passes_its_own_asserts() -> None:
    data = foundry(40).assign(line=lambda d: 3 + 2 * d["mass_kg"], growth=lambda d: np.exp(0.02 * d["mass_kg"]))
    for key, response in (("y ~ x", "line"), ("log y ~ x", "growth"), ("y ~ poly2 x", "line")):
        written = write(key, f"{response} ~ mass_kg + depth", data)
        for engine in ENGINES:
            ran = run_script(written.source, {"castings": data}, engine)
            assert not ran.error, ran.error


def test_squares_below_zero_count_as_zero() -> None:
    noise = np.random.default_rng(2).normal(size=70)
    data = foundry(70).assign(counts=lambda d: np.maximum(0.08 * d["mass_kg"] + noise, 0) ** 2)
    written = write("sqrt y ~ x", "counts ~ mass_kg + depth", data)
    assert written.estimate.eta.min() + written.estimate.residual.min() < 0
    agrees(written, data)


def test_many_covariate_patterns_under_a_scale_without_closed_mean() -> None:
    data = foundry(260)
    for key in ("boxcox(0.3) y ~ x", "1/y ~ x"):
        response = "rate" if key.startswith("1/y") else "minutes"
        # beyond 60,000 pairs both sides average through polynomials, checked to ten digits in the fit
        agrees(write(key, f"{response} ~ mass_kg + depth", data), data, rtol=1e-8)


def test_the_same_fit_gives_the_same_text() -> None:
    data = foundry(60)
    one, two = (write("log y ~ x^p", FORMULA, data.copy()) for _ in range(2))
    assert one.source == two.source


#: the commonest remedies
COMMON = ["y ~ x", "log y ~ x", "log y ~ log x", "y ~ poly2 x", "log y ~ spline4 x", "y ~ bins5 x", "loglink y ~ log x",
          "y ~ hinge x", "log y ~ fp1 x", "1/y ~ x", "sqrt y ~ x", "share y ~ x"]  # fmt: skip
RESPONSES = {"y ~ hinge x": "kinked", "1/y ~ x": "rate", "share y ~ x": "scrap"}


def test_scripts_pass_a_linter(tmp_path: Path) -> None:
    """Lines, unused and undefined names; the frame is the one name a script takes as given."""
    data = foundry(90).rename(columns={"depth": "depth in mm"})
    keys = [*COMMON, "boxcox y ~ x", "yeojohnson y ~ hinge x", "y ~ s-curve x", "invlink-gamma y ~ spline3 x"]
    for i, key in enumerate(keys):
        response = RESPONSES.get(key, "kinked" if "hinge" in key else "grown" if "s-curve" in key else "minutes")
        formula = f"{response} ~ mass_kg + C(alloy) + bs(Q('depth in mm'), df=4)"
        source = write(key, formula, data, errors="constant" if i % 3 == 0 else "robust").source
        (tmp_path / f"script_{i}.py").write_text("castings = object()\n" + source)
    for i, one in enumerate(list(combinations())[::16]):
        (tmp_path / f"beside_{i}.py").write_text("works = object()\n" + one.write().source)
    select = "E,F,W,I,UP,B,SIM,C4,PIE,NPY"
    # E402: the frame stands before the imports here
    ruff = [
        sys.executable,
        "-m",
        "ruff",
        "check",
        "--isolated",
        "--line-length=120",
        f"--select={select}",
        "--ignore=E402",
    ]
    done = subprocess.run([*ruff, str(tmp_path)], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout


def test_comments_say_which_rows_and_errors() -> None:
    data = foundry(60)
    data.loc[3, "mass_kg"], data.loc[[4, 5], "depth"] = np.nan, np.inf
    told = _introduced(write("log y ~ x", FORMULA, data).lines)
    assert told == (
        'minutes ~ mass_kg + C(alloy) + depth, remedy "log y ~ x": log of minutes on mass_kg. '
        "`castings` (pandas): 57 of 60 rows used; left out: 2 infinite depth, 1 missing mass_kg. Errors: robust (HC3)."
    )
    fixed = "degrees of freedom, as if this remedy had been fixed in advance\n"
    assert fixed in write("log y ~ x", FORMULA, data).source
    assert fixed not in write("log y ~ x", FORMULA, data, planned="log y ~ x").source


def _introduced(lines: list[str]) -> str:
    """The comment a script opens with, on one line."""
    opening = itertools.takewhile(lambda line: line.startswith("#"), lines)
    return " ".join(line.removeprefix("#").strip() for line in opening)


def test_predictions_keep_the_index_of_what_is_asked() -> None:
    data = foundry(60)
    after = (
        'new = pd.DataFrame({"mass_kg": [10, 20], "alloy": "steel", "depth": 10.0}, index=["p", "p"])\nq = predict(new)'
    )
    ran = agrees(write("log y ~ x", FORMULA, data), data, after=after)
    assert list(ran.names["q"].index) == ["p", "p"]
    assert list(ran.names["q"].columns) == ["median", "mean", "low", "high"]
    table: pd.DataFrame = ran.names["q"]
    assert (table["low"] < table["median"]).all()
    assert (table["median"] < table["high"]).all()


def test_an_examination_writes_the_script_of_any_of_its_fits() -> None:
    data = batten.sample("castings")
    exam = batten.examine("minutes ~ mass_kg + C(alloy)", data, frame_name="castings", only=["ladder", "y ~ spline4 x"])
    for key in ("y ~ x", "log y ~ log x", "y ~ spline4 x"):
        for engine in ENGINES:
            ran = run_script(exam.code(key), {"castings": data}, engine)
            assert not ran.error, ran.error
        assert ran.names["effect"] == pytest.approx(exam[key].contrast().loc["difference", "estimate"], rel=1e-12)
    assert exam.code() == exam[exam.choice.key].code()
