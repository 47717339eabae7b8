"""Walks a folder of check cases and judges batten by their own tolerances.

    python tests/references/walk.py [FOLDER]

Prints one line per case: published keys met, full-precision keys met, the worst miss. Exits with 1 where a published
number is missed.
"""

from __future__ import annotations

import json
import math
import sys
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from check_cases import compute

__all__ = ["FOLDER", "Judged", "judge", "walk"]

#: where the cases lie beside a checkout
FOLDER = Path(__file__).resolve().parents[3] / "shared" / "references"


@dataclass(frozen=True)
class Judged:
    """One key against its case. group: "published" or "exact". over: distance in tolerances; missing: why not there."""

    group: str
    key: str
    want: float
    got: float | None
    over: float
    missing: str = ""

    @property
    def met(self) -> bool:
        return self.over <= 1


def judge(case: dict[str, Any]) -> list[Judged]:
    """Published keys within their absolute tolerance, exact ones within their relative one."""
    answers = compute(case)
    out = []
    for group, key, want, tolerance in _wanted(case):
        got = answers.numbers.get(key)
        over = math.inf
        if got is not None and math.isfinite(got):
            away = abs(got - want)
            over = 0.0 if away <= 1e-15 * abs(want) else away / tolerance if tolerance else math.inf
        out.append(Judged(group, key, want, got, over, answers.missing.get(key, "")))
    return out


def _wanted(case: dict[str, Any]) -> Iterator[tuple[str, str, float, float]]:
    """(group, key, number, absolute tolerance)."""
    for key, want in case["expect"].items():
        yield "published", key, want, case["tol"][key] + 1e-15 * abs(want)
    special = case.get("exact_rel_tol_keys", {})
    for key, want in case["exact"].items():
        relative = special.get(key, case["exact_rel_tol"])
        yield "exact", key, want, relative * abs(want) if want else case["tol"].get(key, 1e-9)


def walk(paths: Iterable[Path]) -> Iterator[tuple[str, list[Judged]]]:
    """(name, judged keys) of every case."""
    for path in paths:
        case = json.loads(path.read_text(encoding="utf-8"))
        try:
            judged = judge(case)
        except Exception as error:  # a case that breaks must not hide the ones after it
            why = f"failed: {error!r}"
            judged = [Judged(group, key, want, None, math.inf, why) for group, key, want, _ in _wanted(case)]
        yield case["id"], judged


def _line(name: str, judged: list[Judged]) -> str:
    counts = []
    for group in ("published", "exact"):
        mine = [j for j in judged if j.group == group]
        counts.append(f"{sum(j.met for j in mine):3d}/{len(mine):<3d}")
    worst = max((j for j in judged if not j.met), key=lambda j: j.over, default=None)
    return f"{name:32s} {'  '.join(counts)}  {_words(worst)}"


def _words(miss: Judged | None) -> str:
    if miss is None:
        return ""
    if miss.got is None:
        return f"{miss.key}: {miss.missing[:110]}"
    return f"{miss.key}: {miss.got:.12g}, not {miss.want:.12g} ({miss.group})"


def main(arguments: list[str]) -> int:
    folder = Path(arguments[0]) if arguments else FOLDER
    if not folder.is_dir():
        print(f"No folder of cases at {folder}.")
        return 2
    print(f"{'case':32s} published  exact   worst miss")
    missed = 0
    for name, judged in walk(sorted(folder.glob("*.json"))):
        print(_line(name, judged), flush=True)
        missed += sum(not j.met for j in judged if j.group == "published")
    print(f"{missed} published numbers missed.")
    return 1 if missed else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
