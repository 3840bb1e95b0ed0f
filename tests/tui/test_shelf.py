"""The shelf: what it lists, and how designs come onto it."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from stagebook.engine.results import Verdict
from stagebook.storage import Note, Store, Worst
from stagebook.tui.messages import SolverPreparing
from stagebook.tui.screens.bench import BenchScreen
from stagebook.tui.screens.part_data import PartDataScreen
from stagebook.tui.screens.shelf import ShelfScreen
from stagebook.tui.shelf_text import shelf_line
from stagebook.tui.shown import Span, line, plain
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp
from stagebook.tui.widgets.row_list import Row, RowList
from stagebook.tui.widgets.status import Notice

from .conftest import Gates, corners, document, flood, seen, settled, shown, until

SIZE = (80, 24)


async def test_the_shelf_lists_revision_time_and_worst_margin(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        row = next(text for text in seen(pilot).splitlines() if "flood" in text)
        assert "r2" in row
        assert "= +15 pass" in row


async def test_the_figure_of_a_revision_is_said_to_be_one_where_the_draft_differs(
    app: StagebookApp, shelf: Store
) -> None:
    shelf.edit("flood", "R7 470k", flood(R7="470k"))
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        row = next(text for text in seen(pilot).splitlines() if "flood" in text)
        assert "1 edit   = +15~ pass    r2: arrival R7" in row


async def test_a_copy_of_a_design_opens_on_the_bench(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("n", "down", "down", "enter", *"flood 2", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        assert shelf.draft("flood 2").design.part("R7").value == "390k"
        assert shelf.draft("flood 2").design.name == "flood 2"


async def test_an_empty_design_can_be_begun(store: Store, solver: Solver) -> None:
    app = StagebookApp(store, solver)
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        assert "the shelf is empty" in seen(pilot)
        await pilot.press("n", "down", "enter", *"first", "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        assert [stage.name for stage in store.draft("first").design.stages] == ["entry"]
        assert "no parts yet" in seen(pilot)


async def test_a_name_that_is_taken_keeps_the_form_open(app: StagebookApp, shelf: Store) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("n", "down", "enter", *"flood", "enter")
        assert "flood" in pilot.app.screen.query_one(Notice).text
        assert len(shelf.designs()) == 1


async def test_a_document_is_imported_by_its_path(app: StagebookApp, shelf: Store, tmp_path: Path) -> None:
    file = tmp_path / "tilt.json"
    file.write_text(json.dumps(document("tilt")))
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("i", *str(file), "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        assert [row.name for row in shelf.designs()] == ["flood", "tilt"]
        assert "tilt" in seen(pilot)


async def test_an_imported_document_that_cannot_be_computed_says_why(
    app: StagebookApp, shelf: Store, tmp_path: Path
) -> None:
    loose = document("tilt")
    loose["stages"][0]["parts"].append({"ref": "R99", "kind": "resistor", "pins": {"a": "nowhere", "b": "0V"}})
    file = tmp_path / "loose.json"
    file.write_text(json.dumps(loose))
    async with app.run_test(size=(160, 24)) as pilot:
        await settled(pilot)
        await pilot.press("i", *str(file), "enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        words = pilot.app.screen.query_one(Notice).text
        assert "tilt is on the shelf, but cannot be computed as it stands: " in words
        assert "R99" in words or "nowhere" in words
        assert [row.name for row in shelf.designs()] == ["flood", "tilt"]


@pytest.mark.parametrize(("path", "words"), [("nowhere.json", "nowhere.json cannot be read"), ("", "write the path")])
async def test_a_file_that_cannot_be_read_is_said_in_one_line(app: StagebookApp, path: str, words: str) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("i", *path, "enter")
        assert words in pilot.app.screen.query_one(Notice).text


async def test_a_solver_made_ready_behind_a_bench_is_not_said_to_be_prepared_still(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        pilot.app.screen.post_message(SolverPreparing(True))
        await until(pilot, lambda: "preparing the solver" in seen(pilot))
        await pilot.press("enter")
        await until(pilot, lambda: isinstance(pilot.app.screen, BenchScreen))
        await settled(pilot)
        await pilot.press("escape")
        await until(pilot, lambda: isinstance(pilot.app.screen, ShelfScreen))
        await settled(pilot)
        assert "preparing the solver" not in seen(pilot)


async def test_rows_out_of_sight_are_counted_beside_the_heads_never_over_them(app: StagebookApp) -> None:
    heads = line(Span("name      value   least"))
    async with app.run_test(size=(40, 24)) as pilot:
        await settled(pilot)
        rows = pilot.app.screen.query_one(RowList)
        many = [Row(str(at), line(f"row {at}")) for at in range(40)]
        rows.show(many, heads)
        await pilot.pause()
        assert "  name      value   least     (21 below)" in seen(pilot)
        rows.show(many, line(Span("name                value           least")))
        await pilot.pause()
        assert "  name (21 below)     value           least"[:40] in seen(pilot)
        rows.show(many, line(Span("name value least and much more, to the end")))
        await pilot.pause()
        assert "  name value least and much more, to the" in seen(pilot)


async def test_every_mark_fits_the_help_of_80_columns(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("question_mark", "end")
        assert "? help" not in shown(pilot)[-1]
        assert "what should happen does not" in seen(pilot)
        # The row is longer than the screen: the rest stands below.
        assert "nominal is one case and never stands for the worst." in " ".join(seen(pilot).split())


async def test_the_drawer_opens_from_the_shelf(app: StagebookApp, shelf: Store) -> None:
    shelf.keep_part("my npn", {"kind": "npn", "class": "small npn"})
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("p")
        assert "my npn" in seen(pilot)
        await pilot.press("enter")
        assert isinstance(pilot.app.screen, PartDataScreen)
        await pilot.press("b")
        assert " Enter edit" in shown(pilot)[-1]
        await pilot.press("b")
        assert isinstance(pilot.app.screen, ShelfScreen)


async def test_q_leaves(app: StagebookApp) -> None:
    async with app.run_test(size=SIZE) as pilot:
        await settled(pilot)
        await pilot.press("q")
    assert app.return_code == 0


def test_a_margin_that_fails_by_what_happened_says_so_as_elsewhere(shelf: Store, gates: Gates) -> None:
    told = replace(corners(gates, flood()).checks[0], margin=-1.0, verdict=Verdict.FAIL, outcome="did not let go")
    found = replace(corners(gates, flood()), checks=(told,))
    shelf.create("tilt", flood())
    shelf.save("tilt", Note("it does not let go"), found)
    row = next(row for row in shelf.designs() if row.name == "tilt")
    assert row.worst == Worst(told.id, -1.0, Verdict.FAIL, "did not let go")
    for own in (None, found):
        shown = plain(shelf_line(replace(row, edits_pending=1 if own else 0), own, 80))
        assert "X fails " in shown
        assert "-100" not in shown
        assert "FAIL" not in shown
