"""Bringing an earlier store forward, tried with steps made up for the test: there is only one version so far."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, StoreUnreadable, connection, migration, verify
from stagebook.storage.migration import migrate
from stagebook.storage.tables import triggers

Plain = Callable[[BaseException], str]


@pytest.fixture
def old(path: Path, design: Callable, sheet: Callable) -> Path:
    with Store.open(path) as store:
        store.create("flood", design())
        store.save("flood", Note("a"), sheet(design(), driver=0.2))
    return path


@pytest.fixture
def raw(old: Path) -> Iterator[sqlite3.Connection]:
    with closing(sqlite3.connect(old, isolation_level=None)) as connection:
        connection.execute("PRAGMA foreign_keys = ON")
        yield connection


def add_column(connection: sqlite3.Connection) -> None:
    connection.execute("ALTER TABLE revision ADD COLUMN approved TEXT")
    connection.execute("UPDATE revision SET approved = 'yes'")


def build_anew(connection: sqlite3.Connection) -> None:
    """The way of SQLite's documentation ("ALTER TABLE", section 7) to change a table that others refer to."""
    (sql,) = connection.execute("SELECT sql FROM sqlite_schema WHERE name = 'design'").fetchone()
    connection.execute(sql.replace("design", "new_design", 1))
    connection.execute("INSERT INTO new_design SELECT * FROM design")
    connection.execute("DROP TABLE design")
    connection.execute("ALTER TABLE new_design RENAME TO design")


def fail(connection: sqlite3.Connection) -> None:
    connection.execute("UPDATE revision SET approved = 'no'")
    connection.execute("INSERT INTO nowhere VALUES (1)")


def orphan(connection: sqlite3.Connection) -> None:
    connection.execute("DELETE FROM design")


def version(connection: sqlite3.Connection) -> int:
    (found,) = connection.execute("PRAGMA user_version").fetchone()
    assert isinstance(found, int)
    return found


def test_steps_run_in_order_and_a_copy_is_set_aside(old: Path, raw: sqlite3.Connection) -> None:
    aside = migrate(raw, old, 3, {1: add_column, 2: build_anew})
    assert version(raw) == 3
    assert raw.execute("SELECT approved FROM revision").fetchall() == [("yes",)]
    assert raw.execute("PRAGMA foreign_keys").fetchone() == (1,)
    kept = dict(raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'"))
    assert kept == triggers()
    with pytest.raises(sqlite3.IntegrityError, match="never changed"):
        raw.execute("UPDATE revision SET approved = 'no'")
    assert aside.parent == old.parent
    assert aside.stat().st_mode & 0o777 == 0o600
    with Store.open(aside) as copy:
        assert [row.name for row in copy.designs()] == ["flood"]
        assert verify(copy) == []


@pytest.mark.parametrize(("step", "says"), [(fail, "nowhere"), (orphan, "without their owner"), (None, "2")])
def test_a_step_that_fails_leaves_the_last_whole_one(
    old: Path, raw: sqlite3.Connection, plain: Plain, step: migration.Step | None, says: str
) -> None:
    steps = {1: add_column} | ({2: step} if step else {})
    with pytest.raises(StoreUnreadable) as refusal:
        migrate(raw, old, 3, steps)
    message = plain(refusal.value)
    assert says in message
    assert f"{old.name}-version-1-1" in message
    assert version(raw) == 2
    assert raw.execute("SELECT approved FROM revision").fetchall() == [("yes",)]
    assert dict(raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")) == triggers()
    assert not raw.in_transaction


def test_a_copy_never_goes_over_an_earlier_copy(old: Path, raw: sqlite3.Connection) -> None:
    first = migrate(raw, old, 2, {1: lambda connection: None})
    raw.execute("PRAGMA user_version = 1")
    assert migrate(raw, old, 2, {1: lambda connection: None}) != first
    assert first.exists()


def test_a_step_that_another_sitting_has_done_is_not_done_again(
    old: Path, raw: sqlite3.Connection, monkeypatch: pytest.MonkeyPatch
) -> None:
    original = migration.copy_database

    def overtaken(connection: sqlite3.Connection, target: Path) -> None:
        """Setting the copy aside, during which another sitting does the whole migration."""
        original(connection, target)
        monkeypatch.undo()
        with closing(sqlite3.connect(old, isolation_level=None)) as other:
            migrate(other, old, 2, {1: add_column})

    monkeypatch.setattr(migration, "copy_database", overtaken)
    migrate(raw, old, 2, {1: add_column})  # a second column of that name would be refused
    assert version(raw) == 2


def test_opening_brings_an_earlier_store_forward(old: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(connection, "SCHEMA", 2)
    monkeypatch.setattr(migration, "STEPS", {1: build_anew})
    with Store.open(old) as store:
        assert [row.name for row in store.designs()] == ["flood"]
        assert verify(store) == []
        assert store.draft("flood").base_revision == 1
    assert [file.name for file in sorted(old.parent.iterdir())] == [old.name, f"{old.name}-version-1-1"]


def test_every_version_before_this_one_has_its_step() -> None:
    assert sorted(migration.STEPS) == list(range(1, connection.SCHEMA))
