"""Bringing earlier stores forward: those kept of every released version, and steps made up to fail."""

from __future__ import annotations

import os
import shutil
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, StoreUnreadable, connection, migration, verify
from stagebook.storage.migration import migrate
from stagebook.storage.tables import triggers

from .released import of, sheet_of

Plain = Callable[[BaseException], str]
OF_VERSION_1 = ("revision", "margin", "note_entry")
"""The append-only tables that version 1 had."""


STORES = Path(__file__).parent / "stores"
RELEASED = sorted(STORES.glob("schema-*.sqlite3"))


@pytest.fixture
def old(path: Path) -> Path:
    """A store as version 1 left it."""
    path.parent.mkdir()
    shutil.copyfile(STORES / "schema-1.sqlite3", path)
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
    assert raw.execute("SELECT approved FROM revision").fetchall() == [("yes",)] * 3
    assert raw.execute("PRAGMA foreign_keys").fetchone() == (1,)
    kept = dict(raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'"))
    assert kept == triggers(OF_VERSION_1)
    with pytest.raises(sqlite3.IntegrityError, match="never changed"):
        raw.execute("UPDATE revision SET approved = 'no'")
    assert aside.parent == old.parent
    assert aside.stat().st_mode & 0o777 == 0o600
    with Store.open(aside) as copy:
        assert [row.name for row in copy.designs()] == ["flood", "frost"]
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
    assert raw.execute("SELECT approved FROM revision").fetchall() == [("yes",)] * 3
    assert dict(raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")) == triggers(OF_VERSION_1)
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


def rows(file: Path, *tables: str) -> list[list[tuple[object, ...]]]:
    with closing(sqlite3.connect(file)) as connection:
        return [connection.execute(f"SELECT * FROM {table}").fetchall() for table in tables]


@pytest.mark.parametrize("released", RELEASED, ids=[file.stem for file in RELEASED])
def test_a_released_store_is_brought_forward(path: Path, released: Path) -> None:
    """What was saved is there to the letter, and goes on: undo, redo, the tree, the notes, another revision."""
    path.parent.mkdir()
    shutil.copyfile(released, path)
    kept = ("design", "revision", "margin", "note_entry", "draft", "edit")
    before = rows(path, *kept)
    with Store.open(path) as store:
        assert store.schema == connection.SCHEMA
        assert rows(path, *kept) == before
        # Everything saved is in the seal: two designs, three revisions, two additions, and the parts of the drawer.
        assert len(rows(path, "seal")[0]) == 7 + len(store.drawer() and store.part_versions("film"))
        assert verify(store) == []
        assert [(row.name, row.revisions, row.edits_pending) for row in store.designs()] == [
            ("flood", 3, 1),
            ("frost", 0, 0),
        ]
        assert [(r.number, r.parent, r.note.line) for r in store.revisions("flood")] == [
            (1, None, "first try"),
            (2, 1, "more"),
            (3, 1, "the other way"),
        ]
        assert store.revision("flood", 2).note.result == "as predicted\nalso in the cold: 2 \u03a9 less"
        assert store.sitting("flood") is None  # of a process that is long dead
        assert store.sit_down("flood").design.part("R8").value == "5k6"
        assert store.redo("flood").design.part("R8").value == "4k7"
        assert store.save("flood", Note("on"), sheet_of(of("4k7"), driver=0.1)).parent == 3
        assert verify(store) == []
    asides = [] if released.stem == f"schema-{connection.SCHEMA}" else [f"{path.name}-{_version_of(released)}-1"]
    assert [file.name for file in sorted(path.parent.iterdir())] == [path.name, *asides]
    for aside in asides:
        assert rows(path.parent / aside, *kept) == before


def _version_of(released: Path) -> str:
    return released.stem.replace("schema", "version")


@pytest.mark.parametrize("released", RELEASED, ids=[file.stem for file in RELEASED])
def test_steps_end_at_the_tables_of_this_version(path: Path, released: Path, tmp_path: Path) -> None:
    path.parent.mkdir()
    shutil.copyfile(released, path)
    fresh = tmp_path / "fresh"
    Store.open(path).close()
    Store.open(fresh).close()
    assert _tables(path) == _tables(fresh)


def _tables(file: Path) -> dict[str, list[tuple[object, ...]]]:
    """Columns and foreign keys of every table, indices, and the triggers to the letter."""
    with closing(sqlite3.connect(file)) as found:
        names = [name for (name,) in found.execute("SELECT name FROM sqlite_schema WHERE type = 'table'")]
        shape = {
            f"{pragma} {name}": found.execute(f"PRAGMA {pragma}({name})").fetchall()
            for name in names
            for pragma in ("table_info", "foreign_key_list", "index_list")
        }
        return shape | {"triggers": sorted(found.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'"))}


KILLED = """
import sqlite3, shutil
from stagebook.storage import migration
def stop(*words):
    say(*words)
    sys.stdin.read()
if kind == "before the copy has its name":
    migration.copy_database.__globals__["os"].replace = lambda old, new: stop("there")
else:
    step = migration.STEPS[1]
    def cut(connection):
        step(connection)
        stop("there")
    migration.STEPS = {1: cut}
Store.open(path)
"""


@pytest.mark.skipif(os.name != "posix", reason="kill -9 is of POSIX systems")
@pytest.mark.parametrize("kind", ["before the copy has its name", "before the end of a step"])
def test_a_killed_migration_leaves_the_old_store(old: Path, child: Callable, next_line: Callable, kind: str) -> None:
    before = rows(old, "revision", "draft", "sitting")
    process = child(f"kind = {kind!r}{KILLED}")
    assert next_line(process) == "there"
    process.kill()
    process.wait(10)
    with closing(sqlite3.connect(old)) as raw:
        assert version(raw) == 1
        assert raw.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
    assert rows(old, "revision", "draft", "sitting") == before
    with Store.open(old) as store:
        assert store.schema == connection.SCHEMA
        assert verify(store) == []
    assert not [file for file in old.parent.iterdir() if ".part" in file.name]  # what the dead one began is gone


def test_an_older_store_that_cannot_be_written_is_looked_at_in_a_copy(
    old: Path, child: Callable, next_line: Callable
) -> None:
    """The copy is brought forward; a user without rights looks, as root may write anything."""
    old.chmod(0o444)
    content = old.read_bytes()
    for folder in (old.parent, *old.parent.parents):
        if folder.stat().st_uid == os.getuid() and folder != Path("/tmp"):
            folder.chmod(folder.stat().st_mode | 0o555 if folder != old.parent else 0o555)
        if folder.name.startswith("pytest-of"):
            break
    process = child(f"""
with Store.open(Path({str(old.parent.parent)!r}) / "warm") as warm:  # all that is imported later is imported now
    warm.create("a", design())
    warm.designs(), verify(warm)
import stagebook.storage.migration
if os.getuid() == 0:
    os.setgroups([]), os.setgid(65534), os.setuid(65534)
with Store.open(path) as store:
    say(store.read_only, store.schema, [row.revisions for row in store.designs()], verify(store))
""")
    assert next_line(process) == f"True {connection.SCHEMA} [3, 0] []"
    assert process.wait(10) == 0
    assert old.read_bytes() == content
    old.parent.chmod(0o755)
    assert [file.name for file in old.parent.iterdir()] == [old.name]


def test_every_version_before_this_one_has_its_step_and_is_kept() -> None:
    """The tables as they are have no store yet until they go out."""
    earlier = list(range(1, connection.SCHEMA))
    assert sorted(migration.STEPS) == earlier
    assert {file.stem for file in RELEASED} >= {f"schema-{number}" for number in earlier}
