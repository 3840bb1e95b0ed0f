"""Trouble with the store while the screens are up: a plain sentence, nothing lost, and going on when it is over."""

from __future__ import annotations

import sqlite3
from contextlib import closing, suppress

import pytest

from stagebook.storage import Store, StoreFull, StoreUnreadable
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import flood, seen, settled, until


def limit(store: Store, pages: int | None) -> None:
    """Lets the store have no page more than it has, through its own connection: SQLite says then that it is full."""
    with store.reading() as session:
        raw = session.connection()
        most = pages or raw.exec_driver_sql("PRAGMA page_count").scalar_one()
        raw.exec_driver_sql(f"PRAGMA max_page_count = {most}")


async def test_an_edit_on_a_full_disk_is_refused_and_goes_in_later(app: StagebookApp, shelf: Store) -> None:
    limit(shelf, None)
    with suppress(StoreFull):
        for k in range(10, 500):  # the last pages have room for some
            shelf.edit("flood", "R1", flood(R1=f"{k}k"))
    kept = shelf.draft("flood").design.part("R1").value
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("1", "M", "enter")
        await settled(pilot)
        assert "is full; the last change was not saved. Make room" in " ".join(seen(pilot).split())
        assert shelf.draft("flood").design.part("R1").value == kept
        limit(shelf, 100_000)
        await pilot.press("enter")  # what was written stands there still
        await settled(pilot)
        assert shelf.draft("flood").design.part("R1").value == "1M"


async def test_an_edit_while_another_program_writes_is_refused_and_goes_in_later(
    app: StagebookApp, shelf: Store
) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        with shelf.reading() as session:
            session.connection().exec_driver_sql("PRAGMA busy_timeout = 50")
        with closing(sqlite3.connect(shelf.path, isolation_level=None)) as other:
            other.execute("BEGIN IMMEDIATE")
            await pilot.press("1", "M", "enter")
            await until(pilot, lambda: "Another program keeps" in seen(pilot))
            assert shelf.draft("flood").design.part("R1").value == "470k"
        await pilot.press("enter")  # what was written stands there still
        await settled(pilot)
        assert shelf.draft("flood").design.part("R1").value == "1M"


async def test_a_path_of_a_user_that_there_is_not_is_refused(app: StagebookApp) -> None:
    async with app.run_test(size=(80, 24)) as pilot:
        await pilot.press("i", *"~no such user/x.json", "enter")
        assert "~no such user/x.json cannot be read" in " ".join(seen(pilot).split())


async def test_a_shelf_that_cannot_be_read_is_not_called_empty(
    app: StagebookApp, shelf: Store, monkeypatch: pytest.MonkeyPatch
) -> None:
    def damaged() -> None:
        raise StoreUnreadable("shelf.sqlite3 is damaged: put a backup in the place of it")

    monkeypatch.setattr(shelf, "designs", damaged)
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        assert "is damaged: put a backup" in seen(pilot)
        await pilot.press("down")
        assert "the shelf cannot be read" in seen(pilot)
        assert "empty" not in seen(pilot)
