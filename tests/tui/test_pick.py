"""A list that something is chosen from: what is typed leaves the rows that hold it (the project's own)."""

from __future__ import annotations

import pytest

from stagebook.tui.screens.dialog import Pick
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList

from .conftest import settled

ROWS = [("bat", "battery backup"), ("lamp", "filament lamp"), ("relay", "relay: switches a lamp"), ("lc", "LC filter")]


async def picked(app: StagebookApp, *keys: str) -> tuple[list[list[str]], list[str | None]]:
    """The rows that are shown after each key, and what was chosen in the end."""
    chosen: list[str | None] = []
    shown = []
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        app.push_screen(Pick("which?", ROWS), chosen.append)
        await settled(pilot)
        for key in keys:
            await pilot.press(key)
            await settled(pilot)
            here = app.screen
            shown.append([row.key for row in here.query_one(RowList).rows] if isinstance(here, Pick) else [])
    return shown, chosen


async def test_letters_narrow_the_list_and_enter_takes_what_is_left(app: StagebookApp) -> None:
    shown, chosen = await picked(app, "L", "a", "m", "enter")
    # The row in which it stands further to the left comes first.
    assert shown[2] == ["lamp", "relay"]
    assert chosen == ["lamp"]


async def test_the_hand_goes_to_the_first_that_is_found(app: StagebookApp) -> None:
    # After "l" it stands on the LC filter, which "la" does not leave; "r" finds the word in all, the relay's first.
    assert (await picked(app, "r", "enter"))[1] == ["relay"]


async def test_a_letter_less_and_escape_bring_the_rows_back(app: StagebookApp) -> None:
    shown, chosen = await picked(app, "x", "backspace", "y", "escape", "escape")
    assert shown[0] == []
    assert shown[1] == [key for key, _ in ROWS]
    assert shown[3] == [key for key, _ in ROWS]
    assert chosen == [None]


@pytest.mark.parametrize(("keys", "left"), [(("b",), [None]), (("slash", "b", "a", "enter"), ["bat"])])
async def test_b_leaves_unless_something_is_looked_for(
    app: StagebookApp, keys: tuple[str, ...], left: list[str | None]
) -> None:
    assert (await picked(app, *keys))[1] == left


async def test_nothing_is_taken_where_no_row_holds_it(app: StagebookApp) -> None:
    assert (await picked(app, "q", "enter"))[1] == []
