"""The widget of %%batten in JupyterLab and in Notebook: what a person sees, clicks, types, inserts and runs."""

from __future__ import annotations

import re

from front_end import FrontEnd
from playwright.sync_api import Locator, expect

LOAD = "%load_ext batten\nimport batten\ncastings, pumps = batten.sample('castings'), batten.sample('pumps')"
#: fewer remedies and one repeat, so that the wait is for the page
QUICK = "--only ladder --only polynomials --only splines --folds 5 --repeats 1"
CASTINGS = f"%%batten castings {QUICK} --units minutes=min --units mass_kg=kg\nminutes ~ mass_kg + C(alloy)"
PUMPS = f"%%batten pumps {QUICK}\nenergy ~ flow + C(pump)"
INTERVAL = r"by ([\d.,]+) min \(95% interval ([\d.,]+) to ([\d.,]+) min\)"


def widget(front_end: FrontEnd, cell: int) -> Locator:
    return front_end.cell(cell).locator(".batten-widget")


def seen(front_end: FrontEnd, cell: int, text: str | re.Pattern[str]) -> str:
    """Wait until a text is on screen in a widget; return all that is."""
    expect(widget(front_end, cell).get_by_text(text).locator("visible=true").first).to_be_visible()
    return widget(front_end, cell).inner_text()


def open_tab(front_end: FrontEnd, cell: int, name: str) -> None:
    """Click the tab whose title begins with a role: one remedy can have several."""
    tab = front_end.outputs(cell).get_by_role("tab", name=re.compile(rf"^{name}"))
    tab.click()
    expect(tab).to_have_attribute("aria-selected", "true")


def type_into(front_end: FrontEnd, cell: int, label: str, text: str) -> None:
    field = widget(front_end, cell).get_by_label(label, exact=True).locator("visible=true")
    field.fill(text)
    field.press("Enter")


def press(control: Locator, *keys: str) -> None:
    """Use a control without the mouse."""
    control.focus()
    for key in keys:
        control.page.keyboard.press(key)


def same(one: str, other: str) -> bool:
    """Whether two texts can be roundings of one number, each to its own digits."""
    units = [10.0 ** -len(text.partition(".")[2]) for text in (one, other)]
    return abs(float(one) - float(other)) <= sum(units) / 2


def test_from_the_cell_to_the_effect_to_code_that_says_the_same(front_end: FrontEnd) -> None:
    front_end.open([LOAD, CASTINGS, "'after'"]).run_all()
    screen = seen(front_end, 1, re.compile("^The straight line bends, and it matters"))
    assert "235 of 240 rows used, 5 left out" in screen
    expect(front_end.cell(1).locator("[class^=batten-static-]")).to_be_hidden()
    first = re.search(INTERVAL, screen)
    assert first

    open_tab(front_end, 1, "choice")
    front_end.click_button("effect", cell=1)
    seen(front_end, 1, "slope over the span, min per kg")
    type_into(front_end, 1, "Span: mass_kg from", "10")
    screen = seen(front_end, 1, re.compile(r"Rows with mass_kg of 30 kg against rows with mass_kg of 10 kg"))
    told = re.search(INTERVAL, screen)
    assert told
    assert told[1] != first[1]

    front_end.click_button("code", cell=1)
    seen(front_end, 1, re.compile(r"SPAN = \(10\.0, 30\.0\)"))
    front_end.click_button("Put into a new cell", cell=1)
    cells = front_end.wait_for_cells(4)
    code = cells[2].source
    assert [cell.source for cell in cells] == [LOAD, CASTINGS, code, "'after'"]
    assert code == widget(front_end, 1).locator("pre").text_content()

    front_end.wait_until_active(2, mode="command")
    front_end.press("Shift+Enter")
    front_end.wait_for_text("mean at mass_kg 30 kg against 10", cell=2)
    line = r"mean at mass_kg 30 kg against 10: \+([\d.]+) min \(95% ([\d.]+) to ([\d.]+)\)"
    printed = re.search(line, front_end.output_text(2))
    assert printed
    assert all(same(*pair) for pair in zip(printed.groups(), told.groups(), strict=True))

    front_end.activate(2)
    front_end.undo()
    assert [cell.source for cell in front_end.wait_for_cells(3)] == [LOAD, CASTINGS, "'after'"]


def test_two_widgets_answer_each_for_itself_by_keyboard_too(front_end: FrontEnd) -> None:
    front_end.open([LOAD, CASTINGS, PUMPS]).run_all()
    seen(front_end, 1, re.compile("Choice: log of minutes on log of mass_kg"))
    seen(front_end, 2, re.compile("Choice: quadratic in flow"))
    press(front_end.button("prediction", cell=2), "Space")
    for cell, aim in ((2, "prediction"), (1, "effect")):
        press(front_end.button("how this was computed", cell=cell), "Enter")
        seen(front_end, cell, re.compile(rf"\(aim: {aim}\)"))

    tabs = front_end.outputs(2).get_by_role("tab").locator("visible=true")
    press(tabs.first, "ArrowRight", "Enter")
    expect(tabs.nth(1)).to_have_attribute("aria-selected", "true")
    press(front_end.button("try a value", cell=2), "Space")
    seen(front_end, 2, "one new row like this")
    type_into(front_end, 2, "flow", "8o")
    seen(front_end, 2, "flow needs a number. Typed: '8o'. Type one finite number, such as 12.5.")
    expect(widget(front_end, 2).get_by_label("flow", exact=True).locator("visible=true")).to_have_value("8o")
    type_into(front_end, 2, "flow", "500")
    seen(front_end, 2, re.compile("^Outside the data: flow 500 is beyond"))

    type_into(front_end, 1, "Open another remedy", "y ~ poly4 x")
    open_tab(front_end, 1, "y ~ poly4 x")
    seen(front_end, 1, re.compile("^Rows with mass_kg of 30 kg against"))
    front_end.click_button("try a value", cell=1)
    front_end.click_button("Table at round values", cell=1)
    seen(front_end, 1, re.compile("^Low and high: where 95% of new rows are expected"))
    press(front_end.button("Close this tab", cell=1), "Space")
    expect(front_end.outputs(1).get_by_role("tab", name="y ~ poly4 x")).to_have_count(0)
    assert front_end.sources() == [LOAD, CASTINGS, PUMPS]  # no key has reached the notebook


def test_it_works_after_a_restart_and_another_run_leaves_no_models_behind(front_end: FrontEnd) -> None:
    count = "from ipywidgets.widgets import widget\nprint('models:', len(widget._instances))"
    front_end.open([LOAD, CASTINGS, count])
    front_end.restart_and_run_all()
    seen(front_end, 1, re.compile("^The straight line bends"))
    models = front_end.output_text(2)
    assert re.search(r"models: \d\d", models)

    for cell in (1, 2):
        front_end.run_cell(cell)
    assert front_end.output_text(2) == models
    expect(widget(front_end, 1)).to_have_count(1)
    open_tab(front_end, 1, "straight line")
    seen(front_end, 1, re.compile("^Rows with mass_kg of 30 kg against"))


def test_a_hostile_column_name_is_only_text(front_end: FrontEnd) -> None:
    trap = "<img src=x onerror=window.ran=1>"
    rename = f"castings = castings.rename(columns={{'mass_kg': {trap!r}}}); castings['alloy'] += {trap!r}"
    cell = f"%%batten castings --only polynomials --folds 5 --repeats 1\nminutes ~ Q({trap!r}) + C(alloy)"
    front_end.open([LOAD + "\n" + rename, cell]).run_all()
    seen(front_end, 1, re.compile("^The straight line"))
    for name in ("all tried", "how this was computed"):
        front_end.click_button(name, cell=1)
    open_tab(front_end, 1, "straight line")
    for name in ("what is left", "effect", "try a value", "code", "how this was computed"):
        front_end.click_button(name, cell=1)
    seen(front_end, 1, re.compile("^Computed with batten"))
    type_into(front_end, 1, "Open another remedy", f"{trap} ~ x")
    seen(front_end, 1, re.compile("is not a known form of the response"))
    assert front_end.page.evaluate("() => window.ran") is None
