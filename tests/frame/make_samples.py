"""Makes the demo data of batten.sample(): run this file to write them anew.

Uniform numbers from a seeded generator are turned into normal ones here, so that the stream does not hang on how a
numpy version draws normals; values are rounded as a person would note them.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd
from scipy.special import ndtri

FOLDER = Path(__file__).parents[2] / "src" / "batten" / "frame" / "data"

Array = npt.NDArray[np.float64]


class Draw:
    """Seeded numbers: uniform, normal, choices."""

    def __init__(self, seed: int) -> None:
        self._rng = np.random.Generator(np.random.PCG64(seed))

    def uniform(self, low: float, high: float, size: int) -> Array:
        return low + (high - low) * self._rng.random(size)

    def normal(self, size: int) -> Array:
        return np.asarray(ndtri(self._rng.random(size)))

    def choice(self, options: list[str], chances: list[float], size: int) -> npt.NDArray[np.str_]:
        return np.array(options)[np.searchsorted(np.cumsum(chances)[:-1], self._rng.random(size))]

    def places(self, count: int, size: int) -> npt.NDArray[np.intp]:
        """Distinct positions below `size`."""
        return np.argsort(self._rng.random(size))[:count]


def castings() -> pd.DataFrame:
    """240 castings, four from each heat; minutes multiply with mass and alloy, so the spread fans out."""
    draw = Draw(seed=1103)
    heat = np.repeat(np.arange(60), 4)
    alloy = draw.choice(["bronze", "grey iron", "steel"], [0.3, 0.4, 0.3], 60)[heat]
    mass = np.round(np.exp(draw.uniform(np.log(2), np.log(80), 240)), 1)
    typical = np.exp(1.2 + 0.5 * np.log(mass)) * np.select([alloy == "grey iron", alloy == "steel"], [1.2, 1.55], 1.0)
    frame = pd.DataFrame(
        {
            "heat": [f"H{h + 1:02d}" for h in heat],
            "poured on": (pd.Timestamp("2024-02-05") + pd.to_timedelta(heat // 2, unit="D")).strftime("%Y-%m-%d"),
            "alloy": alloy,
            "mass_kg": mass,
            "minutes": np.round(typical * np.exp(0.18 * draw.normal(240)), 1),
        }
    )
    lost = draw.places(5, 240)
    frame.loc[lost[:3], "alloy"] = None
    frame.loc[lost[3], "mass_kg"] = np.nan
    frame.loc[lost[4], "minutes"] = np.nan
    return frame


def glasshouse() -> pd.DataFrame:
    """180 beds at harvest; yield rises with light and levels off, with the same spread everywhere."""
    draw = Draw(seed=2203)
    bed = np.tile(np.arange(30), 6)
    cultivar = draw.choice(["red", "striped", "yellow"], [0.4, 0.3, 0.3], 30)[bed]
    age = 1 + np.floor(draw.uniform(0, 5, 30))[bed]
    light = np.round(draw.uniform(3, 36, 180), 1)
    level = np.select([cultivar == "striped", cultivar == "yellow"], [1.6, -1.1], 0.0)
    harvested = pd.Timestamp("2023-04-03") + pd.to_timedelta(np.repeat(np.arange(6), 30) * 28, unit="D")
    frame = pd.DataFrame(
        {
            "bed": [f"bed {b + 1}" for b in bed],
            "harvested": harvested.strftime("%Y-%m-%d"),
            "cultivar": cultivar,
            "bed_age": age.astype(int),
            "daily light": light,
            "yield_kg": np.round(4 + 17 * (1 - np.exp(-light / 9)) + level - 0.4 * age + 1.2 * draw.normal(180), 2),
        }
    )
    lost = draw.places(4, 180)
    frame.loc[lost[:2], "daily light"] = np.nan
    frame.loc[lost[2], "cultivar"] = None
    frame.loc[lost[3], "yield_kg"] = np.nan
    return frame


def pumps() -> pd.DataFrame:
    """200 readings of four pumps; energy per cubic metre is lowest at one flow and rises on either side."""
    draw = Draw(seed=3307)
    pump = draw.choice(["north 1", "north 2", "south 1", "south 2"], [0.25, 0.25, 0.25, 0.25], 200)
    flow = np.round(draw.uniform(22, 118, 200), 1)
    level = np.select([pump == "north 2", pump == "south 1", pump == "south 2"], [0.02, 0.05, -0.015], 0.0)
    start = pd.Timestamp("2024-06-03 06:00")
    frame = pd.DataFrame(
        {
            "logged at": (start + pd.to_timedelta(np.arange(200) * 3, unit="h")).strftime("%Y-%m-%d %H:%M"),
            "pump": pump,
            "flow": flow,
            "energy": np.round(0.38 + 0.00007 * (flow - 74) ** 2 + level + 0.016 * draw.normal(200), 4),
        }
    )
    lost = draw.places(4, 200)
    frame.loc[lost[:2], "energy"] = np.nan
    frame.loc[lost[2], "flow"] = np.nan
    frame.loc[lost[3], "pump"] = None
    return frame


def texts() -> dict[str, str]:
    """The files as text, by name."""
    made = {"castings": castings(), "glasshouse": glasshouse(), "pumps": pumps()}
    return {name: frame.to_csv(index=False, lineterminator="\n") for name, frame in made.items()}


if __name__ == "__main__":
    for name, text in texts().items():
        (FOLDER / f"{name}.csv").write_text(text, encoding="utf-8", newline="\n")
