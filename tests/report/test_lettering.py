"""Names in figures: one line, existing glyphs, no wider than the room."""

from __future__ import annotations

import pytest
from matplotlib.font_manager import FontProperties
from matplotlib.textpath import TextToPath
from situations import HOSTILE

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
