"""Scripts read the user's columns as the analysis did: any name, any storage, any formula, any choice of rows."""

from __future__ import annotations

from decimal import Decimal
from typing import Any

import numpy as np
import pandas as pd
import pytest
from cases import agrees, foundry, write
from runner import ENGINES, run_script

HOSTILE = ["melt temperature", "<b>bold</b>", 'say "hi"', "it's", "C", "Q", "I", "np", "x", "y", "class", "μ", "a\nb",
           "\\path", "$cost$", "lambda", "rows", "{brace}", "1st", "  ", "T95", "größe", "log", "e"]  # fmt: skip


@pytest.mark.parametrize(
    "name", ["melt temperature", 'say "hi"', "C", "np", "μ", "a\nb", "\\path", "$cost$", "{brace}"]
)
def test_the_focal_predictor_may_have_any_name(name: str) -> None:
    data = foundry(50).rename(columns={"mass_kg": name})
    written = write("log y ~ log x", f"minutes ~ Q({name!r}) + alloy", data, focus=name)
    agrees(written, data, engines=_one(name))


def test_covariates_may_have_any_name() -> None:
    data, rng = foundry(60), np.random.default_rng(5)
    for name in HOSTILE:
        data[name] = rng.normal(size=60)
    data["group"] = data["alloy"]
    formula = "minutes ~ mass_kg + group + " + " + ".join(f"Q({name!r})" for name in HOSTILE)
    agrees(write("log y ~ poly2 x", formula, data), data)


@pytest.mark.parametrize("name", ["C", "np", "two words", "columns", "μ", "a\nb"])
def test_response_and_group_may_have_any_name(name: str) -> None:
    data = foundry(50).rename(columns={"minutes": name, "alloy": f"{name} group"})
    written = write("sqrt y ~ x", f"Q({name!r}) ~ mass_kg * Q({f'{name} group'!r})", data, units={name: "$/h"})
    agrees(written, data)


def _one(what: object) -> tuple[str, ...]:
    """One of the engines, by turns, where the engine is not the point."""
    return (ENGINES[len(str(what)) % 2],)


def test_the_frame_may_be_called_like_anything_in_the_script() -> None:
    data = foundry(50)
    for name in ["rows", "fit", "np", "pd", "X", "e", "columns", "x", "SPAN", "effect", "T95", "frame", "K", "at"]:
        written = write("y ~ x^p" if name == "K" else "log y ~ spline4 x", "minutes ~ mass_kg + depth", data,
                        frame_name=name)  # fmt: skip
        agrees(written, data, engines=_one(name))


def test_plain_identifiers_stay_readable() -> None:
    written = write("log y ~ x", "minutes ~ mass_kg + C(alloy) + depth", foundry())
    assert 'MODEL = "log_y ~ x + C(alloy) + depth"' in written.source
    assert "used.assign(mass_kg=at)" in written.source


def _stored(kind: str, values: pd.Series[Any]) -> pd.Series[Any]:
    rounded = values.round(2)
    made = {
        "text": rounded.map(lambda v: f" {v}"),
        "Decimal": rounded.map(lambda v: Decimal(str(v))),
        "Float64": rounded.astype("Float64"),
        "integers": (10 * values).round().astype(int),
        "Int64": (10 * values).round().astype("Int64"),
        "float32": rounded.astype("float32"),
    }
    return made[kind]


@pytest.mark.parametrize("kind", ["text", "Decimal", "Float64", "integers", "Int64", "float32"])
def test_numbers_may_be_stored_in_any_way(kind: str) -> None:
    data = foundry(60)
    data = data.assign(mass_kg=_stored(kind, data["mass_kg"]), depth=_stored(kind, data["depth"]))
    data = data.assign(minutes=_stored(kind, 10 * data["minutes"]))
    if kind in ("Int64", "Float64"):
        data.loc[[3, 9], "mass_kg"] = pd.NA
    if kind == "text":
        data.loc[[3, 9], "mass_kg"] = [" ", None]
        data.loc[4, "minutes"] = ""
    written = write("log y ~ poly2 x", "minutes ~ mass_kg + depth", data)
    agrees(written, data, engines=_one(kind))


@pytest.mark.parametrize("kind", ["text", "categories", "numbers", "halves", "yes/no", "yes/no and missing", "dates"])
def test_groups_may_be_stored_in_any_way(kind: str) -> None:
    data, codes = foundry(60), np.arange(60) % 3
    groups: dict[str, Any] = {
        "text": np.array(["b 10", "b 2", 'x"y'])[codes],
        "categories": pd.Categorical(np.array(["low", "mid", "high"])[codes], categories=["low", "mid", "high", "no"]),
        "numbers": np.where(codes == 0, np.nan, codes.astype(float)),
        "halves": codes / 2,
        "yes/no": codes == 1,
        "yes/no and missing": pd.array([None, True, False] * 20, dtype="boolean"),
        "dates": pd.Timestamp("2031-05-01") + pd.to_timedelta(codes, "D"),
    }
    data["group"] = groups[kind]
    written = write("log y ~ x", "minutes ~ mass_kg + C(group) + alloy", data)
    agrees(written, data)


def test_dates_count_in_days_from_the_first() -> None:
    data = foundry(60).assign(day=pd.Timestamp("2031-05-01 06:00") + pd.to_timedelta(np.arange(60), "D"))
    for stored in (
        data["day"],
        data["day"].dt.tz_localize("Europe/Oslo"),
        data["day"].dt.date,
        data["day"].astype("datetime64[s]"),
    ):
        frame = data.assign(day=stored)
        agrees(write("log y ~ poly2 x", "minutes ~ day + alloy", frame, focus="day"), frame, engines=ENGINES[:1])
        agrees(write("log y ~ x", "minutes ~ mass_kg + day", frame), frame, engines=ENGINES[1:])


def test_a_repeated_index_does_not_mix_rows() -> None:
    data = foundry(60)
    data.loc[5, "mass_kg"], data.loc[7, "minutes"], data.loc[9, "alloy"] = np.nan, np.inf, None
    data.index = pd.Index(["a", "b"] * 30)
    written = write("log y ~ spline3 x", "minutes ~ mass_kg * C(alloy) + np.log(depth)", data)
    ran = agrees(written, data, after="again = predict(castings.iloc[::-1])")
    agrees(write("y ~ exponential x", "minutes ~ mass_kg + C(alloy) + C(alloy):depth", data), data)
    assert list(ran.names["again"].index) == ["b", "a"] * 30
    assert ran.names["again"]["mean"].isna().sum() == 2


def test_rows_left_out_are_named_and_rows_can_be_chosen() -> None:
    data = foundry(90)
    data.loc[[3, 4], "mass_kg"] = np.nan
    data["batch no"] = np.arange(90)
    written = write("log y ~ x", "minutes ~ mass_kg + alloy", data, rows="`batch no` > 10 and alloy != 'bronze'")
    assert "data = castings.query(" in written.source
    agrees(written, data)
    assert "2 missing mass_kg" in write("log y ~ x", "minutes ~ mass_kg", data).source.replace("\n#   ", " ")


EXPRESSIONS = {
    "a function": "np.log(depth)",
    "a power": "I(depth ** 2)",
    "a centred column": "center(depth)",
    "a standardised column": "standardize(depth)",
    "a function of two": "np.sqrt(depth * share)",
    "a comparison": "(depth > 10)",
    "groups made from a number": "C(np.where(depth > 10, 'deep', 'flat'))",
    "b-splines": "bs(depth, df=4)",
    "b-splines with all columns": "bs(depth, df=5, include_intercept=True)",
    "natural splines": "cr(depth, df=3)",
    "centred natural splines": "cr(depth, df=4, constraints='center')",
    "cyclic splines": "cc(depth, df=4)",
    "a crossed expression": "np.log(depth) * alloy",
    "a reference level": "C(alloy, Treatment('steel'))",
    "levels in an order": "C(alloy, levels=['steel', 'bronze', 'grey iron'])",
    "sum contrasts": "C(alloy, Sum)",
    "polynomial contrasts crossed": "C(alloy, Poly) * depth",
}


@pytest.mark.parametrize("what", list(EXPRESSIONS))
def test_covariates_may_be_expressions(what: str) -> None:
    data = foundry(80).rename(columns={"scrap": "share"})
    written = write("log y ~ spline3 x", f"minutes ~ mass_kg + {EXPRESSIONS[what]}", data)
    beyond = data.head(3).assign(depth=[8.0, 30.0, np.nan])
    ran = agrees(
        written,
        data,
        after="import pickle, io\nbeyond = predict(beyond_)".replace(
            "beyond_", "castings.head(3).assign(depth=[8.0, 30.0, float('nan')])"
        ),
    )
    new = written.problem.new_rows(beyond)
    known = np.isfinite(new.base).all(axis=1)
    assert (ran.names["beyond"]["mean"].notna() == known).all()


def test_an_expression_without_a_literal_form_is_said() -> None:
    data = foundry(80)
    surface = "te(cr(depth, df=3), cr(scrap, df=3), constraints='center')"
    written = write("log y ~ x", f"minutes ~ mass_kg + {surface}", data)
    told = written.source.replace("\n#   ", " ")
    assert "learns from the rows it is given, so this script predicts no further rows" in told
    ran = run_script(written.source, {"castings": data})  # formulaic has no te()
    assert not ran.error, ran.error
    np.testing.assert_allclose(ran.names["got"], written.want[: len(ran.names["got"])], rtol=1e-9)


def test_the_focal_predictor_may_be_crossed_with_expressions() -> None:
    data = foundry(80)
    for formula in (
        "minutes ~ mass_kg * np.log(depth)",
        "minutes ~ mass_kg * C(alloy, Sum)",
        "minutes ~ mass_kg * alloy * depth",
    ):
        agrees(write("log y ~ poly2 x", formula, data), data)


def test_what_the_notebook_defines_is_asked_for() -> None:
    def halved(values: Any) -> Any:
        return values / 2

    data = foundry(60)
    written = write("log y ~ x", "minutes ~ mass_kg + halved(depth) + np.maximum(depth, limit)", data,
                    env={"halved": halved, "limit": 9.5})  # fmt: skip
    assert "Needs halved as defined where the formula was written." in written.source.replace("\n#   ", " ")
    assert "np.maximum(depth, 9.5)" in written.source
    source = written.source.replace("\nimport numpy", "\ndef halved(values):\n    return values / 2\nimport numpy", 1)
    agrees(type(written)(source, written.problem, written.question, written.estimate, written.want), data)


def test_names_that_the_script_uses_do_not_collide() -> None:
    data = foundry(60).assign(
        Alloy=lambda d: d["alloy"].str.upper(), bend=lambda d: d["depth"], log_y=1.0 * np.arange(60)
    )
    data["X"], data["mean"] = data["depth"] ** 2, np.arange(60) % 7
    formula = "minutes ~ mass_kg + C(alloy) + C(Alloy):X + np.log(bend) + log_y + Q('mean')"
    agrees(write("log y ~ spline3 x", formula, data), data)
    written = write("sqrt y ~ spline3 x", "minutes ~ mass_kg + bend(depth) + rows(depth)", data,
                    env={"bend": np.log, "rows": np.sqrt})  # fmt: skip
    defined = "bend, rows = np.log, np.sqrt\n"
    at = written.source.index("import statsmodels")
    source = written.source[:at] + defined + written.source[at:]
    agrees(type(written)(source, written.problem, written.question, written.estimate, written.want), data)


def test_columns_that_repeat_others_are_left_out_as_in_the_analysis() -> None:
    data = foundry(60).assign(grams=lambda d: 1000 * d["depth"])
    data["cell"] = np.where(data["alloy"] == "steel", "s", "other")
    agrees(write("log y ~ x", "minutes ~ mass_kg + depth + grams", data), data)
    agrees(write("log y ~ poly2 x", "minutes ~ mass_kg + C(alloy) + C(cell)", data), data)


def test_covariates_can_be_held_at_values() -> None:
    data = foundry(80).assign(hot=lambda d: d["depth"] > 10)
    for at in ({"alloy": "steel"}, {"alloy": "bronze", "depth": "9.5"}, {"hot": "yes"}):
        formula = "minutes ~ mass_kg * alloy + depth + hot"
        agrees(write("log y ~ spline3 x", formula, data, at=at), data, engines=ENGINES[:1])
        agrees(write("sqrt y ~ x", formula, data, at=at, errors="constant"), data, engines=ENGINES[1:])


def test_unseen_levels_and_missing_values_are_predicted_as_missing() -> None:
    data = foundry(60)
    after = """
mass = [10, 10, 10, None, float("inf")]
new = castings.head(5).assign(alloy=["bronze", "zinc", None, "steel", "steel"], mass_kg=mass)
answer = predict(new)
nothing = predict(new.iloc[[1, 2]])
"""
    for key in ("log y ~ log x", "y ~ spline4 x", "sqrt y ~ x", "loglink y ~ x", "boxcox(0.3) y ~ x"):
        ran = agrees(write(key, "minutes ~ mass_kg + C(alloy)", data), data, after=after)
        assert list(ran.names["answer"].notna().all(axis=1)) == [True, False, False, False, False]
        assert ran.names["nothing"].isna().all().all()
