"""The families of remedies: response scales, predictor shapes, links and known curves, found by folder."""

from batten.families.registry import curves, links, scales, shapes
from batten.families.remedy import FAMILIES, Remedy, default_grid, expand, parse

__all__ = ["FAMILIES", "Remedy", "curves", "default_grid", "expand", "links", "parse", "scales", "shapes"]
