"""The widget without a page: what is drawn when, what a change reaches, what an error says."""

from __future__ import annotations

import gc
import re
import threading
import weakref
from collections.abc import Callable, Iterator
from typing import Any

import ipywidgets
import pandas as pd
import pytest
from ipywidgets import HTMLMath
from widget_reading import agreeing, all_html, parts_of, placeholder, printed, tags, walk, words

import batten
from batten.errors import InputError
from batten.exam import Examination
from batten.notebook import open_widgets
from batten.notebook.panels import desk, remedy_panels
from batten.notebook.widget import ExamWidget, widget_for
from batten.report.figures import describe
from batten.report.markup import esc

FORMULA = "energy ~ flow + C(pump)"
FIT, LEFT, EFFECT, TRY, CODE, HOW = range(6)


@pytest.fixture(scope="module")
def pumps() -> Examination:
    """A bowl, whose remedies are told in a few seconds."""
    units = {"energy": "kWh/m3", "flow": "m3/h"}
    return batten.examine(
        FORMULA, batten.sample("pumps").iloc[::2], only=["ladder", "polynomials", "splines"], folds=5, repeats=1,
        units=units, frame_name="pumps",
    )  # fmt: skip


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Figures are made, and not turned into pictures."""
    monkeypatch.setattr(desk, "img_html", lambda picture: f'<img src="" alt="{esc(describe(picture))}">')


@pytest.fixture
def shown(pumps: Examination, quick: None) -> Iterator[ExamWidget]:
    box = widget_for(pumps, cell_id=None, token="batten-static-1")
    yield parts_of(box)
    box.close()


def show_panel(shown: ExamWidget, key: str, panel: int) -> Any:
    """Open a remedy's tab and one of its panels, and return that panel."""
    shown.tabs.selected_index = 1 + shown.keys.index(key)
    pages = shown.remedies[key].pages
    pages.buttons.index = panel
    return pages.panels[panel]


# --- what is there at first -------------------------------------------------------------------------------------------


def test_the_first_screen_has_a_verdict_a_figure_a_sentence_and_at_most_five_remedies(pumps: Examination) -> None:
    box = widget_for(pumps, cell_id=None, token="t")
    shown = parts_of(box)
    head = words(shown.head)
    assert head.startswith("The straight line bends, and it matters (")
    assert f"{FORMULA} on pumps" in head
    first = shown.compare.first
    (image,) = [attributes for tag, attributes in tags("\n".join(all_html(first.box))) if tag == "img"]
    assert str(image["src"]).startswith("data:image/png;base64,")
    assert str(image["alt"]).startswith("energy (kWh/m3) against flow (m3/h): ")
    said = words(first.box)
    assert str(pumps.chosen.sentences()[0]) in said
    rows = [line for line in words(first.table).split("\n") if " ~ " in line]
    assert 2 <= len(rows) <= 5
    assert [key in row for key, row in zip(shown.keys, rows, strict=True)] == [True] * len(rows)
    box.close()


def test_rows_left_out_are_named_with_their_reason(shown: ExamWidget, pumps: Examination) -> None:
    head = words(shown.head)
    lost = pumps.problem.left_out
    assert len(lost) > 0
    used = pumps.problem.rows.count
    assert f"{used} of {used + len(lost)} rows used, {len(lost)} left out" in head
    for label, why in lost["why"].items():
        assert re.search(rf"{why}: rows? (\d+, )*{label}\b", head)


def test_tabs_are_the_roles_and_each_remedy_has_one(shown: ExamWidget, pumps: Examination) -> None:
    assert shown.tabs.titles[0] == "compare"
    assert shown.tabs.titles[1] == "straight line"
    assert any("choice" in title for title in shown.tabs.titles)
    assert len(set(shown.keys)) == len(shown.keys) == len(shown.tabs.children) - 1


def test_only_what_is_seen_is_drawn_and_only_once(shown: ExamWidget, monkeypatch: pytest.MonkeyPatch) -> None:
    drawn: list[str] = []
    draw = remedy_panels.fit_figure

    def counted(fit: Any, straight: Any = None, **more: Any) -> Any:
        drawn.append(fit.key)
        return draw(fit, straight, **more)

    monkeypatch.setattr(remedy_panels, "fit_figure", counted)
    assert all(placeholder(tab.box) for tab in shown.remedies.values())
    assert [placeholder(panel.box) for panel in shown.compare.pages.panels] == [False] + 5 * [True]
    for index in (1, 2, 1, 0, 1):
        shown.tabs.selected_index = index
    assert drawn == list(shown.keys[:2])
    first = shown.remedies[shown.keys[0]].pages
    assert [placeholder(panel.box) for panel in first.panels] == [False, True, True, True, True, True]


def test_of_quick_switches_only_the_last_is_drawn(shown: ExamWidget) -> None:
    def select(index: int) -> None:
        shown.tabs.selected_index = index

    with shown.desk.lock:  # the kernel is busy drawing
        threads = [threading.Thread(target=select, args=(index,)) for index in (1, 2, 3)]
        for index, thread in enumerate(threads, start=1):
            thread.start()
            while shown.tabs.selected_index != index:
                pass
    for thread in threads:
        thread.join()
    assert [placeholder(shown.remedies[key].heading) for key in shown.keys[:3]] == [True, True, False]


def test_a_panel_switches_in_the_page_without_the_kernel(shown: ExamWidget) -> None:
    pages = shown.compare.pages
    links = [link for link in shown.desk.loose if link.source[0] is pages.buttons]
    assert [(link.source[1], link.target[0] is pages.stack, link.target[1]) for link in links] == [
        ("index", True, "selected_index")
    ]


# --- the question -----------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def house() -> Examination:
    """A plateau and a small tolerance: the aims choose differently."""
    return batten.examine('yield_kg ~ Q("daily light")', batten.sample("glasshouse"), tolerance=0.05, repeats=1)


def test_another_aim_chooses_again_from_the_same_fits(house: Examination, quick: None) -> None:
    other = house.with_aim("prediction")
    assert other.choice.key != house.choice.key
    box = widget_for(house, cell_id=None, token="batten-static-2")
    shown = parts_of(box)
    first = shown.compare.first
    first.aim.value = "prediction"
    assert shown.desk.exam.choice.key == other.choice.key
    assert all(shown.desk.exam[key].estimate is house[key].estimate for key in house)
    assert f"Choice: {other.chosen.words}." in words(shown.head)
    (row,) = re.findall(r'<tr class="batten-choice">.*?</tr>', first.table.value)
    assert other.choice.key in re.split(r"<.*?>", row)
    assert "choice" in shown.tabs.titles[1 + shown.keys.index(other.choice.key)]
    first.aim.value = "effect"
    assert f"Choice: {house.chosen.words}." in words(shown.head)
    box.close()


def test_another_span_reaches_every_part_that_tells_it(shown: ExamWidget, pumps: Examination) -> None:
    key = pumps.choice.key
    effect, code = show_panel(shown, key, EFFECT), show_panel(shown, key, CODE)
    show_panel(shown, key, EFFECT)
    shown.span.low.text.value, shown.span.high.text.value = "60.5", "90"
    asked = pumps.with_span(60.5, 90.0)
    sentence = str(asked[key].sentences()[0])
    assert "60.5 m3/h" in sentence
    assert sentence in words(effect.box)
    show_panel(shown, key, CODE)
    assert "SPAN = (60.5, 90.0)" in words(code.box)
    shown.tabs.selected_index = 0
    assert sentence in words(shown.compare.first.box)
    shown.span.back.click()
    assert shown.desk.exam.question.span == pumps.question.span
    assert str(pumps[key].sentences()[0]) in words(shown.compare.first.box)


@pytest.mark.parametrize(
    ("typed", "said"),
    [
        ("sixty", "flow needs a number. Typed: 'sixty'. Type one finite number, such as 12.5."),
        ("60,5", "flow needs a number. Typed: '60,5'. Write 60.5 with a point."),
        ("", "flow needs a number. The field is empty. Type one, such as 12.5."),
        ("1e9", "The span needs two different values, the lower one first."),
    ],
)
def test_a_span_that_cannot_be_read_is_told_in_a_line_and_nothing_is_lost(
    shown: ExamWidget, pumps: Examination, typed: str, said: str
) -> None:
    first = shown.compare.first
    before = first.picture.value, first.table.value
    shown.span.low.text.value = typed
    assert words(shown.span.message.box).startswith(said)
    assert "\n" not in words(shown.span.message.box)
    assert shown.span.low.text.value == typed
    assert shown.desk.exam is pumps
    assert (first.picture.value, first.table.value) == before
    shown.span.low.text.value = "60"
    assert words(shown.span.message.box) == ""


# --- try a value ------------------------------------------------------------------------------------------------------


def test_a_typed_row_gets_the_fits_own_predictions(shown: ExamWidget, pumps: Examination) -> None:
    panel = show_panel(shown, pumps.choice.key, TRY)
    flow, pump = panel.fields
    flow.text.value, pump.choice.index = "81.5", 2
    row, fit = panel.row(), pumps.chosen
    assert row.to_dict("records") == [{"flow": 81.5, "pump": "south 1"}]
    said = words(panel.shown)
    for of in ("mean", "median"):
        value, low, high = fit.predict(row, of=of, interval="estimate").iloc[0][["estimate", "low", "high"]]
        assert printed(rf"^{of} (\S+) (\S+) to (\S+)$", said) == agreeing(value, low, high)
    new = fit.predict(row, interval="new row").iloc[0]
    assert printed(r"^one new row like this (\S+) to (\S+)$", said) == agreeing(new["low"], new["high"])


def test_beyond_the_data_a_typed_row_says_so(shown: ExamWidget, pumps: Examination) -> None:
    panel = show_panel(shown, pumps.choice.key, TRY)
    panel.fields[0].text.value = "500"
    assert "Outside the data: flow 500 is beyond" in words(panel.shown)


def test_bad_input_keeps_the_text_and_the_last_answer(shown: ExamWidget, pumps: Examination) -> None:
    panel = show_panel(shown, pumps.choice.key, TRY)
    answer = panel.shown.value
    panel.fields[0].text.value = "8o"
    assert words(panel.message.box) == "flow needs a number. Typed: '8o'. Type one finite number, such as 12.5."
    assert (panel.fields[0].text.value, panel.shown.value) == ("8o", answer)
    panel.fields[0].text.value = "80"
    assert words(panel.message.box) == ""


def test_the_same_asked_backwards_is_the_fits_own_answer(shown: ExamWidget, pumps: Examination) -> None:
    panel = show_panel(shown, pumps.choice.key, TRY)
    panel.wanted.value = "0.45"
    assert words(panel.reached) == f"flow: {pumps.chosen.x_for(0.45).reading}."
    panel.wanted.value = "much"
    assert words(panel.backwards.box).startswith("energy needs a number. Typed: 'much'.")
    assert panel.wanted.value == "much"


def test_the_table_at_round_values_is_the_fits_own_and_goes_again(shown: ExamWidget, pumps: Examination) -> None:
    panel = show_panel(shown, pumps.choice.key, TRY)
    assert words(panel.table) == ""
    panel.several.value = True
    lines = words(panel.table).split("\n")
    assert lines[0] == "flow, m3/h mean, kWh/m3 median, kWh/m3 low, kWh/m3 high, kWh/m3"
    wanted = pumps.lookup()
    assert [line.split()[0] for line in lines[1 : 1 + len(wanted)]] == [f"{x:g}" for x in wanted.index]
    assert lines[1].split()[1:] == list(agreeing(*wanted.iloc[0][["mean", "median", "low", "high"]]))
    assert lines[-1] == "Low and high: where 95% of new rows are expected, covariates as in the rows."
    panel.several.value = False
    assert words(panel.table) == ""


def test_where_the_predictor_holds_dates_the_span_is_typed_and_told_as_dates(quick: None) -> None:
    frame = batten.sample("glasshouse")
    exam = batten.examine("yield_kg ~ harvested", frame, only=["y ~ x", "y ~ poly2 x"], folds=4, repeats=1)
    start, (a, b) = pd.Timestamp(frame["harvested"].min()), exam.question.span
    box = widget_for(exam, cell_id=None, token="t")
    parts = parts_of(box)
    low, high = parts.span.low, parts.span.high
    days = [str((start + pd.Timedelta(days=end)).date()) for end in (a, b)]
    assert [low.text.value, high.text.value] == days
    assert f"harvested counts days from {start.date()}: {a:g} is {days[0]}, {b:g} is {days[1]}." in words(box)
    low.text.value = str((start + pd.Timedelta(days=a - 3)).date())
    assert parts.desk.exam.question.span == (a - 3, b)
    low.text.value = "soon"
    assert words(parts.span.message.box).startswith("harvested needs a date.")
    assert parts.desk.exam.question.span == (a - 3, b)
    parts.span.back.click()
    assert low.text.value == days[0]
    box.close()


# --- any other remedy -------------------------------------------------------------------------------------------------


def test_the_picker_opens_a_remedy_of_the_list_as_its_own_tab(shown: ExamWidget, pumps: Examination) -> None:
    field = shown.picker.field
    wanted = next(option for option in field.options if option.startswith("sqrt y ~ log x "))
    assert "square root of energy on log of flow" in wanted
    field.value = wanted
    assert shown.tabs.titles[-1] == "sqrt y ~ log x"
    assert shown.tabs.selected_index == len(shown.tabs.children) - 1
    assert not placeholder(shown.remedies["sqrt y ~ log x"].pages.panels[FIT].box)
    assert field.value == ""
    assert wanted not in field.options
    assert shown.desk.exam is pumps


def test_the_picker_fits_a_typed_key_on_the_same_rows_and_counts_it(shown: ExamWidget, pumps: Examination) -> None:
    shown.picker.field.value = "y~poly6 x"
    assert shown.tabs.titles[-1] == "y ~ poly6 x"
    assert len(shown.desk.exam) == len(pumps) + 1
    shown.tabs.selected_index = 0
    shown.compare.pages.buttons.index = 3
    assert f"All {len(pumps) + 1} tried" in words(shown.compare.pages.panels[3].box)


@pytest.mark.parametrize(
    ("typed", "said"),
    [
        ("y ~ splin4 x", "'splin4 x' is not a known form of the predictor in a remedy's key."),
        ("anything", "A remedy's key has two sides with one '~' between them."),
        ("logit(0,0.2) y ~ x", "logit(0, 0.2) y ~ x cannot be used on these rows."),
    ],
)
def test_a_remedy_that_cannot_be_opened_says_why_and_the_text_stays(
    shown: ExamWidget, pumps: Examination, typed: str, said: str
) -> None:
    titles = shown.tabs.titles
    shown.picker.field.value = typed
    for _ in range(2):
        assert words(shown.picker.message.box).startswith(said)
        shown.picker.button.click()
    assert shown.picker.field.value == typed
    assert shown.tabs.titles == titles
    assert shown.desk.exam is pumps


def test_the_picker_asks_for_a_name_where_none_is_typed(shown: ExamWidget) -> None:
    shown.picker.button.click()
    assert words(shown.picker.message.box) == (
        "No remedy is named. The field is empty. Choose one from the list, or type a key such as y ~ poly4 x."
    )


def test_an_opened_remedy_keeps_its_tab_under_another_aim(shown: ExamWidget) -> None:
    shown.picker.field.value = "log y ~ x"
    shown.compare.first.aim.value = "prediction"
    assert shown.keys.count("log y ~ x") == 1
    assert shown.tabs.children[shown.tabs.selected_index] is shown.remedies["log y ~ x"].box


def test_an_opened_tab_can_be_closed_and_opened_again(shown: ExamWidget, pumps: Examination) -> None:
    shown.picker.field.value = "y ~ poly4 x"
    shown.picker.field.value = "log y ~ x"
    first, last = shown.remedies["y ~ poly4 x"], shown.remedies["log y ~ x"]
    shown.tabs.selected_index = 1 + shown.keys.index("y ~ poly4 x")
    before = shown.tabs.titles
    first.shut_button.click()
    assert shown.tabs.titles == tuple(title for title in before if title != "y ~ poly4 x")
    assert shown.tabs.selected_index == len(before) - 3
    assert any(option.startswith("y ~ poly4 x ") for option in shown.picker.field.options)
    assert "y ~ poly4 x" in shown.desk.exam  # it stays among those tried
    last.shut_button.click()
    assert shown.tabs.titles == before[:-2]
    shown.picker.field.value = "y ~ poly4 x"
    assert shown.tabs.titles == before[:-1]
    assert not placeholder(first.heading)


def test_only_tabs_that_were_opened_have_a_button_that_closes_them(shown: ExamWidget, pumps: Examination) -> None:
    shown.picker.field.value = "log y ~ x"
    for index in range(1, len(shown.tabs.children)):
        shown.tabs.selected_index = index
    closable = {key for key, tab in shown.remedies.items() if tab.shut_button.layout.display != "none"}
    assert closable == {"log y ~ x"}
    shown.shut(pumps.choice.key)
    assert pumps.choice.key in shown.keys


def test_whoever_asked_is_told_of_every_change(pumps: Examination, quick: None) -> None:
    told: list[tuple[Examination, Examination]] = []
    box = widget_for(pumps, cell_id=None, token="t", changed=lambda *pair: told.append(pair))
    parts = parts_of(box)
    parts.picker.field.value = "y ~ poly6 x"
    parts.compare.first.aim.value = "prediction"
    parts.span.low.text.value = "61"
    assert [before for before, _ in told] == [pumps, *(after for _, after in told[:-1])]
    assert told[-1][1] is parts.desk.exam
    assert "y ~ poly6 x" in told[0][1]
    box.close()


def test_what_the_picker_refused_is_forgotten_with_the_next_tab(shown: ExamWidget) -> None:
    shown.picker.field.value = "anything"
    assert words(shown.picker.message.box) != ""
    shown.tabs.selected_index = 1
    assert words(shown.picker.message.box) == ""


# --- errors -----------------------------------------------------------------------------------------------------------


def test_a_refusal_in_a_panel_is_one_line_and_the_panel_is_tried_again(
    shown: ExamWidget, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: Any, **__: Any) -> None:
        raise InputError("This is wrong.", "Seen: <b>.", "Do that.")

    with monkeypatch.context() as patch:
        patch.setattr(remedy_panels, "left_figure", refuse)
        show_panel(shown, shown.keys[0], LEFT)
    pages = shown.remedies[shown.keys[0]].pages
    assert words(pages.message.box) == "This is wrong. Seen: <b>. Do that."
    assert "<b>" not in pages.message.box.value
    pages.buttons.index = FIT
    assert words(pages.message.box) == ""
    pages.buttons.index = LEFT
    assert not placeholder(pages.panels[LEFT].box)


def test_a_fault_is_never_swallowed_its_traceback_is_behind_a_click(
    shown: ExamWidget, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_: Any, **__: Any) -> None:
        raise ZeroDivisionError("<script>")

    monkeypatch.setattr(remedy_panels, "fit_figure", fail)
    shown.tabs.selected_index = 1
    message = shown.remedies[shown.keys[0]].pages.message.box
    assert words(message).startswith("Something went wrong here; details")
    assert "ZeroDivisionError: <script>" in words(message)
    assert [tag for tag, _ in tags(message.value)].count("details") == 1
    assert "<script>" not in message.value


# --- life -------------------------------------------------------------------------------------------------------------


def open_models() -> set[str]:
    """Ids of all models that have not been closed."""
    return set(ipywidgets.widgets.widget._instances)


def test_closing_leaves_no_model_behind_and_lets_the_examination_go(pumps: Examination, quick: None) -> None:
    gc.collect()
    before = open_models()
    exam = pumps.with_aim("effect")
    box = widget_for(exam, cell_id=None, token="t")
    parts = parts_of(box)
    for panel in range(6):
        show_panel(parts, parts.keys[1], panel)
    parts.picker.field.value = "log y ~ x"
    alive = weakref.ref(exam)
    box.close()
    assert open_models() <= before
    del parts, box, exam
    gc.collect()
    assert alive() is None


def test_running_a_cell_again_closes_its_former_widgets_only(
    pumps: Examination, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    run = ["first"]
    monkeypatch.setattr(open_widgets, "_run", lambda: run[0])
    one, two = (widget_for(pumps, cell_id="a", token="t") for _ in range(2))
    other = widget_for(pumps, cell_id="b", token="t")
    assert [box.comm is not None for box in (one, two, other)] == [True, True, True]
    run[0] = "second"
    again = widget_for(pumps, cell_id="a", token="t")
    assert [box.comm is not None for box in (one, two, other, again)] == [False, False, True, True]
    for box in (other, again):
        box.close()


def test_a_closed_widgets_callbacks_do_nothing(pumps: Examination, quick: None) -> None:
    box = widget_for(pumps, cell_id=None, token="t")
    tabs, aim = parts_of(box).tabs, parts_of(box).compare.first.aim
    box.close()
    gc.collect()
    tabs.selected_index, aim.value = 1, "prediction"
    assert box.parts is None


def test_callbacks_on_many_threads_end_in_one_consistent_state(shown: ExamWidget, pumps: Examination) -> None:
    aim, span = shown.compare.first.aim, shown.span

    def switch() -> None:
        for index in (1, 2, 0, 3, 2):
            shown.tabs.selected_index = index

    def ask() -> None:
        for value in ("60", "61", "62"):
            span.low.text.value = value

    def choose() -> None:
        for value in ("prediction", "effect", "prediction"):
            aim.value = value

    together([switch, ask, choose])
    exam = shown.desk.exam
    assert (exam.question.aim, exam.question.span[0]) == ("prediction", 62.0)
    assert [box.value for box in (shown.message.box, span.message.box)] == ["", ""]
    shown.tabs.selected_index = 0
    assert str(exam.chosen.sentences()[0]) in words(shown.compare.first.box)


def together(calls: list[Callable[[], None]]) -> None:
    threads = [threading.Thread(target=call) for call in calls]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()


# --- what may not be on screen ----------------------------------------------------------------------------------------


def visit_all(shown: ExamWidget) -> None:
    """Open every tab and every panel."""
    for index in range(6):
        shown.compare.pages.buttons.index = index
    for key in shown.keys:
        for index in range(6):
            show_panel(shown, key, index)


def test_method_names_stay_in_how_this_was_computed_and_cautions_are_few(shown: ExamWidget) -> None:
    visit_all(shown)
    methods = re.compile(r"Duan|smearing|jackknife|HC3|RESET|Koenker|Durbin|Davies|Nadeau|AICc|p[ -]value|significan")
    for pages in (shown.compare.pages, *(tab.pages for tab in shown.remedies.values())):
        for panel in pages.panels:
            if panel.name == "how this was computed":
                assert methods.search(words(panel.box))
            elif panel.name != "code":
                assert methods.search(words(panel.box)) is None, panel.name
    for tab in shown.remedies.values():
        assert tab.cautions.value.count("batten-caution") <= 2
    assert "".join(all_html(shown.compare.first.reasons)).count("batten-caution") <= 2


def test_every_control_can_be_used_and_none_ends_in_a_fault(shown: ExamWidget, pumps: Examination) -> None:
    shown.picker.field.value = "y ~ poly4 x"
    visit_all(shown)
    used = set()
    for control in dict.fromkeys(walk(shown.box)):
        kind = type(control).__name__
        if kind in ("Text", "Combobox"):
            control.value = "66"
        elif kind in ("ToggleButtons", "Dropdown"):
            for index in range(len(control.options)):
                control.index = index
        elif kind == "ToggleButton":
            control.value = not control.value
        elif kind == "Button":
            control.click()
        else:
            assert kind in ("VBox", "HBox", "HTML", "Label", "Stack", "Tab", "ExamBox"), kind
            continue
        used.add(control.description)
    assert {
        "Span: flow from", "to", "Back", "Choose for", "Open another remedy", "Open", "Close this tab", "flow", "pump",
        "Backwards: at which flow (covariates as in the rows) is the mean of energy (kWh/m3)", "Table at round values",
        "Put into a new cell",
    } <= used  # fmt: skip
    assert "Something went wrong" not in "\n".join(all_html(shown.box))


def test_hostile_names_are_text_everywhere() -> None:
    trap = "<img src=x onerror=alert(1)>"
    frame = batten.sample("pumps").iloc[::4].rename(columns={"flow": f"{trap} $\\bad{{$", "pump": "<script>p</script>"})
    frame["<script>p</script>"] = frame["<script>p</script>"] + f"{trap}'\"&"
    formula = f"energy ~ Q({f'{trap} $' + chr(92) + 'bad{$'!r}) + Q('<script>p</script>')"
    exam = batten.examine(formula, frame, only=["polynomials"], folds=4, repeats=1, units={"energy": trap})
    box = widget_for(exam, cell_id=None, token="t")
    parts = parts_of(box)
    visit_all(parts)
    parts.span.low.text.value = trap
    parts.picker.field.value = f"{trap} ~ x"
    show_panel(parts, parts.keys[0], TRY).wanted.value = trap
    html = "\n".join(all_html(box))
    assert html.count("&lt;img src=x") > 20
    for tag, attributes in tags(html):
        assert tag not in ("script", "b")
        assert tag != "img" or str(attributes["src"]).startswith("data:image/png;base64,")
        assert not [name for name in attributes if name.startswith("on") and tag != "button"]
    for control in walk(box):
        assert not isinstance(control, HTMLMath)
    box.close()
