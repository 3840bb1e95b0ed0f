"""History and comparing: the tree of revisions, going on from an old one, and what got worse with its causes."""

from __future__ import annotations

import json
from dataclasses import replace

from textual.pilot import Pilot

from stagebook.storage import Note, Store
from stagebook.tui.history_text import Branch, history_heading, history_rows, tree, trend_cells
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.compare import CompareScreen
from stagebook.tui.screens.history import HistoryScreen, RevisionPage
from stagebook.tui.shown import plain
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList

from .conftest import Gates, corners, flood, seen, settled, shown, until
from .sheets import check, sheet

SIZE = (80, 24)


def branch_off(shelf: Store, gates: Gates) -> None:
    """A third revision beside the second: both come from the first."""
    shelf.branch("flood", 1)
    shelf.edit("flood", "R7 100k", flood(R7="100k"))
    shelf.save("flood", Note("much smaller, given up"), corners(gates, flood(R7="100k")))
    shelf.branch("flood", 2)


async def open_history(pilot: Pilot[None]) -> HistoryScreen:
    await settled(pilot)
    await pilot.press("enter")
    await settled(pilot)
    await pilot.press("h")
    await pilot.pause()
    assert isinstance(pilot.app.screen, HistoryScreen)
    return pilot.app.screen


def test_side_branches_stand_below_the_revision_they_left_from(shelf: Store, gates: Gates) -> None:
    branch_off(shelf, gates)
    found = [(branch.revision.number, branch.depth) for branch in tree(shelf.revisions("flood"), head=2)]
    assert found == [(1, 0), (3, 1), (2, 0)]


def test_a_trend_runs_between_its_own_ends_and_marks_zero() -> None:
    values = [-0.5, 0.0, 0.5]
    assert [trend_cells(value, values, 5) for value in values] == ["o |  ", "  o  ", "  | o"]
    assert trend_cells(None, [None], 3) == "|  "


async def test_history_lists_notes_and_worst_margins(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    branch_off(shelf, gates)
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        first, third, second = shown(pilot)[3:6]
        assert "r1" in first
        assert "first try" in first
        assert "- r3" in third
        assert "X never" in third
        assert "r2 draft" in second
        assert "= +15" in second


async def test_a_revision_is_looked_at_in_full(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        await pilot.press("enter")
        assert isinstance(pilot.app.screen, RevisionPage)
        assert "prediction  shorter" in seen(pilot)
        assert "since r1    R7 470k > 390k" in seen(pilot)
        assert "= +15        of  +10 required  arrival R7               hot, low supply" in seen(pilot)
        await pilot.press("end", "w")
        assert "demand" in seen(pilot)


async def test_two_marked_revisions_are_compared_with_causes(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    branch_off(shelf, gates)
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        await pilot.press("home", "space", "down", "space", "c")
        await until(pilot, lambda: isinstance(pilot.app.screen, CompareScreen))
        await settled(pilot)
        text = seen(pilot)
        assert "r1 | r3" in text
        assert "R7 470k > 100k" in text
        rows = pilot.app.screen.query_one("#checks", RowList).rows
        assert rows[0].key == "overdrive:timer:R7" or "arrival:timer:R7" in rows[0].key
        assert "causes: R7 -" in text


async def test_causes_say_that_they_are_being_computed(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        gates.shut("causes")
        await pilot.press("c")
        await pilot.pause()
        assert "causes: ~" in seen(pilot)
        await pilot.press("b")
        await settled(pilot)
        assert shelf.revision("flood", 2).design.content in gates.cancelled


async def test_six_columns_scroll_at_eighty_cells(app: StagebookApp, shelf: Store, gates: Gates) -> None:
    for value in ("360k", "330k", "300k", "270k"):
        shelf.edit("flood", f"R7 {value}", flood(R7=value))
        shelf.save("flood", Note(f"with {value}"), corners(gates, flood(R7=value)))
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        await pilot.press("home", *["space", "down"] * 5, "space", "c")
        await until(pilot, lambda: isinstance(pilot.app.screen, CompareScreen))
        assert "[r6]" in seen(pilot)
        assert "more columns" in seen(pilot)
        await pilot.press("left")
        await settled(pilot)
        assert "[r5]" in seen(pilot)


async def test_the_draft_goes_on_from_an_old_revision_after_asking(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        await pilot.press("home", "o", "n")
        assert shelf.draft("flood").base_revision == 2
        await pilot.press("o", "y")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        await settled(pilot)
        assert shelf.draft("flood").base_revision == 1
        assert "draft on r1" in seen(pilot)
        assert shelf.draft("flood").design.part("R7").value == "470k"


async def test_a_result_is_added_under_the_note(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        await pilot.press("t", *"73 s", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, HistoryScreen))
        assert shelf.revision("flood", 2).note.result == "73 s"
        assert "result  73 s" in seen(pilot)


async def test_the_trend_is_that_of_the_margin_under_the_hand_and_goes_on_to_the_draft(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("enter", "right", "right", "right", "3", "5", "0", "k", "enter")
        await settled(pilot)
        await pilot.press("h")
        # 1 - 330k/350k, rounded down
        assert "trend of arrival R7, in the draft +5" in shown(pilot)[0]


async def test_left_and_right_choose_the_margin_of_the_trend(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await open_history(pilot)
        before = shown(pilot)[0]
        await pilot.press("right")
        assert shown(pilot)[0] != before
        await pilot.press("left")
        assert shown(pilot)[0] == before


def test_a_wide_screen_names_the_worst_check_in_full(shelf: Store) -> None:
    revision = shelf.revisions("flood")[-1]
    worst = sheet(check("a:latch:Q4", -1.0, title="latch reset", outcome="did not let go"))
    found = replace(revision, margins=json.dumps(worst.as_json()))
    for width, there in ((80, False), (100, True), (120, True)):
        row = plain(history_rows([Branch(found, 0)], (), None, None, width)[0].spans)
        assert ("X fails    latch reset " in row) is there
        heads = plain(history_heading(width))
        assert heads.index("note") == row.index(revision.note.line)
