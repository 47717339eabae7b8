"""Words drawn as filled outlines: each letter is cut out of its font once, and lines are set side by side from these.

Matplotlib shapes every line anew and turns every letter into pixels by itself, ten times the work on figures that are
mostly words. Scripts whose letters change with their neighbours are left to it.
"""

from __future__ import annotations

import threading
import unicodedata
from functools import cache
from typing import Any

import numpy as np
from matplotlib.colors import to_rgba
from matplotlib.ft2font import LoadFlags
from matplotlib.path import Path
from matplotlib.text import Text
from matplotlib.transforms import Affine2D, Bbox

from batten.engine.rows import Array
from batten.report.lettering import MEASURED, advance, families, font_of, width_of

__all__ = ["Words"]

#: of a line, as shares of the type size: from the baseline up and down (DejaVu Sans), and between baselines
UP, DOWN, LINE = 0.93, 0.24, 1.345
#: half the height of capitals above the baseline, where words are centred on something
MIDDLE = 0.345
#: letters that stand by themselves: Latin to Armenian, signs, ideographs, syllables, full-width forms
_ALONE = ((0, 0x58F), (0x1E00, 0x2BFF), (0x3000, 0x9FFF), (0xAC00, 0xD7A3), (0xF900, 0xFAFF), (0xFF00, 0xFFEF))
#: a font holds one letter at a time, and figures may be drawn side by side
_lock = threading.Lock()
_ACROSS = {"left": 0.0, "center": 0.5, "right": 1.0}


class Words(Text):  # type: ignore[misc, unused-ignore]
    """Lines of one size, weight and colour, level, never read as mathematics."""

    def __init__(self, x: float, y: float, words: str, *, size: float, bold: bool, **more: Any) -> None:
        super().__init__(
            x, y, words, fontsize=size, weight="bold" if bold else "normal", fontfamily=list(families()),
            parse_math=False, usetex=False, antialiased=True, linespacing=1.15, rotation=0, **more,
        )  # fmt: skip
        self._size, self._bold = size, bold
        #: whether each letter stands by itself
        self.alone = all(map(_stands_alone, words))

    def draw(self, renderer: Any) -> None:
        """Fill the outlines, line by line."""
        if not self.alone:
            super().draw(renderer)
            return
        if not (self.get_visible() and self.get_text().strip()):
            return
        scale = renderer.points_to_pixels(self._size)
        context = renderer.new_gc()
        context.set_linewidth(0.0)
        context.set_antialiased(True)
        context.set_snap(False)
        for line, x, y in self._lines(scale):
            outline = _outline(line, self._bold)
            if outline is not None:
                at = Affine2D().scale(scale).translate(x, y)
                renderer.draw_path(context, outline, at, to_rgba(self.get_color()))
        context.restore()

    def get_window_extent(self, renderer: Any = None, dpi: float | None = None) -> Bbox:
        """The room the words take, pixels."""
        if not self.alone:
            return super().get_window_extent(renderer, dpi)
        figure = self.get_figure(root=True)
        assert figure is not None
        scale = self._size * (dpi or figure.dpi) / 72
        lines = self._lines(scale)
        right = max(x + scale * self._wide(line) for line, x, _ in lines)
        left, top, bottom = min(x for _, x, _ in lines), lines[0][2], lines[-1][2]
        return Bbox([[left, bottom - DOWN * scale], [right, top + UP * scale]])

    def _lines(self, scale: float) -> list[tuple[str, float, float]]:
        """Each line with the place of its baseline, pixels."""
        x, y = self.get_transform().transform(self.get_unitless_position())
        lines = self.get_text().split("\n")
        across, below = _ACROSS[self.get_horizontalalignment()], (len(lines) - 1) * LINE
        first = {
            "baseline": below, "bottom": DOWN + below, "top": -UP, "center": below / 2 - MIDDLE,
        }[self.get_verticalalignment()]  # fmt: skip
        return [
            (line, float(x) - across * scale * self._wide(line), float(y) + scale * (first - i * LINE))
            for i, line in enumerate(lines)
        ]

    def _wide(self, line: str) -> float:
        """Width as a multiple of the type size."""
        return width_of(line, size=72, bold=self._bold)


@cache
def _stands_alone(letter: str) -> bool:
    at = ord(letter)
    return unicodedata.category(letter)[0] != "M" and any(low <= at <= high for low, high in _ALONE)


def _outline(line: str, bold: bool) -> Path | None:
    """A line in units of the type size, its baseline beginning at the origin; None for nothing to fill."""
    corners, codes, x = [], [], 0.0
    for letter in line:
        form, steps = _form(letter, bold)
        if len(form):
            corners.append(form + np.array([x, 0.0]))
            codes.append(steps)
        x += advance(letter, bold)
    if not corners:
        return None
    path = Path(np.concatenate(corners), np.concatenate(codes))
    path.should_simplify = False
    return path


@cache
def _form(letter: str, bold: bool) -> tuple[Array, np.ndarray[Any, Any]]:
    """Corners (k, 2) and steps (k,) of one letter."""
    font = font_of(letter, bold)
    if font is None:
        return np.empty((0, 2)), np.empty(0, dtype=np.uint8)
    with _lock:
        font.set_size(MEASURED, 72)
        font.load_char(ord(letter), flags=LoadFlags.NO_HINTING)
        corners, steps = font.get_path()
    return corners / MEASURED, steps.copy()
