"""batten: for regressions that bend."""

__version__ = "0.1.0"
