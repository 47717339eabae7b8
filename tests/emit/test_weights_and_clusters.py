"""Scripts with weights, frequencies, exposure and clusters give the numbers of the fit, from the user's own columns.

What those numbers should be is tested against refits and general libraries where they are computed (tests/fit).
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf
from cases import agrees, foundry, write
from runner import ENGINES

WEIGHTS = {"weights": "certainty", "weights_kind": "variance"}
TIMES = {"weights": "times", "weights_kind": "frequency"}
EXPOSURE, CLUSTER = {"exposure": "hours"}, {"cluster": "heat"}
KEYS = [
    "y ~ x",
    "log y ~ log x",
    "sqrt y ~ x",
    "boxcox y ~ x",
    "loglink y ~ x",
    "y ~ x^p",
    "weighted y ~ x",
    "y ~ smooth x",
]


def heats() -> pd.DataFrame:
    """The castings of 18 heats, with gaps in every column beside the formula."""
    rng = np.random.default_rng(0)
    data = foundry(90).assign(
        certainty=rng.uniform(0.5, 2, 90), times=rng.integers(0, 4, 90).astype(float), hours=rng.uniform(1, 5, 90),
        heat=np.repeat([f"heat {k}" for k in range(18)], 5),
    )  # fmt: skip
    data.loc[3, "certainty"], data.loc[5, "hours"], data.loc[8, "heat"], data.loc[11, "times"] = (
        np.nan,
        np.nan,
        None,
        np.nan,
    )
    return data


@pytest.mark.parametrize("beside", [WEIGHTS, TIMES, EXPOSURE, CLUSTER, EXPOSURE | CLUSTER, TIMES | CLUSTER], ids=str)
@pytest.mark.parametrize("key", KEYS)
def test_script_gives_the_numbers_of_the_fit(key: str, beside: dict[str, Any]) -> None:
    data, turn = heats(), KEYS.index(key) + len(str(beside))
    for i, errors in enumerate(("robust", "constant") if turn % 3 == 0 else ("robust",)):
        written = write(key, "minutes ~ mass_kg + C(alloy)", data, beside=beside, errors=errors)
        assert max(map(len, written.lines)) <= 120
        # under constant errors the fit's gradients are central differences
        rtol = 1e-7 if "boxcox" in key else 1e-8
        agrees(written, data, rtol=rtol, engines=(ENGINES[(i + turn) % 2],), draw=False)


@pytest.mark.parametrize(("key", "response"), [("share y ~ x", "scrap"), ("loglink-gamma y ~ hinge x", "minutes")])
def test_links_with_clusters_and_weights(key: str, response: str) -> None:
    data = heats()
    for beside in (WEIGHTS | CLUSTER, TIMES):
        written = write(key, f"{response} ~ mass_kg * C(alloy)", data, beside=beside)
        agrees(written, data, rtol=1e-7, draw=False)  # a break under a link is searched to that many digits


def test_many_rows_with_clusters_use_the_influence_of_clusters() -> None:
    data = foundry(3200).assign(heat=lambda d: np.arange(len(d)) // 8)
    for key in ("log y ~ x", "sqrt y ~ x", "loglink y ~ x"):
        written = write(key, "minutes ~ mass_kg + C(alloy)", data, beside=CLUSTER)
        assert "by each cluster's influence" in written.source
        agrees(written, data, rtol=1e-7, engines=ENGINES[:1], draw=False)  # the fit's gradients are central differences


def test_a_weighted_line_is_that_of_statsmodels() -> None:
    data = heats()
    written = write("y ~ x", "minutes ~ mass_kg + C(alloy)", data, beside=WEIGHTS, errors="constant")
    used = data.dropna(subset=["certainty"])
    direct = smf.wls("minutes ~ mass_kg + C(alloy)", used, weights=used["certainty"]).fit()
    np.testing.assert_allclose(written.want[1:3], [direct.params["mass_kg"], direct.bse["mass_kg"]], rtol=1e-10)


def test_what_stands_beside_the_formula_is_said() -> None:
    data = heats()
    told = {str(beside): write("y ~ x", "minutes ~ mass_kg", data, beside=beside).source.replace("\n#   ", " ")
            for beside in (WEIGHTS, TIMES, EXPOSURE, CLUSTER)}  # fmt: skip
    assert "Errors: robust (HC3), rows weighted by certainty." in told[str(WEIGHTS)]
    assert "each as often as times says" in told[str(TIMES)]
    assert 'castings["minutes"]' not in told[str(EXPOSURE)]
    assert "minutes per hours of one further row of average weight" in told[str(EXPOSURE)]
    assert "Errors: by clusters of heat (CR3)." in told[str(CLUSTER)]
    assert "minutes of one further row from a new cluster" in told[str(CLUSTER)]
