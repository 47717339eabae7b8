"""The public facades: `examine`, the examination it returns, and each fit in it."""

from __future__ import annotations

from batten.exam.examination import Examination, examine
from batten.exam.fit import Fit

__all__ = ["Examination", "Fit", "examine"]
