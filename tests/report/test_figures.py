"""Figures: what they show, what they say in words, and that nothing of the user's settings reaches them."""

from __future__ import annotations

import io
import subprocess
import sys
from collections.abc import Callable

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from PIL import Image
from situations import QUICK, examined

from batten.exam.examination import Examination
from batten.report import figures
from batten.report.plot_left import running_median
from batten.report.scales import round_places

MAKERS: dict[str, Callable[[Examination], figures.Picture]] = {
    "line against choice": figures.line_against_choice,
    "fit": lambda exam: figures.fit_figure(exam.chosen, exam["y ~ x"]),
    "left": lambda exam: figures.left_figure(exam.chosen, exam["y ~ x"]),
    "spans": figures.spans_figure,
    "ladder": figures.ladder_figure,
}
EVERY = pytest.mark.parametrize("make", MAKERS.values(), ids=MAKERS.keys())

#: settings that make other figures unreadable; usetex would need a TeX that is not there
WILD = {
    "text.usetex": True, "text.parse_math": True, "font.size": 30, "font.family": "serif", "font.weight": "bold",
    "text.color": "red", "axes.facecolor": "black", "figure.facecolor": "black", "savefig.facecolor": "red",
    "savefig.bbox": "tight", "axes.grid": True, "grid.linewidth": 5, "lines.linewidth": 9, "lines.marker": "s",
    "lines.linestyle": ":", "lines.antialiased": False, "lines.solid_capstyle": "round", "markers.fillstyle": "none",
    "patch.force_edgecolor": True, "patch.antialiased": False, "xtick.labelsize": 30, "xtick.minor.visible": True,
    "xtick.direction": "in", "xtick.top": True, "xtick.alignment": "left", "ytick.right": True,
    "axes.spines.left": False, "axes.linewidth": 6, "path.sketch": (1, 100, 2), "axes.xmargin": 0.4,
    "axes.formatter.use_mathtext": True, "axes.autolimit_mode": "round_numbers", "figure.dpi": 37,
    "figure.autolayout": True, "axes.prop_cycle": mpl.cycler(color=["lime"]),
}  # fmt: skip


@EVERY
def test_a_figure_is_a_matplotlib_figure_on_its_own_canvas(make: Callable[[Examination], Figure]) -> None:
    made = make(examined("fan", 40, *QUICK))
    assert isinstance(made, Figure)
    assert isinstance(made.canvas, FigureCanvasAgg)
    assert made.canvas.manager is None  # pyplot's figures have one


@EVERY
def test_the_users_settings_do_not_reach_a_figure_and_stay_as_they_were(make: Callable[[Examination], Figure]) -> None:
    exam = examined("fan", 40, *QUICK)
    plain = figures.to_png(make(exam))
    with mpl.rc_context(WILD):
        before = dict(mpl.rcParams)
        wild = figures.to_png(make(exam))
        assert dict(mpl.rcParams) == before
    assert wild == plain


def test_no_figure_loads_pyplot() -> None:
    code = (
        "import sys, numpy as np, pandas as pd, batten\n"
        "x = np.linspace(1, 9, 40)\n"
        "frame = pd.DataFrame({'x': x, 'y': np.exp(x / 4) + np.sin(7 * x) / 9})\n"
        "exam = batten.examine('y ~ x', frame, only=['y ~ x', 'log y ~ x'])\n"
        "from batten.report import figures as f\n"
        "from batten.report.page import page\n"
        "page(exam)\n"
        "assert 'matplotlib' in sys.modules\n"
        "sys.exit('matplotlib.pyplot' in sys.modules)\n"
    )
    # no display, as on a server
    run = [sys.executable, "-c", code]
    done = subprocess.run(run, env={"PATH": ""}, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


@EVERY
def test_names_that_look_like_mathematics_or_markup_are_drawn_without_a_warning(
    make: Callable[[Examination], Figure],
) -> None:
    """Warnings are errors here: a missing glyph or a broken formula would raise."""
    assert len(figures.to_png(make(examined("hostile", 60, *QUICK)))) > 20_000


@EVERY
def test_no_words_leave_the_sheet(make: Callable[[Examination], Figure]) -> None:
    for name in ("hostile", "bowl"):
        made = make(examined(name, 60, *QUICK))
        renderer = made.canvas.get_renderer()  # type: ignore[attr-defined]
        made.draw(renderer)
        whole = made.bbox
        for text in made.findobj(mpl.text.Text):
            if text.get_text() and text.get_visible():
                box = text.get_window_extent(renderer)
                assert box.x0 >= whole.x0 - 1, text.get_text()
                assert box.x1 <= whole.x1 + 1, text.get_text()
                assert box.y0 >= whole.y0 - 1, text.get_text()
                assert box.y1 <= whole.y1 + 1, text.get_text()


def test_the_picture_is_opaque_and_as_large_as_asked() -> None:
    made = figures.line_against_choice(examined("fan", 40, *QUICK))
    image = Image.open(io.BytesIO(figures.to_png(made, dpi=100)))
    assert image.mode == "RGB"
    assert image.size == tuple(round(float(side) * 100) for side in made.get_size_inches())
    assert image.getpixel((0, 0)) == (255, 255, 255)


def test_a_figure_in_a_page_is_one_img_with_its_words() -> None:
    made = figures.line_against_choice(examined("hostile", 60, *QUICK))
    tag = figures.img_html(made, width=500)
    assert tag.startswith('<img src="data:image/png;base64,')
    assert tag.endswith('" width="500">')
    alt = tag.partition('alt="')[2].partition('"')[0]
    assert len(alt) > 100
    assert "<" not in alt
    assert figures.img_html(made, 'a "b"').count("&quot;") == 2


def test_the_first_figure_says_the_line_and_the_choice_at_both_ends_of_the_span() -> None:
    exam = examined("bowl", 40, *QUICK)
    fit, line = exam.chosen, exam["y ~ x"]
    words = figures.describe(figures.line_against_choice(exam))
    assert fit.words in words
    effect = fit.span_effect()
    for end in (effect.at_a, effect.at_b):
        assert f"{end.estimate:.2f} mm/s" in words
    ends = line.span_effect()
    assert f"{ends.at_a.estimate:.2f} mm/s and {ends.at_b.estimate:.2f} mm/s" in words
    assert "40 rows as points" in words


def test_when_the_line_is_the_choice_it_stands_beside_the_flexible_curve() -> None:
    exam = examined("bowl", 40, "y ~ x")
    made = figures.line_against_choice(exam)
    drawn = [text.get_text().replace("\n", " ") for text in made.findobj(mpl.text.Text)]
    assert "straight line" in drawn
    assert "the choice" in drawn
    assert "flexible curve" in drawn


def test_beyond_the_data_a_curve_is_dotted_on_darker_ground() -> None:
    exam = examined("bowl", 40, "y ~ x", "y ~ poly2 x")
    ax = figures.line_against_choice(exam).axes[0]
    x = exam.problem.rows.x
    curves = [line for line in ax.get_lines() if len(line.get_xdata()) > 1 and line.get_linewidth() > 1.2]
    beyond = [line for line in curves if np.nanmin(line.get_xdata()) >= x.max() and len(line.get_xdata()) > 1]
    inside = [line for line in curves if line not in beyond and np.nanmax(line.get_xdata()) > x.max()]
    assert beyond
    assert not inside
    assert all(line.is_dashed() for line in beyond)
    grounds = [patch for patch in ax.patches if patch.get_x() >= x.max() - 1e-9]
    assert len(grounds) == 1


def test_many_rows_are_thinned_the_same_way_every_time_and_the_figure_says_so() -> None:
    exam = examined("plateau", 3000, "y ~ x", "y ~ poly2 x")
    made = figures.line_against_choice(exam)
    assert "2,000 of 3,000 rows drawn" in figures.describe(made)
    points = next(line for line in made.axes[0].get_lines() if len(line.get_xdata()) == 2000)
    x = np.sort(np.asarray(points.get_xdata(), dtype=float))
    rows = np.sort(exam.problem.rows.x)
    assert (x[0], x[-1]) == (rows[0], rows[-1])
    # an even choice keeps the quartiles
    np.testing.assert_allclose(np.quantile(x, [0.25, 0.5, 0.75]), np.quantile(rows, [0.25, 0.5, 0.75]), rtol=0.01)
    assert figures.to_png(figures.line_against_choice(exam)) == figures.to_png(made)
    assert "drawn" not in figures.describe(figures.line_against_choice(examined("fan", 40, *QUICK)))


def test_residuals_are_drawn_on_the_scale_of_the_fit_and_named() -> None:
    exam = examined("fan", 40, *QUICK)
    made = figures.left_figure(exam["log y ~ log x"], exam["y ~ x"])
    left, right = made.axes
    for ax, fit in ((left, exam["y ~ x"]), (right, exam["log y ~ log x"])):
        points = next(line for line in ax.get_lines() if len(line.get_xdata()) == 40)
        np.testing.assert_allclose(np.sort(points.get_ydata()), np.sort(fit.estimate.residual))
    words = [text.get_text() for text in made.findobj(mpl.text.Text)]
    assert "minutes: observed less fitted (min)" in words
    assert "log of minutes: observed less fitted" in words


def test_residuals_of_a_mean_model_are_drawn_in_expected_spreads() -> None:
    fit = examined("fan", 40, *QUICK)["loglink y ~ x"]
    ax = figures.left_figure(fit).axes[0]
    points = next(line for line in ax.get_lines() if len(line.get_xdata()) == 40)
    # Pearson residuals over the square root of the dispersion have a mean square of df / n
    assert np.mean(np.square(points.get_ydata())) == pytest.approx(fit.df_residual / 40)


def test_the_guide_is_the_median_of_neighbours() -> None:
    x = np.arange(28.0)[::-1]
    places, middle = running_median(x, 3 * x)
    # windows of int(28^0.65) = 8, each 4 rows further
    np.testing.assert_allclose(places, [3.5, 7.5, 11.5, 15.5, 19.5, 23.5])
    np.testing.assert_allclose(middle, 3 * places)
    one_wild = np.where(x == 5, 1e6, 3 * x)
    assert np.abs(running_median(x, one_wild)[1] - middle).max() < 4


def test_the_spans_figure_has_an_interval_for_every_remedy_that_has_an_answer() -> None:
    exam = examined("fan", 40, *QUICK)
    table = exam.table()
    made = figures.spans_figure(exam)
    ax = made.axes[0]
    points = [line for line in ax.get_lines() if line.get_marker() == "o"]
    drawn = {float(x) for line in points for x in line.get_xdata()}
    low, high = ax.get_xlim()
    wanted = {float(v) for v in table["difference"].dropna() if low <= v <= high}
    assert drawn == wanted
    filled = sum(len(line.get_xdata()) for line in points if line.get_markerfacecolor() != "#ffffff")
    assert filled == int((table["tied"] & table["difference"].between(low, high)).sum())
    assert f"{len(exam.refused)} that cannot be used" in figures.describe(made)


def test_the_map_gives_every_cell_a_number_or_says_that_it_cannot_be_used() -> None:
    exam = examined("fan", 40, "ladder")
    made = figures.ladder_figure(exam)
    words = [text.get_text() for text in made.findobj(mpl.text.Text)]
    keys = [key for key in exam if exam[key].remedy.family in ("ladder", "powers") and "weighted" not in key]
    numbers = [w for w in words if w == "0" or w.startswith("+")]
    assert len(numbers) == len(keys)
    assert words.count("cannot be used") + len(numbers) + words.count("not tried") == 20
    frames = [patch for patch in made.axes[0].patches if patch.get_linewidth() > 1]
    assert len(frames) == (exam.choice.key in keys)


@pytest.mark.parametrize(
    ("low", "high", "places"),
    [
        (0.0, 10.0, [0, 2, 4, 6, 8, 10]), (-0.31, 0.29, [-0.3, -0.2, -0.1, 0, 0.1, 0.2]),
        (1950, 2023, [1960, 1980, 2000, 2020]),
    ],
)  # fmt: skip
def test_ticks_stand_at_round_places(low: float, high: float, places: list[float]) -> None:
    np.testing.assert_allclose(round_places(low, high, most=6), places, atol=1e-12)
