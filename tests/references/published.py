"""A published result: source, data, formula, and its numbers as they were printed."""

from __future__ import annotations

from dataclasses import dataclass, field
from decimal import Decimal
from typing import Any

from check_cases import compute

__all__ = ["Published"]


@dataclass(frozen=True)
class Published:
    """A source, a formula with its focal predictor, and numbers as printed. data: "package name" or columns."""

    source: str
    data: str | dict[str, list[float]]
    formula: str
    focus: str
    printed: dict[str, str]
    response: str = "y"
    kind: str = ""
    prep: str = ""
    given: dict[str, Any] = field(default_factory=dict)
    digits: int = 0

    def misses(self) -> list[str]:
        """Keys whose number is not the published one, with what batten says."""
        answers = compute(self._case())
        out = []
        for key, text in self.printed.items():
            want, got = float(text), answers.numbers.get(key)
            if got is None or not abs(got - want) <= self._tolerance(text):
                out.append(f"{key}: {answers.missing.get(key, got)}, not {text}")
        return out

    def _tolerance(self, text: str) -> float:
        if self.digits:
            return 10.0**-self.digits * (abs(float(text)) or 1)
        exponent = Decimal(text).as_tuple().exponent
        assert isinstance(exponent, int)
        return 0.5 * 10.0**exponent * (1 + 1e-9) if "." in text else 0.5

    def _case(self) -> dict[str, Any]:
        if isinstance(self.data, str):
            package, name = self.data.split(" ")
            source = {"kind": "package", "package": package, "name": name, "prep": self.prep}
        else:
            source = {"kind": "inline", "prep": self.prep}
        return {
            "id": "", "kind": self.kind, "source": self.source, "data_from": source, "data": self.data,
            "formula": self.formula, "response": self.response, "focus": self.focus, "remedy": "", "given": self.given,
            "expect": self.printed, "exact": {},
        }  # fmt: skip
