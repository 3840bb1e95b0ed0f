"""A design that is open in another window: told who has it since when, looked at, taken over, written over never."""

from __future__ import annotations

import sqlite3
from contextlib import closing

import pytest

from stagebook.engine.design.document import Design
from stagebook.storage import Store
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import document, flood, seen, settled, until

SIZE = (80, 24)


@pytest.fixture
def shelf(shelf: Store) -> Store:
    """The design is open nowhere: what made it has been left."""
    shelf.leave("flood")
    return shelf


def value(store: Store) -> str | None:
    return store.draft("flood").design.part("R1").value


async def test_who_has_the_design_open_is_told_and_it_can_be_looked_at(app: StagebookApp, shelf: Store) -> None:
    with Store.open(shelf.path, terminal="pts/7") as other:
        other.sit_down("flood")
        sitting = other.sitting("flood")
        assert sitting is not None
        async with app.run_test(size=SIZE) as pilot:
            await settled(pilot)
            await pilot.press("enter")
            await until(pilot, lambda: "t take over" in seen(pilot))
            told = " ".join(seen(pilot).split())
            assert f"open in another sitting since {sitting.since[:16].replace('T', ' ')} UTC" in told
            assert sitting.who in told
            await pilot.press("b")
            await until(pilot, lambda: "t take over" not in seen(pilot))
            assert "Stagebook: the shelf" in seen(pilot)
            await pilot.press("enter", "l")
            await settled(pilot)
            assert "flood (only looked at)" in seen(pilot)
            other.edit("flood", "R1 100k", Design.load(document(R1="100k")))
            await pilot.press("full_stop")
            await until(pilot, lambda: "Go on here" in seen(pilot))
            await pilot.press("n")
            await settled(pilot)
            assert value(shelf) == "100k"
            await pilot.press("b")
            await settled(pilot)
        held = other.sitting("flood")
        assert held is not None
        assert held.here


async def test_one_key_takes_the_design_over(app: StagebookApp, shelf: Store) -> None:
    with Store.open(shelf.path) as other:
        other.sit_down("flood")
        async with app.run_test(size=SIZE) as pilot:
            await settled(pilot)
            await pilot.press("enter")
            await until(pilot, lambda: "t take over" in seen(pilot))
            other.edit("flood", "R1 100k", Design.load(document(R1="100k")))
            await pilot.press("t")
            await settled(pilot)
            assert "only looked at" not in seen(pilot)
            assert "100k" in seen(pilot)
            await pilot.press("full_stop")
            await until(pilot, lambda: value(other) == "110k")


async def test_leaving_the_bench_gives_the_design_back(app: StagebookApp, shelf: Store) -> None:
    with Store.open(shelf.path) as other:
        async with app.run_test(size=SIZE) as pilot:
            await settled(pilot)
            await pilot.press("enter")
            await until(pilot, lambda: other.sitting("flood") is not None)
            await pilot.press("b")
            await until(pilot, lambda: other.sitting("flood") is None)
            other.sit_down("flood")
            await pilot.press("enter")
            await until(pilot, lambda: "t take over" in seen(pilot))


async def test_an_edit_goes_on_by_itself_when_the_other_has_left(app: StagebookApp, shelf: Store) -> None:
    with Store.open(shelf.path) as other:
        other.sit_down("flood")
        async with app.run_test(size=SIZE) as pilot:
            await settled(pilot)
            await pilot.press("enter", "l")
            await settled(pilot)
            other.leave("flood")
            await pilot.press("full_stop")
            await until(pilot, lambda: value(other) == "510k")
            assert "only looked at" not in seen(pilot)


async def test_a_store_of_a_later_version_is_looked_at(shelf: Store, solver: Solver) -> None:
    shelf.close()
    with closing(sqlite3.connect(shelf.path)) as raw:
        raw.execute("PRAGMA user_version = 9")
    with Store.open(shelf.path) as later:
        app = StagebookApp(later, solver)
        async with app.run_test(size=SIZE) as pilot:
            await settled(pilot)
            assert "written by a later Stagebook" in seen(pilot)
            await pilot.press("enter")
            await settled(pilot)
            assert "flood (only looked at)" in seen(pilot)
            await pilot.press("full_stop")
            await until(pilot, lambda: "update Stagebook" in seen(pilot))
            assert later.draft("flood").design == flood(R7="390k")
