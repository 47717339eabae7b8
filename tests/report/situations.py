"""Invented situations for tests of what is shown: a fan in a foundry, a plateau under glass, a bowl in a pump house."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import pandas as pd

import batten
from batten.exam.examination import Examination

__all__ = ["HOSTILE", "QUICK", "Situation", "bowl", "examined", "fan", "hostile", "plateau"]

#: names that break careless HTML, mathematics in text, and layouts
HOSTILE = {
    "response": '_<b>cost</b> & "fuss" $\\bad{$ of every single casting poured on a Tuesday in the old hall',
    "focus": "_mass $x$ <img src=x onerror=alert(1)> 'net' of the runner,\nthe riser and the sprue Ω 質量",
    "covariate": "<script>alloy</script>",
}
#: a few remedies of every kind
QUICK = (
    "y ~ x", "log y ~ log x", "sqrt y ~ x", "y ~ poly2 x", "1/y ~ x", "y ~ bins5 x", "log y ~ spline4 x",
    "loglink y ~ x",
)  # fmt: skip


@dataclass(frozen=True)
class Situation:
    """A formula, its data, and what is asked."""

    formula: str
    frame: pd.DataFrame
    focus: str
    span: tuple[float, float]
    units: dict[str, str]

    def examine(self, **options: object) -> Examination:
        """The whole comparison."""
        asked = {"focus": self.focus, "span": self.span, "units": self.units} | options
        return batten.examine(self.formula, self.frame, **asked)  # type: ignore[arg-type]


def fan(n: int, *, seed: int = 3) -> Situation:
    """Foundry: minutes of fettling grow with the mass of a casting; the error grows with the mean."""
    rng = np.random.default_rng(seed)
    mass = np.round(rng.lognormal(2.7, 0.6, n), 1)
    alloy = rng.integers(0, 3, n)
    minutes = 0.5 * mass**1.5 * np.array([1.0, 1.12, 1.3])[alloy] * rng.lognormal(0, 0.28, n)
    names = np.array(["bronze", "grey iron", "steel"])[alloy]
    frame = pd.DataFrame({"minutes": np.round(minutes, 1), "mass_kg": mass, "alloy": names})
    units = {"minutes": "min", "mass_kg": "kg"}
    return Situation("minutes ~ mass_kg + C(alloy)", frame, "mass_kg", (10.0, 25.0), units)


def plateau(n: int, *, seed: int = 5) -> Situation:
    """Glasshouse: yield of a bench rises with the nutrient dose and levels off."""
    rng = np.random.default_rng(seed)
    dose = np.round(rng.uniform(0.4, 24, n), 1)
    grams = 640 * dose / (3.4 + dose) + rng.normal(0, 32, n)
    frame = pd.DataFrame({"yield_g": np.round(grams), "dose_ml": dose})
    return Situation("yield_g ~ dose_ml", frame, "dose_ml", (5.0, 18.0), {"yield_g": "g", "dose_ml": "ml"})


def bowl(n: int, *, seed: int = 9) -> Situation:
    """Pump house: vibration falls and rises again with the speed of the pump; the air's temperature shifts it."""
    rng = np.random.default_rng(seed)
    speed = np.round(rng.uniform(900, 2900, n))
    air = np.round(rng.normal(18, 6, n), 1)
    vibration = 2.1 + 2.6 * ((speed - 1750) / 1000) ** 2 + 0.03 * (air - 18) + rng.normal(0, 0.35, n)
    frame = pd.DataFrame({"vibration": np.round(vibration, 2), "speed_rpm": speed, "air_c": air})
    units = {"vibration": "mm/s", "speed_rpm": "rpm", "air_c": "°C"}
    return Situation("vibration ~ speed_rpm + air_c", frame, "speed_rpm", (1400.0, 2400.0), units)


def hostile(n: int) -> Situation:
    """The fan under names that no one should choose."""
    plain = fan(n)
    y, x, g = HOSTILE["response"], HOSTILE["focus"], HOSTILE["covariate"]
    frame = plain.frame.set_axis([y, x, g], axis=1)
    return Situation(f"Q({y!r}) ~ Q({x!r}) + C(Q({g!r}))", frame, x, plain.span, {y: "<i>min</i>", x: "kg & $"})


@cache
def examined(name: str, n: int, *only: str, **options: str) -> Examination:
    """The comparison of one situation, made once; `only` some remedies."""
    made = {"fan": fan, "plateau": plateau, "bowl": bowl, "hostile": hostile}[name](n)
    return made.examine(only=list(only) or None, **options)
