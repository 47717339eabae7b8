"""Sentences follow from numbers: every number traceable, directions only where intervals allow, no forbidden words."""

from __future__ import annotations

import re

import numpy as np
import pytest
from data import A_D, A_X, A_Y, B_X, B_Y, fitted, rows_of

from batten.effects.constants import learned_constants
from batten.effects.contrast import span_effect
from batten.effects.groups import Group, group_effects
from batten.effects.numbers import show
from batten.effects.readings import hinge_readings, readings, step_of
from batten.effects.rounding import roundings
from batten.effects.sentences import sentences
from batten.effects.tell import UNSETTLED, Names
from batten.effects.turn import turning_point
from batten.engine.rows import Rows
from batten.families import parse
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate

NAMES = Names("minutes", "mass", "min", "kg", covariates=True)
KEYS = [
    "y ~ x", "y ~ log x", "y ~ sqrt x", "y ~ poly2 x", "y ~ hinge x", "y ~ hinge(8) x", "y ~ spline4 x", "y ~ bins3 x",
    "y ~ x^p", "y ~ fp1 x", "y ~ exponential x", "y ~ power x", "log y ~ x", "log y ~ log x", "log y ~ poly2 x",
    "log y ~ hinge(8) x", "log y ~ bins(5, 11) x", "sqrt y ~ x", "sqrt y ~ log x", "1/y ~ 1/x", "boxcox y ~ x",
    "yeojohnson y ~ x", "log1p y ~ x", "asinh y ~ log x", "loglink y ~ x", "loglink-gamma y ~ log x",
    "loglink y ~ poly2 x",
]  # fmt: skip
FORBIDDEN = re.compile(
    r"\b(significan\w*|caus\w*|effects?|impact\w*|leads?|increas\w*|decreas\w*|raises?|reduc\w*|due|drives?|because)\b",
    re.I,
)
A = rows_of(A_X, A_Y, A_D)
B = rows_of(B_X, B_Y)


def told(key: str, rows: Rows, span=(5.0, 10.0), of="mean", names=NAMES, **more):
    est = estimate(rows, parse(key))
    if not isinstance(est, Estimate):
        return ()
    learned = learned_constants(est, x=names.x, y=names.y)
    nice = tuple((c, next((r for r in roundings(est, c, span) if r.advised), None)) for c in learned)
    return sentences(est, names, span, of=of, learned=nice, turn=turning_point(est, unit=names.x_unit), **more)


def samples() -> list[Rows]:
    """Rows that roam: rising, falling, turning, pure noise, zeros among them, few and many."""
    rng = np.random.default_rng(8)
    x = rng.uniform(1, 20, 40)
    d = rng.integers(0, 2, 40).astype(float)
    return [
        A, B, rows_of(B_X, 14 - B_Y),
        rows_of(x, np.exp(1 + 0.1 * x + rng.normal(0, 0.3, 40)), d),
        rows_of(x, np.exp(4 - 0.15 * x + rng.normal(0, 0.3, 40)), d),
        rows_of(x, rng.gamma(3, 2, 40), d),
        rows_of(x, np.where(rng.random(40) < 0.2, 0.0, 50 * rng.gamma(3, 2, 40)), d),
        rows_of(x, 1000 + 4000 * x + rng.normal(0, 500, 40)),
    ]  # fmt: skip


@pytest.fixture(scope="module")
def everything():
    out = []
    for k, rows in enumerate(samples()):
        for key in KEYS:
            for of in ("mean", "median") if k in (0, 3) else ("mean",):
                out += [(k, key, of, sentence) for sentence in told(key, rows, of=of)]
    return out


def test_the_samples_roam_over_kinds_and_directions(everything):
    assert {s.kind for *_, s in everything} >= {"span", "coefficient", "places", "steps", "constant", "turn"}
    text = " ".join(s.text for *_, s in everything)
    for words in ("clearly higher", "clearly lower", UNSETTLED, " more ", " less ", "%", "median", "mean", "highest"):
        assert words in text, words


def test_no_sentence_claims_a_cause_or_significance(everything):
    found = [(key, s.text) for _, key, _, s in everything if FORBIDDEN.search(s.text)]
    assert found == []


def test_every_number_in_a_sentence_is_one_of_its_numbers(everything):
    for _, key, _, s in everything:
        known = list(s.numbers.values())
        for token in re.findall(r"(?<![\w.])-?\d[\d,]*(?:\.\d+)?(?:e[+-]?\d+)?", s.text):
            value = float(token.replace(",", "").rstrip("."))
            whole = token.replace(",", "").lstrip("-")
            digits = len(whole.split(".")[1]) if "." in whole and "e" not in whole else 0
            zeros = len(whole) - len(whole.rstrip("0")) if "." not in whole and value else 0
            # within half of the last place that was kept
            half = 0.5 * 10.0 ** (zeros - digits) if "e" not in whole else 0.005 * abs(value)
            assert any(abs(v - value) <= half * 1.0001 for v in known), (key, s.text, token, s.numbers)


def test_a_direction_is_told_only_where_the_interval_lies_on_one_side(everything):
    for k, key, of, s in everything:
        if s.kind != "span" or "against" not in s.text:
            continue
        found = span_effect(fitted(key, samples()[k]), (5.0, 10.0), of=of).difference
        if "clearly higher" in s.text:
            assert found.low > 0
        elif "clearly lower" in s.text:
            assert found.high < 0
        elif UNSETTLED in s.text:
            assert found.low <= 0 <= found.high


def test_percents_are_never_used_for_log1p_and_asinh(everything):
    for _, key, _, s in everything:
        if key.split(" ")[0] in ("log1p", "asinh"):
            assert "percent" not in s.text
            assert "%" not in s.text.replace("95% interval", "")


def test_every_interval_names_its_level_and_every_span_its_target(everything):
    for _, _, of, s in everything:
        if re.search(r"\d to -?\d", s.text) and s.kind not in ("turn", "steps"):
            assert "95% interval" in s.text
        if s.kind == "span" and "cannot answer" not in s.text:
            assert f"the {of} of minutes" in s.text or "nothing can be said" in s.text


def test_a_straight_line_reads_as_so_much_per_unit():
    _, per = told("y ~ x", A)
    assert per.text == (
        "Each further kg, covariates alike, goes with 2.25 min more (95% interval 1.44 to 3.05 min) "
        "in the mean of minutes."
    )


def test_a_logged_response_reads_as_an_exact_percent_with_an_asymmetric_interval():
    """15.480398% for one unit, 105.372064% for five: 100 (e^b - 1), not 100 b (Halvorsen and Palmquist 1980)."""
    est = fitted("log y ~ x", A)
    (reading,) = readings(est, (5, 10), errors="constant")
    b = float(est.coef[2])
    assert reading.effect.estimate == pytest.approx(100 * np.expm1(b), rel=1e-12)
    assert reading.effect.estimate == pytest.approx(15.480398, abs=5e-7)
    assert reading.effect.high - reading.effect.estimate > reading.effect.estimate - reading.effect.low
    sentence = told("log y ~ x", A)[1]
    assert sentence.text.startswith("Each further kg, covariates alike, goes with 15.5% more (95% interval ")
    assert (
        "in the median of minutes, and of its mean too where the spread of log minutes does not change" in sentence.text
    )


def test_log_log_reads_as_an_elasticity_and_per_doubling():
    """2^b = 2.068250 (1.868147 to 2.289786) and 100 (1.01^b - 1) = 1.048663%, computed apart without the covariate."""
    est = fitted("log y ~ log x", rows_of(A_X, A_Y))
    doubling, percent = readings(est, (5, 10), errors="constant")
    assert 1 + doubling.effect.estimate / 100 == pytest.approx(2.068250, abs=5e-7)
    np.testing.assert_allclose(
        [1 + doubling.effect.low / 100, 1 + doubling.effect.high / 100], [1.868147, 2.289786], atol=1e-6
    )
    assert percent.effect.estimate == pytest.approx(1.048663, abs=5e-7)


def test_a_logged_predictor_reads_per_doubling_and_per_percent():
    """b log 2 = 9.785949 and b log 1.01 = 0.140480, computed apart without the covariate."""
    doubling, percent = readings(fitted("y ~ log x", rows_of(A_X, A_Y)), (5, 10))
    assert doubling.effect.estimate == pytest.approx(9.785949, abs=5e-7)
    assert percent.effect.estimate == pytest.approx(0.140480, abs=5e-7)


@pytest.mark.parametrize(
    ("b", "expected"),
    # Wooldridge, Introductory Econometrics, sections 2.4 and 6.2: 100 (exp(0.306) - 1)
    [(0.306, 35.79823065478925), (-0.306, -26.36133805438999)],
)
def test_exact_percents_of_published_coefficients(b, expected):
    x = np.array([0.0, 1.0, 2.0, 3.0, 4.0, 5.0])
    noise = np.array([1.0, -2.0, 1.0, 1.0, -2.0, 1.0]) * 0.01
    # noise orthogonal to [1, x], so that the coefficient is b itself
    noise = noise - np.polyval(np.polyfit(x, noise, 1), x)
    (reading,) = readings(fitted("log y ~ x", rows_of(x, np.exp(0.2 + b * x + noise))), (1, 2))
    assert reading.effect.estimate == pytest.approx(expected, rel=1e-9)


def test_a_square_root_scale_is_translated_at_named_places():
    span, places = told("sqrt y ~ x", A)
    assert places.kind == "places"
    assert places.text.startswith("At 5 kg each further kg goes with ")
    assert ", and at 10 kg with " in places.text
    assert places.text.endswith("in the mean of minutes, covariates alike; the slope changes along the curve.")
    assert span.kind == "span"


def test_a_hinge_tells_both_slopes_and_the_breaks_interval():
    """-0.961111 below and 1.258491 above 5.895514 (Muggeo's iteration, computed apart)."""
    left, right = hinge_readings(fitted("y ~ hinge x", B), (3, 9))
    np.testing.assert_allclose([left.effect.estimate, right.effect.estimate], [-0.961111, 1.258491], atol=2e-6)
    texts = [s.text for s in told("y ~ hinge x", B, (3.0, 9.0), names=Names("minutes", "mass", "min", "kg"))]
    assert texts[1].startswith("Below 5.90 kg, each further kg goes with 0.96 min less (95% interval ")
    assert texts[2].startswith("Above 5.90 kg, each further kg goes with 1.26 min more (95% interval ")
    assert texts[3].startswith("The break in mass is 5.90 kg (95% interval 5.61 to 6.27 kg); 6 kg instead costs ")
    assert texts[4].startswith("The mean of minutes is lowest at 5.90 kg (95% interval 5.61 to 6.27 kg); there it is ")


def test_groups_are_told_step_by_step_and_a_span_within_one_group_is_refused():
    steps = told("y ~ bins(5, 11) x", A, (6.0, 10.0))
    assert steps[0].text == (
        "Rows with mass of 10 kg against rows with mass of 6 kg: "
        "this grouping cannot answer, since both lie in one group."
    )
    assert [s.kind for s in steps[1:3]] == ["steps", "steps"]
    assert steps[1].text.startswith(
        "Rows with mass from 5 kg to 11 kg against rows with mass below 5 kg, covariates alike: "
    )
    assert steps[2].text.startswith("Rows with mass of 11 kg and above against rows with mass from 5 kg to 11 kg")


def test_an_interaction_is_told_per_group_with_the_difference_and_the_ratio():
    """Elasticities 0.950347 and 1.133407: log y ~ log x * d by least squares, computed apart."""
    base = np.column_stack([np.ones(12), A_D])
    rows = Rows(y=A_Y, x=A_X, base=base, modifier=np.column_stack([np.ones(12), A_D]))
    groups = tuple(Group(f"shift {int(v)}", base[v == A_D], rows.modifier[v == A_D]) for v in (0.0, 1.0))
    est = fitted("log y ~ log x", rows)
    np.testing.assert_allclose(est.coef, [0.566864, -0.080308, 0.950347, 0.183060], atol=1e-6)
    first, second = group_effects(est, groups, (5, 10))
    assert first.span.ratio.estimate == pytest.approx(2**0.950347, rel=1e-6)
    assert second.span.ratio.estimate == pytest.approx(2**1.133407, rel=1e-6)
    assert second.ratio.estimate == pytest.approx(2**0.183060, rel=1e-6)
    assert second.difference.estimate == pytest.approx(
        second.span.difference.estimate - first.span.difference.estimate, rel=1e-12
    )
    texts = [s.text for s in told("log y ~ log x", rows, groups=groups)]
    assert texts[1].startswith("shift 0: rows with mass of 10 kg against rows with mass of 5 kg, covariates alike: ")
    assert texts[3].startswith("shift 1 against shift 0: the same step of mass goes with ")
    assert "; the ratios differ by a factor of 1.135 (95% interval " in texts[3] or "by a factor of 1.1" in texts[3]
    assert not any(s.kind == "coefficient" for s in told("log y ~ log x", rows, groups=groups))


def test_without_units_the_predictor_itself_is_the_unit():
    _, per = told("y ~ x", A, names=Names("minutes", "mass"))
    assert per.text.startswith("Each further unit of mass goes with 2.25 more (95% interval 1.44 to 3.05) in the mean")


def test_held_covariates_are_named():
    (span, _) = told("y ~ x", A, names=Names("minutes", "mass", at=(("alloy", "steel"), ("temperature", 20.0))))
    assert ", with alloy at steel, with temperature at 20.0: " in span.text
    assert span.numbers["at temperature"] == 20.0


def test_a_row_that_carries_the_mean_takes_its_interval_away():
    y = np.exp(0.1 * A_X)
    y = np.append(np.repeat(y, 4), 4000.0)
    x = np.append(np.repeat(A_X, 4), 10.5)
    rng = np.random.default_rng(0)
    rows = rows_of(x, y * np.exp(rng.normal(0, 0.1, len(y))))
    found = span_effect(fitted("log y ~ x", rows), (5, 10))
    assert np.isnan(found.difference.low)
    assert found.difference.note == (
        "no interval for a mean: one row supplies too much of the correction back from log y"
    )
    assert np.isfinite(span_effect(fitted("log y ~ x", rows), (5, 10), of="median").difference.low)
    assert "clearly" not in told("log y ~ x", rows)[0].text


@pytest.mark.parametrize(
    ("a", "b", "step"), [(10, 24, 1), (0.2, 0.9, 0.1), (1000, 9000, 1000), (0, 1, 1), (3, 103, 100)]
)
def test_the_step_of_x_is_one_unit_or_a_power_of_ten_of_the_span(a, b, step):
    assert step_of(a, b) == pytest.approx(step)


@pytest.mark.parametrize(
    ("value", "unit", "width", "text"),
    [
        (12.4321, "min", 4.6, "12.4 min"), (0.014567, "", 0.0021, "0.0146"), (123456.0, "EUR", 5200.0, "123,500 EUR"),
        (-3.14159, "kg", 0.02, "-3.142 kg"), (15.48, "%", 9.6, "15.5%"), (0.0004, "", 1.0, "0.00"),
        (10.8, "%", 115.0, "11%"), (1234.5, "", None, "1,234"), (2.5e-9, "", None, "2.5e-09"),
        (24.0, "kg", None, "24.0 kg"), (0.0, "", None, "0"), (float("nan"), "kg", None, "not defined"),
    ],
)  # fmt: skip
def test_numbers_keep_the_digits_their_interval_supports(value, unit, width, text):
    assert show(value, unit, width=width) == text


def test_one_further_day_is_told_in_the_singular() -> None:
    assert Names(x="when", x_unit="days").one == "day"
    assert Names(x="mass_kg", x_unit="kg").one == "kg"
    assert Names(x="mass_kg").one == "unit of mass_kg"
