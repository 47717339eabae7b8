"""Invented demo data, made with known constants so that what a remedy finds can be compared with the truth."""

from __future__ import annotations

from importlib.resources import files

import pandas as pd

from batten.errors import data as errors

__all__ = ["sample"]

_DATES = {"castings": "poured on", "glasshouse": "harvested", "pumps": "logged at"}


def sample(name: str) -> pd.DataFrame:
    """One of three invented data sets, as a fresh data frame with a few missing cells.

    castings (240 rows): finishing time at a small foundry, `minutes`, against `mass_kg`, with `alloy`; four castings
        come from each `heat`, and share a date in `poured on`. Truth: the median is exp(1.2) * mass_kg**0.5 minutes
        for bronze, 1.2 times that for grey iron and 1.55 times for steel; the spread multiplies (SD of the log 0.18),
        so the mean is exp(0.18**2 / 2) = 1.016 times the median. Heats and dates have no effect of their own.
    glasshouse (180 rows): fresh weight per bed, `yield_kg`, against `daily light` (mol/m2/day), with `cultivar` and
        `bed_age` (years); each of 30 `bed`s was `harvested` six times. Truth: the mean is
        4 + 17 * (1 - exp(-light / 9)) - 0.4 * bed_age kg for red, 1.6 more for striped, 1.1 less for yellow; SD 1.2 kg
        everywhere. Beds and dates have no effect of their own.
    pumps (200 rows): `energy` (kWh per cubic metre) of four pumps against `flow` (cubic metres per hour), with `pump`
        and the time in `logged at`. Truth: the mean is 0.38 + 0.00007 * (flow - 74)**2 for north 1, and 0.02 more,
        0.05 more and 0.015 less for north 2, south 1 and south 2; lowest at 74 for all; SD 0.016 everywhere.
    """
    if name not in _DATES:
        raise errors.unknown_sample(name, sorted(_DATES))
    with (files("batten.frame") / "data" / f"{name}.csv").open(encoding="utf-8") as source:
        return pd.read_csv(source, parse_dates=[_DATES[name]])
