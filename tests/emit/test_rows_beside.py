"""Scripts with weights, frequencies, clusters and an exposure: a part of the matrix, odd columns, refits."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from cases import agrees, write
from matrix import BESIDE, KEYS, Combination, combinations, gives_its_numbers, works
from runner import ENGINES, run_script

VARIANCE, FREQUENCY, EXPOSURE = (BESIDE[kind] for kind in ("variance", "frequency", "exposure"))
CLUSTERS = {"cluster": "place"}


def _sampled() -> list[Combination]:
    """Every remedy once, in turns with every kind of weights, with clusters and without, and every design."""
    found = []
    for i, key in enumerate(KEYS):
        own = [one for one in combinations() if one.key == key and (one.kind != "none" or one.clustered)]
        found.append(own[(8 * i) % len(own)])
    return found


@pytest.mark.parametrize("one", _sampled(), ids=str)
def test_a_script_of_the_matrix_gives_its_numbers(one: Combination) -> None:
    engine = ENGINES[len(str(one)) % 2]
    written = gives_its_numbers(one, engines=(engine,))
    assert max(map(len, written.lines)) <= 120


def test_the_part_of_the_matrix_meets_every_pair() -> None:
    part = _sampled()
    assert {one.key for one in part} == set(KEYS)
    assert {(one.kind, one.clustered) for one in part} == {(one.kind, one.clustered) for one in combinations()} - {
        ("none", False)
    }
    assert {(one.kind, one.design) for one in part} == {(one.kind, one.design) for one in combinations()}


@pytest.mark.parametrize("key", ["y ~ x", "boxcox y ~ x", "loglink y ~ x", "weighted y ~ x"])
@pytest.mark.parametrize(
    ("options", "column"),
    [
        ({**VARIANCE, **CLUSTERS}, "runs"),
        ({**VARIANCE, **CLUSTERS}, "place"),
        (FREQUENCY, "times"),
        (EXPOSURE, "hours"),
    ],
)
def test_a_changed_weight_count_exposure_or_cluster_trips_the_assert(
    key: str, options: dict[str, str], column: str
) -> None:
    data = works(60)
    written = write(key, "grown ~ mass + C(alloy)", data, focus="mass", beside=options)
    changed = data.copy()
    changed.loc[20, column] = "z" if column == "place" else 7
    ran = run_script(written.source, {"castings": changed}, draw=False)
    assert "`castings` differs from the rows of this script" in ran.error


def test_another_power_of_the_spread_is_noticed() -> None:
    data = works()
    written = write("weighted y ~ x", "kinked ~ mass", data, focus="mass")
    spread = written.estimate.spread
    assert spread is not None
    source = written.source.replace(repr(spread.power), repr(1.001 * spread.power))
    source = "\n".join(line for line in source.splitlines() if "assert_allclose" not in line)
    assert "another SPREAD is likelier" in run_script(source, {"castings": data}, draw=False).error


def test_deletions_of_clusters_and_weighted_rows_are_real_refits() -> None:
    """Closed forms against weighted refits by statsmodels without each row, or each cluster."""
    data = works(60)
    fit = 'smf.wls(MODEL, less.assign(log_y=np.log(less["y"])), weights=v[less.index] ** 2).fit()'
    after = f"""
v = np.ones(len(rows)) if "v" not in globals() else v
rows.index = range(len(rows))
refits, left_out = [], np.empty(len(rows))
for i in (members if "members" in globals() else range(len(rows))):
    less = rows.drop(index=i)
    again = {fit}
    refits.append(again.params.to_numpy())
    left_out[i] = (z - X @ refits[-1])[i]
refits = np.array(refits)
"""
    for options in (VARIANCE, {**VARIANCE, **CLUSTERS}):
        ran = agrees(
            write("log y ~ log x", "grown ~ mass + C(alloy)", data, focus="mass", beside=options), data, after=after
        )
        np.testing.assert_allclose(ran.names["without"], ran.names["refits"], rtol=1e-10)
        np.testing.assert_allclose(ran.names["out"], ran.names["left_out"], rtol=1e-9)


def _odd(data: pd.DataFrame, column: str, how: str) -> pd.DataFrame:
    values, some = data[column], np.arange(len(data)) % 9 != 0
    made: dict[str, Callable[[], Any]] = {
        "text": lambda: values.map(str).where(some, " "),
        "missing": lambda: values.where(some),
        "infinite": lambda: values.astype(float).where(some, np.inf),
        "nullable": lambda: values.astype("Int64" if values.dtype.kind == "i" else "Float64").where(some),
        "categories": lambda: values.astype("category"),
        "numbers": lambda: values.map(ord).astype(float).where(some),
        "blanks": lambda: values.where(some, " "),
        "dates": lambda: pd.Timestamp("2031-05-01") + pd.to_timedelta(np.arange(len(data)) % 11, "D"),
    }
    return data.assign(**{column: made[how]()})


@pytest.mark.parametrize(
    ("options", "column", "how"),
    [
        (VARIANCE, "runs", "text"), (VARIANCE, "runs", "missing"), (VARIANCE, "runs", "infinite"),
        (VARIANCE, "runs", "nullable"), (FREQUENCY, "times", "missing"), (FREQUENCY, "times", "infinite"),
        (FREQUENCY, "times", "nullable"), (EXPOSURE, "hours", "missing"), (EXPOSURE, "hours", "infinite"),
        (EXPOSURE, "hours", "nullable"), (CLUSTERS, "place", "missing"), (CLUSTERS, "place", "categories"),
        (CLUSTERS, "place", "numbers"), (CLUSTERS, "place", "blanks"), (CLUSTERS, "place", "dates"),
    ],
)  # fmt: skip
def test_columns_beside_the_formula_may_be_stored_in_any_way(options: dict[str, str], column: str, how: str) -> None:
    data = _odd(works(80), column, how)
    data.index = pd.Index(["a", "b"] * 40)
    written = write("log y ~ x", "grown ~ mass + C(alloy)", data, focus="mass", beside=options)
    agrees(written, data, engines=(ENGINES[len(column + how) % 2],))


@pytest.mark.parametrize("frame_name", ["v", "cluster", "members", "times", "exposure", "lost", "root", "AVERAGE"])
def test_names_of_weights_and_clusters_do_not_collide(frame_name: str) -> None:
    data = works(80).assign(weight=lambda d: d["runs"] % 3, cluster=lambda d: d["mass"] ** 2)
    options = {"exposure": {**EXPOSURE, **CLUSTERS}, "times": {**FREQUENCY, **CLUSTERS}}.get(
        frame_name, {**VARIANCE, **CLUSTERS}
    )
    key = "weighted y ~ x" if frame_name == "root" else "log y ~ x"
    formula = "grown ~ mass + C(weight) + cluster"
    written = write(key, formula, data, focus="mass", beside=options, frame_name=frame_name)
    agrees(written, data, engines=(ENGINES[len(frame_name) % 2],))


def test_frequencies_count_in_chosen_rows_and_the_words_count_stored_ones() -> None:
    data = works(90)
    written = write("log y ~ x", "grown ~ mass", data, focus="mass", beside=FREQUENCY, rows="alloy == 'steel'")
    agrees(written, data)
    used = data[(data["alloy"] == "steel") & (data["times"] > 0)]
    told = written.source.replace("\n#   ", " ")
    assert f"{len(used)} of 90 rows used" in told


def test_a_cluster_that_owns_a_column_is_left_out_as_far_as_it_can_be() -> None:
    data = works(90).assign(alloy=lambda d: np.where(d["place"] == "c", "zinc", d["alloy"]))
    for key in ("y ~ x", "log y ~ x", "boxcox y ~ x", "loglink y ~ x"):
        for options in (CLUSTERS, {**VARIANCE, **CLUSTERS}):
            written = write(key, "grown ~ mass + C(alloy)", data, focus="mass", beside=options)
            agrees(written, data, engines=ENGINES[:1])


@pytest.mark.parametrize("key", ["y ~ x", "log y ~ x", "boxcox y ~ x", "loglink y ~ x", "weighted y ~ x"])
def test_few_rows_many_rows_and_errors_of_one_size(key: str) -> None:
    few, many = works(26, seed=6), works(3300, seed=7)
    for options in (VARIANCE, CLUSTERS, {**FREQUENCY, **CLUSTERS}):
        agrees(write(key, "grown ~ mass", few, focus="mass", beside=options), few, engines=ENGINES[:1])
    for options in (EXPOSURE, {**VARIANCE, **CLUSTERS}):
        # gradients are central differences in the fit, exact in the script
        written = write(key, "grown ~ mass * C(alloy)", many, focus="mass", beside=options)
        agrees(written, many, rtol=1e-7, engines=ENGINES[1:])
    for data in (few, works(90)):
        written = write(key, "grown ~ mass", data, focus="mass", beside=VARIANCE, errors="constant")
        agrees(written, data, engines=ENGINES[:1])


@pytest.mark.parametrize("key", ["loglink y ~ hinge x", "loglink-gamma y ~ x^p", "loglink-gaussian y ~ hinge2 x"])
def test_links_on_searched_shapes_under_errors_of_one_size_and_in_many_rows(key: str) -> None:
    data, many = works(), works(3300, seed=7)
    agrees(write(key, "turned ~ mass + C(alloy)", data, focus="mass", errors="constant"), data, engines=ENGINES[:1])
    agrees(write(key, "turned ~ mass", many, focus="mass"), many, rtol=1e-7, engines=ENGINES[1:])


def test_a_spread_learned_from_responses_of_any_sign() -> None:
    data = works().assign(kinked=lambda d: d["kinked"] - 20)
    for options in ({}, {**VARIANCE, **CLUSTERS}):
        agrees(write("weighted y ~ poly2 x", "kinked ~ mass + C(alloy)", data, focus="mass", beside=options), data)
