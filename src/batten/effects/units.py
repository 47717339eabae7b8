"""Would the answer change if y were counted in another unit? For scales that hold one unit of y inside."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from batten.effects.contrast import reach_trouble, same_group
from batten.effects.tell import Names, Sentence, Told
from batten.fit.estimate import Estimate
from batten.fit.fitting import estimate
from batten.fit.means import averaged_means

__all__ = ["FACTOR", "UnitChange", "unit_change"]

#: how many of the other unit make one: cents of a euro
FACTOR = 100


@dataclass(frozen=True)
class UnitChange:
    """The span effect of the mean as fitted, and fitted with y in hundredths of its unit and brought back.

    difference, difference_other: units of y. ratio, ratio_other: NaN where a mean is not above zero. why: the reason
    where the other unit cannot be fitted, "" otherwise. zeros: y holds zeros or negatives.
    """

    difference: float
    difference_other: float
    ratio: float
    ratio_other: float
    zeros: bool
    why: str = ""

    @property
    def change(self) -> float:
        """Units of y."""
        return self.difference_other - self.difference

    def sentence(self, names: Names) -> Sentence:
        """ "With minutes in hundredths of min the difference over the span would be 3.21 min, not 2.84 min; ..."."""
        told, y = Told(names), names.y
        lead = f"With {y} in hundredths of {names.y_unit or 'its unit'}"
        if self.why:
            return told.sentence("unit", f"{lead} this remedy cannot be fitted: {self.why}.")
        now = told.number("difference", self.difference, names.y_unit)
        other = told.number("difference_other", self.difference_other, names.y_unit)
        text = f"{lead} the difference over the span would be {other}, not {now}"
        if math.isfinite(self.ratio + self.ratio_other):
            ratios = told.number("ratio_other", self.ratio_other), told.number("ratio", self.ratio)
            text += f", and the ratio of means {ratios[0]}, not {ratios[1]}"
        if self.zeros:
            text += f"; {y} holds zeros or negatives, so nothing relative can be read off this scale"
        return told.sentence("unit", f"{text}.")


def unit_change(est: Estimate, span: tuple[float, float]) -> UnitChange | None:
    """The unit test as a number (Aihounton and Henningsen 2021; Chen and Roth 2024).

    None for scales whose answer does not hang on the unit of y, and where the span has no answer.
    """
    if est.link is not None or est.scale.unit_free:
        return None
    first = _ends(est, span)
    if first is None:
        return None
    zeros = bool(np.min(est.rows.y) <= 0)
    other = estimate(replace(est.rows, y=FACTOR * est.rows.y), est.remedy)
    if not isinstance(other, Estimate):
        return UnitChange(first[1] - first[0], math.nan, math.nan, math.nan, zeros, other.wrong.rstrip("."))
    second = _ends(other, span)
    if second is None:
        return UnitChange(first[1] - first[0], math.nan, math.nan, math.nan, zeros, "its means do not exist there")
    a, b = (end / FACTOR for end in second)
    return UnitChange(first[1] - first[0], b - a, _ratio(*first), _ratio(a, b), zeros)


def _ends(est: Estimate, span: tuple[float, float]) -> tuple[float, float] | None:
    if same_group(est, *span) or reach_trouble(est, np.array(span)):
        return None
    a, b = averaged_means(est, np.array(span), root=False).value
    return float(a), float(b)


def _ratio(a: float, b: float) -> float:
    return b / a if a > 0 and b > 0 else math.nan
