"""Names in figures: one line, existing glyphs, no wider than the room."""

from __future__ import annotations

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties
from matplotlib.text import Text
from matplotlib.textpath import TextToPath
from situations import HOSTILE

from batten.report.letterforms import Words
from batten.report.lettering import drawn, fitted, plain, shortened, width_of, wrapped

NAMES = [*HOSTILE.values(), "mass_kg", "", "a" * 300, "μέτρο", "tab\there\x07", "two\nlines", "質量" * 40]


@pytest.mark.parametrize("name", NAMES)
def test_a_name_is_brought_on_one_line_without_control_characters(name: str) -> None:
    assert plain(name).isprintable()


def test_shortening_keeps_the_beginning_and_the_end() -> None:
    assert shortened("temperature of the outer shell", 15) == "temperatu…shell"
    assert shortened("mass_kg", 7) == "mass_kg"


@pytest.mark.parametrize("bold", [False, True])
@pytest.mark.parametrize("words", ["log of minutes on log of mass_kg", "held-out error, min (mean)", "Ω 12,345.6 $x$"])
def test_measured_widths_are_those_of_matplotlibs_own_layout(words: str, bold: bool) -> None:
    """TextToPath lays out with kerning and bearings, which move a line by less than two percent."""
    font = FontProperties(family="DejaVu Sans", size=72, weight="bold" if bold else "normal")
    theirs = TextToPath().get_text_width_height_descent(words, font, ismath=False)[0] / 72
    assert width_of(words, size=72, bold=bold) == pytest.approx(theirs, rel=0.02)


@pytest.mark.parametrize("name", NAMES)
def test_fitted_words_are_no_wider_than_asked(name: str) -> None:
    assert width_of(fitted(name, 1.5)) <= 1.5
    assert width_of(fitted(lambda limit: f"log of {shortened(name, limit)}", 1.5, bold=True), bold=True) <= 1.5


@pytest.mark.parametrize("name", NAMES)
def test_wrapped_words_keep_to_their_lines(name: str) -> None:
    lines = wrapped(f"log of {name} on log of x", 1.4, 4, bold=True).split("\n")
    assert len(lines) <= 4
    assert all(width_of(line, bold=True) <= 1.4 for line in lines)


def test_letters_without_a_glyph_are_drawn_as_boxes() -> None:
    assert drawn("mass \U0010fffd") == "mass □"
    assert drawn("mass Ω\nkg") == "mass Ω\nkg"


def ink(artist: Text) -> np.ndarray:
    """Darkness of a sheet with one artist on it."""
    figure = Figure(figsize=(4, 1.2), dpi=144)
    canvas = FigureCanvasAgg(figure)
    figure.add_artist(artist)
    canvas.draw()
    return 1 - np.asarray(canvas.buffer_rgba())[..., :3].mean(axis=2) / 255


@pytest.mark.parametrize("va", ["baseline", "top", "bottom", "center"])
@pytest.mark.parametrize("ha", ["left", "center", "right"])
@pytest.mark.parametrize("words", ["log of minutes on\nlog of mass_kg", "Ω 12,345.6 $x$"])
def test_words_lie_where_matplotlib_would_put_them(words: str, ha: str, va: str) -> None:
    """Its own Text shapes each line anew; the same ink in the same place, to a third of the type size, since
    it spaces lines by the letters that happen to stand in them."""
    ours = Words(0.5, 0.5, words, size=9, bold=False, ha=ha, va=va, color="#000000")
    theirs = Text(0.5, 0.5, words, fontsize=9, fontfamily=["DejaVu Sans"], ha=ha, va=va, parse_math=False,
                  linespacing=1.15, color="#000000")  # fmt: skip
    one, other = ink(ours), ink(theirs)
    assert one.sum() == pytest.approx(other.sum(), rel=0.15)
    for axis in (0, 1):
        ends = [np.flatnonzero(sheet.any(axis=axis))[[0, -1]] for sheet in (one, other)]
        np.testing.assert_allclose(*ends, atol=6)
    box = ours.get_window_extent()
    tall, wide = np.nonzero(one)
    assert box.x0 - 1 <= wide.min()
    assert wide.max() <= box.x1 + 1
    assert box.y0 - 1 <= one.shape[0] - tall.max()
    assert one.shape[0] - tall.min() <= box.y1 + 2


def test_letters_that_change_with_their_neighbours_are_left_to_matplotlib() -> None:
    for words in ("عمر", "e\u0301"):
        assert ink(Words(0.1, 0.5, words, size=9, bold=False)).sum() > 0
        assert not Words(0.1, 0.5, words, size=9, bold=False).alone
    assert Words(0.1, 0.5, "masse é 質量", size=9, bold=True).alone
