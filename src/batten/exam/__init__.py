"""The public facades: `examine`, `Examination` and `Fit`."""

from __future__ import annotations

from batten.exam.examination import Examination, examine
from batten.exam.fit import Fit

__all__ = ["Examination", "Fit", "examine"]
