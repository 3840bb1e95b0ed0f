"""Stages of the catalogue on the screen: a new design in a row, a stage more or less on the bench, cautions."""

from __future__ import annotations

import pytest
from textual.pilot import Pilot

from stagebook.engine.stages import stage_kinds
from stagebook.engine.stages.modified import is_modified
from stagebook.storage import Store
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.compare import CompareScreen
from stagebook.tui.screens.dialog import Form, Pick
from stagebook.tui.screens.new_design import NewDesignPage
from stagebook.tui.screens.shelf import ShelfScreen
from stagebook.tui.screens.stage_page import StagePage
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import RowList
from stagebook.tui.widgets.status import Notice

from .conftest import seen, settled, shown, until

SIZE = (80, 24)


def notice(pilot: Pilot[None]) -> str:
    return pilot.app.screen.query_one(Notice).text


async def pick(pilot: Pilot[None], key: str) -> None:
    """Takes one of a list."""
    await until(pilot, lambda: isinstance(pilot.app.screen, Pick))
    rows = pilot.app.screen.query_one(RowList)
    rows.move_to([row.key for row in rows.rows].index(key))
    await pilot.press("enter")


async def begin_row(pilot: Pilot[None]) -> NewDesignPage:
    await settled(pilot)
    await pilot.press("n")
    await pick(pilot, "row")
    await until(pilot, lambda: isinstance(pilot.app.screen, Form))
    await pilot.press(*"bell", "enter")
    await until(pilot, lambda: isinstance(pilot.app.screen, NewDesignPage))
    page = pilot.app.screen
    assert isinstance(page, NewDesignPage)
    return page


async def add(pilot: Pilot[None], kind: str, *keys: str) -> None:
    """A stage after the one under the hand; ``keys`` are pressed in its form."""
    await pilot.press("a")
    await pick(pilot, kind)
    await until(pilot, lambda: isinstance(pilot.app.screen, Form))
    await pilot.press(*keys, "enter")
    await until(pilot, lambda: isinstance(pilot.app.screen, NewDesignPage))


async def test_a_three_stage_design_is_made_of_the_catalogue(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await begin_row(pilot)
        await add(pilot, "entry")
        await add(pilot, "long_timer", "down", "down", *"20 s")
        await add(pilot, "low_side_driver")
        assert "s makes the design" in notice(pilot)
        assert "time 20 s" in seen(pilot)
        await pilot.press("s")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        design = store.draft("bell").design
        assert [stage.kind for stage in design.stages] == ["entry", "long_timer", "low_side_driver"]
        assert design.stage("timer").settings["time"] == "20 s"
        await settled(pilot)
        assert "[entry] --> timer   --> driver" in shown(pilot)[1]


async def test_a_row_that_does_not_fit_says_why_and_is_not_made(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await begin_row(pilot)
        await add(pilot, "debounce")
        assert "a debounce needs a signal" in notice(pilot)
        await pilot.press("s")
        assert isinstance(pilot.app.screen, NewDesignPage)
        assert store.designs() == []


async def test_stages_of_the_row_are_moved_removed_and_asked_again(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        page = await begin_row(pilot)
        await add(pilot, "piezo")
        await add(pilot, "contact_no")
        await pilot.press("comma")
        rows = page.query_one(RowList)
        assert [row.key for row in rows.rows] == ["contact", "piezo"]
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press(*"call", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, NewDesignPage))
        assert [row.key for row in rows.rows] == ["call", "piezo"]
        await pilot.press("x")
        assert [row.key for row in rows.rows] == ["piezo"]
        await pilot.press("b", "y")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        assert store.designs() == []


async def test_a_setting_that_cannot_be_read_keeps_the_form_open(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await begin_row(pilot)
        await pilot.press("a")
        await pick(pilot, "contact_no")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press("down")
        assert "wetting: least current" in notice(pilot)
        await pilot.press(*"1 V", "enter")
        assert "setting wetting" in notice(pilot)
        assert isinstance(pilot.app.screen, Form)


async def test_a_setting_that_cannot_be_made_keeps_the_form_open(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        page = await begin_row(pilot)
        await add(pilot, "entry")
        await pilot.press("a")
        await pick(pilot, "lamp")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press("down", "ctrl+u", *"-2 W", "enter")
        assert isinstance(pilot.app.screen, Form)
        assert "setting power: -2 W is" in notice(pilot)
        await pilot.press("ctrl+u", *"2 W", "enter")
        await until(pilot, lambda: pilot.app.screen is page)
        assert [row.key for row in page.query_one(RowList).rows] == ["entry", "lamp"]


async def test_the_stage_in_the_way_is_marked_beside_the_doubts(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await begin_row(pilot)
        await add(pilot, "piezo")
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        pilot.app.screen.query_one("#field-asked-heard").focus()
        await pilot.press(*"200 dB", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, NewDesignPage))
        assert any("piezo" in text and " ! " in text for text in shown(pilot)[2:6])
        await add(pilot, "debounce")
        await pilot.press("comma")
        assert "a debounce needs a signal" in notice(pilot)
        assert any("debounce" in text and " X " in text for text in shown(pilot)[2:6])
        assert any("piezo" in text and " ! " in text for text in shown(pilot)[2:6])


@pytest.mark.parametrize("size", [(80, 24), (20, 5)])
async def test_how_a_kind_is_sized_can_be_read(store: Store, solver: Solver, size: tuple[int, int]) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=size) as pilot:
        await begin_row(pilot)
        await add(pilot, "entry")
        await pilot.press("k")
        await until(pilot, lambda: isinstance(pilot.app.screen, StagePage))
        whole = " ".join(seen(pilot).split())
        assert size != SIZE or "Source: common practice" in whole
        await pilot.press("b")


async def made(pilot: Pilot[None]) -> None:
    await begin_row(pilot)
    await add(pilot, "contact_no")
    await add(pilot, "low_side_driver")
    await pilot.press("s")
    await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
    await settled(pilot)


async def test_a_stage_whose_parts_were_changed_says_so(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        assert "contact: parts" in seen(pilot)
        assert "modified" not in seen(pilot)
        await pilot.press("down", "full_stop")
        assert "contact: modified" in seen(pilot)
        assert is_modified(store.draft("bell").design.stages[0])
        await pilot.press("k")
        await until(pilot, lambda: isinstance(pilot.app.screen, StagePage))
        assert "its parts are not those that the catalogue made" in seen(pilot)
        await pilot.press("b", "u")
        await until(pilot, lambda: not is_modified(store.draft("bell").design.stages[0]))


async def test_a_stage_is_added_and_removed_on_the_bench(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        await pilot.press("A")
        await pick(pilot, "piezo")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        design = store.draft("bell").design
        assert design.part("LS2").pins == {"plus": "supply", "minus": "driver.low"}
        assert "[piezo]" in shown(pilot)[1]
        await pilot.press("X", "y")
        await until(pilot, lambda: len(store.draft("bell").design.stages) == 2)
        assert not store.draft("bell").design.has_part("LS2")
        await pilot.press("u")
        assert store.draft("bell").design.has_part("LS2")


async def test_what_an_added_stage_makes_of_the_others_can_be_read(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        await pilot.press("A")
        await pick(pilot, "sounder")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        assert "k on driver says what" in notice(pilot)
        await pilot.press("left", "k")
        await until(pilot, lambda: isinstance(pilot.app.screen, StagePage))
        assert "! will not hold" in seen(pilot)
        assert "an inrush of 700 mA is more than" in " ".join(seen(pilot).split())


async def test_a_made_stage_is_asked_for_something_else(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        was = store.draft("bell").design
        await pilot.press("S")
        await until(pilot, lambda: isinstance(pilot.app.screen, Form))
        await pilot.press("down", "ctrl+u", *"0", "enter")
        assert isinstance(pilot.app.screen, Form)
        assert "setting wetting: 0 is not above zero; write it like 1 mA" in notice(pilot)
        assert store.draft("bell").design == was
        await pilot.press("ctrl+u", *"2 mA", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        assert "contact asked again" in notice(pilot)
        assert store.draft("bell").design.stages[0].settings["wetting"] == "2 mA"
        await pilot.press("u")
        await until(pilot, lambda: store.draft("bell").design == was)


async def test_before_the_first_save_a_draft_is_compared_with_what_it_was(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        await until(pilot, lambda: " start" in seen(pilot))
        assert "the same as start" in seen(pilot)
        await pilot.press("down", "full_stop")
        await settled(pilot)
        await until(pilot, lambda: "than in start" in seen(pilot) or "worse than start" in seen(pilot))
        await pilot.press("c")
        await until(pilot, lambda: isinstance(pilot.app.screen, CompareScreen))
        assert {"start", "draft"} <= set(seen(pilot).split())


async def test_cautions_are_told_once(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await made(pilot)
        assert "Caution: loud sounders" in notice(pilot)
        await pilot.press("down")
        assert notice(pilot) == ""
        await pilot.press("b")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        await settled(pilot)
        assert "Caution" not in notice(pilot)
        await pilot.press("k")
        await until(pilot, lambda: isinstance(pilot.app.screen, StagePage))
        await pilot.press("end")
        assert "110 dB(A)" in seen(pilot)


async def test_the_list_of_kinds_holds_the_whole_catalogue(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await begin_row(pilot)
        await pilot.press("a")
        await until(pilot, lambda: isinstance(pilot.app.screen, Pick))
        rows = pilot.app.screen.query_one(RowList).rows
        assert {row.key for row in rows} == set(stage_kinds())
        assert "a new design" in shown(pilot)[0]  # the list stands at the foot, what it is about stays above
        # What the row has no room for stands below the list, to its end.
        kind = stage_kinds()["piezo"]
        assert kind.help.split()[-1] not in seen(pilot)
        await pilot.press("home", *["down"] * [row.key for row in rows].index("piezo"))
        assert kind.help.split()[-1] in seen(pilot)
