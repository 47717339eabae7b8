"""What one fit says, in sentences that follow from its numbers.

First the span, always; then what belongs to the remedy: a reading of its coefficient where one holds all along x, two
named places where the curve has no single slope, each step of a grouping, both sides of a break, each group of an
interaction with the difference between them; then what was learned, where the curve turns, and what another unit of y
would have given where the scale hangs on it. Every number comes with its unit, the mean or median it is about, and its
interval.
"""

from __future__ import annotations

import math
import re

import numpy as np

from batten.effects.constants import Constant
from batten.effects.contrast import NO_ANSWER, SpanEffect, same_group, span_effect
from batten.effects.groups import Group, GroupEffect, group_effects
from batten.effects.readings import Reading, hinge_readings, multiplies, readings
from batten.effects.rounding import Rounding
from batten.effects.slopes import SlopeAt, breaks, slopes_along
from batten.effects.smoothing import smoothing_sentence
from batten.effects.tell import UNSETTLED, Names, Sentence, Told
from batten.effects.turn import Turn
from batten.effects.units import unit_change
from batten.engine.rows import Array
from batten.fit.estimate import Estimate

__all__ = [
    "coefficient_sentences", "constant_sentences", "group_sentences", "hinge_sentences", "place_sentence", "sentences",
    "span_sentence", "step_sentences", "turn_sentence",
]  # fmt: skip

_NUMBERS = re.compile(r"(?<![\w.])-?\d+(?:\.\d+)?(?:e[+-]?\d+)?\b")

#: most steps of a grouping that are told one by one
STEPS = 8


def sentences(
    est: Estimate,
    names: Names,
    span: tuple[float, float],
    *,
    of: str = "mean",
    errors: str = "robust",
    groups: tuple[Group, ...] = (),
    base: Array | None = None,
    modifier: Array | None = None,
    learned: tuple[tuple[Constant, Rounding | None], ...] = (),
    turn: Turn | None = None,
) -> tuple[Sentence, ...]:
    """All sentences of one fit, the span first.

    base (u, q), modifier (u, m): covariate rows to average over. groups: those of an interaction. learned: constants,
    each with the nicer value advised for it. turn: its turning point, where it can have one.
    """
    asked = {"of": of, "level": names.level, "errors": errors}
    found = span_effect(est, span, base=base, modifier=modifier, **asked)  # type: ignore[arg-type]
    out = [span_sentence(found, names)]
    if groups:
        effects = group_effects(est, groups, span, **asked)  # type: ignore[arg-type]
        out += group_sentences(effects, names, ratios=multiplies(est))
    if est.shape.steps:
        out += step_sentences(est, names, **asked, base=base, modifier=modifier)  # type: ignore[arg-type]
    elif breaks(est):
        out += hinge_sentences(est, names, span, errors=errors)
    else:
        out += coefficient_sentences(est, names, span, errors=errors)
    if len(out) == 1 and not est.shape.steps:
        slopes = slopes_along(est, span, base=base, modifier=modifier, **asked)  # type: ignore[arg-type]
        out += place_sentence(slopes, names, of=of)
    if est.roughness is not None:
        out.append(smoothing_sentence(est, names))
    out += constant_sentences(learned, names)
    if turn is not None and turn.estimates:
        out.append(turn_sentence(turn, names, of=of))
    change = unit_change(est, span)
    if change is not None:
        out.append(change.sentence(names))
    return tuple(out)


def span_sentence(effect: SpanEffect, names: Names, *, group: str = "") -> Sentence:
    """Rows at b against rows at a, in one sentence. group: the group the rows are of, for interactions."""
    told = Told(names)
    a, b = told.place("a", effect.a, names.x_unit), told.place("b", effect.b, names.x_unit)
    ends = f"{group}rows" if group else "Rows"
    ends = f"{ends} with {names.x} of {b} against rows with {names.x} of {a}"
    if effect.note == NO_ANSWER:
        return told.sentence("span", f"{ends}: this grouping cannot answer, since both lie in one group.")
    lead = f"{ends}{names.alike}"
    if effect.note:
        return told.sentence("span", f"{lead}: nothing can be said, since {effect.note}.")
    d, target = effect.difference, f"the {effect.of} of {names.y}"
    if math.isnan(d.low):
        gap = told.estimate("difference", d, names.y_unit)
        return told.sentence("span", f"{lead}: the difference in {target} is {gap}.")
    if d.direction() == "open":
        gap = told.estimate("difference", d, names.y_unit)
        return told.sentence("span", f"{lead}: {UNSETTLED} of {target}; the difference is {gap}.")
    size = d if d.direction() == "higher" else d.times(-1)
    by = told.estimate("difference", size, names.y_unit)
    text = f"{lead}: {target} is clearly {d.direction()}, by {by}"
    if effect.ratio.defined:
        r = effect.ratio
        times = told.number("ratio", r.estimate, width=r.high - r.low)
        text += f"; that is {times} times as much ({told.interval('ratio', r.low, r.high)})"
    return told.sentence("span", f"{text}.")


def group_sentences(effects: tuple[GroupEffect, ...], names: Names, *, ratios: bool) -> list[Sentence]:
    """The span effect of each group, then what separates each from the first. ratios: also the ratio of ratios."""
    out = [span_sentence(e.span, names, group=f"{e.label}: ") for e in effects]
    first = effects[0].label
    for e in effects[1:]:
        # without an interaction nothing is left to tell between groups but rounding
        apart = e.difference.high - e.difference.low > 1e-9 * max(abs(effects[0].span.difference.estimate), 1e-300)
        if not e.difference.defined or not apart:
            continue
        told = Told(names)
        amount = told.amount("difference", e.difference, names.y_unit)
        target = f"in the {e.span.of} of {names.y}"
        text = f"{e.label} against {first}: the same step of {names.x} goes with {amount} {target}"
        if ratios and e.ratio.defined and e.ratio.high - e.ratio.low > 1e-9:  # without an interaction ratios are equal
            r = e.ratio
            times = told.number("ratio", r.estimate, width=r.high - r.low)
            text += f"; the ratios differ by a factor of {times} ({told.interval('ratio', r.low, r.high)})"
        out.append(told.sentence("groups", f"{text}."))
    return out


def coefficient_sentences(
    est: Estimate, names: Names, span: tuple[float, float], *, errors: str = "robust"
) -> list[Sentence]:
    """Readings of the focal coefficient; none where no single reading holds all along x."""
    found = readings(est, span, level=names.level, errors=errors)
    return [_reading_sentence(est, reading, names) for reading in found]


def hinge_sentences(
    est: Estimate, names: Names, span: tuple[float, float], *, errors: str = "robust"
) -> list[Sentence]:
    """The slope on each side of the break or breaks; the break's own interval is told with the learned constants."""
    out = []
    places = breaks(est)
    for k, reading in enumerate(hinge_readings(est, span, level=names.level, errors=errors)):
        told = Told(names)
        ends = [told.number(f"break_{j}", places[j], names.x_unit) for j in (k - 1, k) if 0 <= j < len(places)]
        where = f"from {' to '.join(ends)}" if len(ends) == 2 else f"{'below' if k == 0 else 'above'} {ends[0]}"
        out.append(_reading_sentence(est, reading, names, told=told, where=f"{_start(where)}, "))
    return out


def _reading_sentence(
    est: Estimate, reading: Reading, names: Names, *, told: Told | None = None, where: str = ""
) -> Sentence:
    told = told or Told(names)
    per = _per(reading, names, told)
    lead = f"{where}{per if where else _start(per)}{names.alike}{',' * bool(names.alike)}"
    if not reading.relative:
        amount = told.amount("change", reading.effect, names.y_unit)
        return told.sentence("coefficient", f"{lead} goes with {amount} in the mean of {names.y}.")
    amount = told.amount("change", reading.effect, "%")
    return told.sentence("coefficient", f"{lead} goes with {amount} {_relative_target(est, names)}.")


def _per(reading: Reading, names: Names, told: Told) -> str:
    if reading.per == "doubling":
        return f"each doubling of {names.x}"
    if reading.per == "percent":
        return f"each {told.place('step', 1.0, '%')} more of {names.x}"
    if reading.step == 1:
        return f"each further {names.one}"
    unit = names.x_unit or f"of {names.x}"
    return f"each further {told.place('step', reading.step)} {unit}"


def _relative_target(est: Estimate, names: Names) -> str:
    """Which quantity a percent is about: a coefficient's percent is not always the ratio of means."""
    if est.link is not None:
        return f"in the mean of {names.y}"
    same = f"and of its mean too where the spread of log {names.y} does not change along {names.x}"
    return f"in the median of {names.y}, {same}"


def place_sentence(slopes: tuple[SlopeAt, ...], names: Names, *, of: str) -> list[Sentence]:
    """Two named places, since the curve has no single slope."""
    told, parts = Told(names), []
    for k, at in enumerate(slopes):
        where = f"at {told.place(f'x_{k}', at.x, names.x_unit)}"
        if not at.slope.defined:
            parts.append(f"{where} nothing can be said, since {at.slope.note}")
            continue
        amount = told.amount(f"slope_{k}", at.slope, names.y_unit)
        per = f"each further {names.one} goes with" if not parts else "with"
        parts.append(f"{where} {per} {amount}")
    text = f"{_start(', and '.join(parts))}, in the {of} of {names.y}{names.alike}; the slope changes along the curve."
    return [told.sentence("places", text)]


def step_sentences(
    est: Estimate,
    names: Names,
    *,
    of: str = "mean",
    level: float = 0.95,
    errors: str = "robust",
    base: Array | None = None,
    modifier: Array | None = None,
) -> list[Sentence]:
    """Each step of a grouping, from one group to the next."""
    edges = est.shape.cuts(est.state, est.theta) or ()
    inside = [float(np.nextafter(edges[0], -np.inf)), *edges]
    out = []
    for k in range(min(len(edges), STEPS)):
        if same_group(est, inside[k], inside[k + 1]):
            continue
        told = Told(names)
        effect = span_effect(
            est, (inside[k], inside[k + 1]), of=of, level=level, errors=errors, base=base, modifier=modifier
        )
        lower, upper = (_group_words(edges, j, names, told) for j in (k, k + 1))
        lead = f"Rows with {names.x} {upper} against rows with {names.x} {lower}{names.alike}"
        if effect.note:
            out.append(told.sentence("steps", f"{lead}: nothing can be said, since {effect.note}."))
            continue
        amount = told.amount("difference", effect.difference, names.y_unit)
        out.append(told.sentence("steps", f"{lead}: {amount} in the {of} of {names.y}."))
    return out


def _group_words(edges: tuple[float, ...], k: int, names: Names, told: Told) -> str:
    """The k-th group: "below 8 kg", "from 8 to 16 kg", "of 16 kg and above"."""
    ends = {j: told.place(f"edge_{j}", edges[j], names.x_unit) for j in (k - 1, k) if 0 <= j < len(edges)}
    if k == 0:
        return f"below {ends[0]}"
    return f"of {ends[k - 1]} and above" if k == len(edges) else f"from {ends[k - 1]} to {ends[k]}"


def constant_sentences(learned: tuple[tuple[Constant, Rounding | None], ...], names: Names) -> list[Sentence]:
    """What was searched, with its set, and what a nicer value costs."""
    out = []
    for constant, nice in learned:
        if constant.kind in ("fixed", "listed"):
            continue
        told, unit = Told(names), _constant_unit(constant, names)
        # a name may hold a place of its own: "level at mass 0"
        told.numbers.update({f"in_name_{k}": float(v) for k, v in enumerate(_NUMBERS.findall(constant.name))})
        if not constant.named:
            out.append(told.sentence("constant", f"The data do not say what the {constant.name} is."))
            continue
        # a break is named in other sentences too, there without its set: the same digits everywhere
        width = None if constant.kind == "place in x" else constant.high - constant.low
        text = f"The {constant.name} is {told.number('value', constant.estimate, unit, width=width)}"
        out.append(
            told.sentence(
                "constant", f"{text} ({_set_words(constant, told, unit)}){_price(constant, nice, told, unit)}."
            )
        )
    return out


def _constant_unit(constant: Constant, names: Names) -> str:
    """Places have the unit of x, a curve's own levels that of y; rates and powers carry theirs in the name."""
    if constant.kind == "place in x" or (constant.kind == "curve" and constant.name.startswith(names.x)):
        return names.x_unit
    return names.y_unit if constant.kind == "curve" and constant.profile is None else ""


def _set_words(constant: Constant, told: Told, unit: str) -> str:
    """The set, open ends and pieces in words."""
    parts = []
    for k, (low, high) in enumerate(constant.pieces):
        if math.isinf(low):
            parts.append(f"anything up to {told.number(f'high_{k}', high, unit)}")
        elif math.isinf(high):
            parts.append(f"anything from {told.number(f'low_{k}', low, unit)} on")
        else:
            parts.append(told.interval(f"set_{k}", low, high, unit).split("interval ", 1)[1])
    told.numbers["level"] = round(100 * told.names.level, 6)
    return f"{told.place('level', told.numbers['level'])}% interval {' and '.join(parts)}"


def _price(constant: Constant, nice: Rounding | None, told: Told, unit: str) -> str:
    """What a nicer value costs, in fit and in the answer to the standing question."""
    if nice is None:
        return ""
    named = constant.kind in ("power of y", "power of x")
    words = nice.words if named else told.place("nicer", nice.value, unit)
    text = f"; {words} instead costs {told.number('cost', nice.loss, width=0.1)} in log-likelihood"
    if math.isfinite(nice.change):
        text += f" and moves the difference over the span by {told.number('moved', nice.change, told.names.y_unit)}"
    return text


def turn_sentence(turn: Turn, names: Names, *, of: str) -> Sentence:
    """The turning point with its set, or that there is none to be named."""
    told = Told(names)
    told.numbers.update({f"turn_{k}": value for k, value in enumerate(turn.estimates)})
    for k, (low, high) in enumerate(turn.pieces):
        told.numbers.update({f"from_{k}": low, f"to_{k}": high})
    told.numbers.update({"level": round(100 * names.level, 6), "x_lowest": turn.data[0], "x_highest": turn.data[1]})
    if turn.located:
        text = f"The {of} of {names.y} is {turn.reading}"
        if turn.height is not None and of == "mean":
            there = told.estimate("there", turn.height, names.y_unit)
            text += f"; there it is {there}, which flatters since the place was chosen for it"
        return told.sentence("turn", f"{text}.")
    return told.sentence("turn", f"Turning point of {names.y}: {turn.reading}.")


def _start(text: str) -> str:
    """A capital at the start; only where no name of the user's stands there."""
    return text[:1].upper() + text[1:]
