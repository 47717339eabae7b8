"""Follows printed numbers back to results."""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np

from batten.exam.examination import Examination

__all__ = ["known_numbers", "untraced"]

#: a number that is not part of a word or key ("spline5", "log1p", "HC3", "x^2")
_NUMBER = re.compile(r"(?<![\w.,^:/])[-−+]?\d[\d,]*(?:\.\d+)?(?:e[-+]?\d+)?(?![\w^]|\.\d)")


def known_numbers(exam: Examination, *more: float) -> np.ndarray:
    """Every number that results hold: table, effects, trial, question, sentences, counts."""
    out: list[float] = [*more]
    table = exam.table()
    out += table.select_dtypes("number").to_numpy(float).ravel().tolist()
    out += (100 * table["within_10"]).tolist()
    trial = exam.straight
    out += [trial.gap, trial.gap_low, trial.gap_high, trial.at, trial.tolerance, trial.f, *trial.df, trial.knots]
    out += [end for stretch in trial.stretches for end in (stretch.low, stretch.high, stretch.size)]
    q, p, c = exam.question, exam.problem, exam.choice
    out += [*q.span, 100 * q.level, q.seed, p.rows.count, len(p.left_out), p.rows.count + len(p.left_out)]
    out += [c.tried, len(c.tied), len(c.tied) - 1, len(exam), len(exam.refused), exam.comparison.splits.k]
    out += [len(exam.comparison.splits.fold), 90.0, 1.0]  # the central 90%, ties under 1%
    for sentence in exam.chosen.sentences():
        out += sentence.numbers.values()
    # what the choice says itself
    out += [float(n.replace(",", "")) for reason in c.reasons for n in _NUMBER.findall(reason)]
    values = np.array(out, dtype=float)
    return values[np.isfinite(values)]


def untraced(text: str, known: Iterable[float]) -> list[str]:
    """Numbers in a text that no known number gives at the printed digits."""
    values = np.asarray(list(known))
    return [word for word in _NUMBER.findall(text) if not _found(word, values)]


def _found(word: str, known: np.ndarray) -> bool:
    plain = word.replace(",", "").replace("−", "-").lstrip("+")
    value, (head, _, exponent) = float(plain), plain.partition("e")
    decimals = len(head.partition(".")[2])
    step = 10.0 ** (int(exponent or 0) - decimals)
    if not decimals:  # trailing zeros of a whole number may be places that were rounded away
        step *= 10.0 ** (len(head) - len(head.rstrip("0"))) if value else 1.0
    return bool((np.abs(np.abs(known) - abs(value)) <= 0.5 * step * (1 + 1e-9)).any())
