"""The button "Put into a new cell" does what it says, in JupyterLab and in Notebook."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from front_end import FrontEnd
from playwright.sync_api import expect

PUT = "Put into a new cell"
MAGIC = "%batten code log y ~ x"
# Whatever could be lost, run or misread on its way: a first empty line, markup, quotes, a backslash, Greek.
CODE = "\nμ = '<b>\"&amp;\\\\' + '''</pre><img src=x onerror=\"window.ran = 1\">'''\nprint(μ)"


def panel(code: str = CODE) -> str:
    """Return the source of a cell that shows a code panel."""
    return f"from batten.notebook.code_panel import CodePanel\npanel = CodePanel({code!r}, magic={MAGIC!r})\npanel.box"


def slow_panel(pipe: Path) -> str:
    """Return the source of a cell whose panel gets its code from a pipe, and waits for it."""
    return (
        "from pathlib import Path\n"
        "from batten.notebook.code_panel import CodePanel\n"
        f"panel = CodePanel(Path({str(pipe)!r}).read_text, magic={MAGIC!r})\n"
        "panel.box"
    )


@contextmanager
def slow_press(front_end: FrontEnd, pipe: Path) -> Iterator[None]:
    """Press the slow panel's button in cell 0; its callback comes to its end when the block does."""
    front_end.click_button(PUT, cell=0)
    front_end.wait_for_text("Sending to the page", cell=0)
    yield
    pipe.write_text(CODE)


def test_the_code_goes_right_below_the_widget_and_one_z_takes_it_back(front_end: FrontEnd) -> None:
    front_end.open([panel(), "'after'"]).run_all()
    front_end.activate(1)
    front_end.click_button(PUT)
    front_end.wait_for_text("Inserted below", cell=0)
    assert front_end.sources() == [panel(), CODE, "'after'"]
    front_end.wait_until_active(1, mode="command")
    assert front_end.is_in_view(1)
    assert front_end.page.evaluate("() => window.ran") is None

    front_end.press("z")
    assert [cell.source for cell in front_end.wait_for_cells(2)] == [panel(), "'after'"]


def test_whoever_types_in_another_cell_meanwhile_goes_on_typing_there(front_end: FrontEnd, tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    front_end.open([slow_panel(pipe), "''"]).run_all()
    with slow_press(front_end, pipe):
        front_end.activate(1)
        front_end.press("Enter")
        front_end.page.keyboard.type("mine = 1 ")
    front_end.wait_for_text("Inserted below", cell=0)
    front_end.page.keyboard.type("+ 2")
    assert front_end.sources() == [slow_panel(pipe), CODE, "mine = 1 + 2''"]
    front_end.wait_until_active(2, mode="edit")

    front_end.press("Escape")
    front_end.undo()
    assert [cell.source for cell in front_end.wait_for_cells(2)] == [slow_panel(pipe), "mine = 1 + 2''"]


def test_a_deleted_cell_is_missed_and_nothing_is_inserted(front_end: FrontEnd, tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    front_end.open([slow_panel(pipe), "panel.status", "'after'"]).run_all()
    with slow_press(front_end, pipe):
        front_end.delete_cell(0, wait=False)
        front_end.wait_for_cells(2)
    front_end.wait_for_text("The cell that holds this panel is no longer in the notebook.", cell=0)
    assert front_end.sources() == ["panel.status", "'after'"]


def test_each_widget_is_served_in_its_own_place_also_when_shown_twice_or_moved(front_end: FrontEnd) -> None:
    first, second = panel("1"), panel("2")
    front_end.open([first, second, "panel.box", "'after'"]).run_all()
    for cell, expected in [
        (2, [first, second, "panel.box", "2", "'after'"]),
        (0, [first, "1", second, "panel.box", "2", "'after'"]),
    ]:
        front_end.click_button(PUT, cell=cell)
        front_end.wait_for_text("Inserted below", cell=cell)
        assert front_end.sources() == expected

    front_end.delete_cell(1)
    front_end.move_cell(0, direction="down")
    front_end.click_button(PUT, cell=1)
    assert [cell.source for cell in front_end.wait_for_cells(6)] == [second, first, "1", "panel.box", "2", "'after'"]


def test_a_double_click_inserts_once(front_end: FrontEnd) -> None:
    front_end.open([panel("1"), "'after'"]).run_all()
    front_end.button(PUT).dblclick()
    front_end.wait_for_text("Inserted", cell=0)
    front_end.run_cell(2)  # comes after both clicks in the kernel's queue
    assert front_end.sources() == [panel("1"), "1", "'after'"]


def test_a_second_press_says_so_and_the_next_inserts_again_but_after_an_undo_one_is_enough(front_end: FrontEnd) -> None:
    front_end.open([panel("1")]).run_all()
    for said, expected in [
        ("Inserted below", [panel("1"), "1"]),
        ("Inserted already", [panel("1"), "1"]),
        ("Inserted below", [panel("1"), "1", "1"]),
    ]:
        front_end.click_button(PUT)
        front_end.wait_for_text(said, cell=0)
        assert front_end.sources() == expected

    front_end.undo()
    front_end.wait_for_cells(2)
    front_end.click_button(PUT)
    front_end.wait_for_cells(3)


def test_without_the_plugin_the_code_can_be_copied(front_end: FrontEnd) -> None:
    front_end.without_plugin().open([panel(), "'after'"]).run_all()
    front_end.click_button(PUT)
    front_end.wait_for_text("This page runs without batten's cell inserter.", cell=0)
    front_end.wait_for_text(f"Copy the code, or run {MAGIC} in a cell.", cell=0)
    assert front_end.outputs(0).locator("pre").text_content() == CODE
    front_end.click_button("Copy")
    expect(front_end.button("Copied")).to_be_visible()
    assert front_end.clipboard() == CODE
    expect(front_end.button(PUT)).to_be_enabled()
    assert front_end.sources() == [panel(), "'after'"]


def test_a_page_that_never_answers_is_given_up(front_end: FrontEnd) -> None:
    front_end.with_mute_plugin().open([panel()]).run_all()
    front_end.click_button(PUT)
    front_end.wait_for_text("The page has not answered so far", cell=0)
    expect(front_end.button(PUT)).to_be_enabled()


def test_only_the_tab_that_was_clicked_gets_the_cell(new_tab: Callable[[], FrontEnd]) -> None:
    first = new_tab().open([panel(), "'after'"])
    first.run_all()
    first.save()
    second = new_tab().visit(first.name)
    second.click_button(PUT)
    second.wait_for_text("Inserted below", cell=0)
    assert second.sources() == [panel(), CODE, "'after'"]
    assert first.sources() == [panel(), "'after'"]


def test_it_works_after_a_restart(front_end: FrontEnd) -> None:
    front_end.open([panel(), "'after'"]).run_all()
    front_end.restart_and_run_all()
    front_end.click_button(PUT)
    front_end.wait_for_text("Inserted below", cell=0)
    assert front_end.sources() == [panel(), CODE, "'after'"]


def test_a_running_cell_puts_code_into_the_cell_below_it(front_end: FrontEnd) -> None:
    source = f"from batten.notebook.insertion import put_in_next_cell\nput_in_next_cell({CODE!r})"
    front_end.open([source, "'after'"]).run_cell(0)
    assert [cell.source for cell in front_end.wait_for_cells(3)] == [source, CODE, "'after'"]


def test_plain_keys_belong_to_the_widget_and_escape_leads_back_to_the_cell(front_end: FrontEnd) -> None:
    front_end.open([panel("1")]).run_all()
    front_end.button(PUT).focus()
    front_end.press("b")
    assert front_end.sources() == [panel("1")]
    front_end.press("Enter")
    front_end.wait_for_text("Inserted below", cell=0)
    assert front_end.sources() == [panel("1"), "1"]

    front_end.button(PUT).focus()
    front_end.press("Escape")
    front_end.press("b")
    assert [cell.source for cell in front_end.wait_for_cells(3)] == [panel("1"), "", "1"]
