"""Every member of the families, in every kind of design: its script runs under both engines and gives its numbers."""

from __future__ import annotations

import pytest
from cases import agrees, foundry, write

from batten.families import curves, links, scales, shapes

DESIGNS = {
    "alone": "{y} ~ mass_kg",
    "beside a factor": "{y} ~ mass_kg + C(alloy) + depth",
    "crossed with a factor": "{y} ~ mass_kg * C(alloy)",
    "within a factor": "{y} ~ C(alloy) + mass_kg:C(alloy) - 1",
    "crossed with a number": "{y} ~ mass_kg * depth",
    "through zero": "{y} ~ mass_kg + depth - 1",
}

#: the response that suits a member
RESPONSES = {
    "share y": "scrap", "logit(0, 1) y": "scrap", "1/y": "rate", "y^2": "rooted", "level-exp x": "levelled",
    "level-hyp x": "levelled", "s-curve x": "grown", "gompertz x": "grown", "hinge x": "kinked", "hinge2 x": "kinked",
}  # fmt: skip

LEFTS = [m.key for m in (*scales(), *links())] + ["boxcox(0.3) y", "yeojohnson(0.5) y"]
RIGHTS = [m.key for m in shapes()] + ["poly3 x", "bins(20, 40) x", "spline(10, 30, 50) x", "hinge(25) x", "x^0.3"]


def _pairs() -> list[tuple[str, str]]:
    """Every left side with x, every right side with y, every curve, each in turn through the designs."""
    names = list(DESIGNS)
    keys = [f"{left} ~ x" for left in LEFTS]
    keys += [f"y ~ {right}" for right in RIGHTS]
    keys += [f"log y ~ {right}" for right in ("log x", "hinge x", "spline4 x", "bins5 x", "x^p", "fp2 x")]
    one = [(key, names[i % len(names)]) for i, key in enumerate(keys)]
    # curves bring their own level, which only means something beside covariates or alone
    return one + [(f"y ~ {c.key}", name) for c in curves() for name in ("alone", "beside a factor")]


@pytest.mark.parametrize(("key", "design"), _pairs())
def test_script_gives_the_numbers_of_the_fit(key: str, design: str) -> None:
    left, right = key.split(" ~ ")
    response = RESPONSES.get(left) or (RESPONSES.get(right) if left == "y" else None) or "minutes"
    data = foundry()
    written = write(key, DESIGNS[design].format(y=response), data)
    assert max(map(len, written.lines)) <= 120
    agrees(written, data, draw=False)  # the picture does not depend on the member


@pytest.mark.parametrize("errors", ["robust", "constant"])
@pytest.mark.parametrize(
    ("key", "design"),
    [
        ("loglink y ~ hinge x", "beside a factor"), ("loglink y ~ x^p", "alone"), ("loglink y ~ fp2 x", "alone"),
        ("loglink-gamma y ~ hinge x", "crossed with a factor"), ("share y ~ hinge x", "beside a factor"),
        ("loglink-gaussian y ~ cut x", "alone"), ("invlink-gamma y ~ x^p", "beside a factor"),
    ],
)  # fmt: skip
def test_links_take_shapes_whose_constants_are_searched(key: str, design: str, errors: str) -> None:
    data = foundry()
    response = {"share": "scrap", "invlink-gamma": "rate"}.get(key.split()[0], "minutes")
    # under constant errors the fit's gradients are central differences
    agrees(write(key, DESIGNS[design].format(y=response), data, errors=errors), data, rtol=1e-8)
