"""What is saved is never changed: the triggers, tried with plain SQLite, and what verify finds without them."""

from __future__ import annotations

import shutil
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, inspect, verify
from stagebook.storage.tables import SCHEMA

APPEND_ONLY = ("revision", "margin", "note_entry", "made_part", "seal")


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory, design: Callable, sheet: Callable) -> Path:
    """A store with a design that has three revisions in a row, margins, additions to notes, two parts; closed."""
    path = tmp_path_factory.mktemp("made") / "s.sqlite3"
    with Store.open(path) as store:
        store.create("flood", design())
        store.keep_part("film", {"kind": "resistor", "value": "470k", "rating": "0.6 W"})
        store.keep_part("film", {"kind": "resistor", "value": "470k", "rating": "1 W"})
        for number, value in enumerate(("10k", "22k", "33k"), start=1):
            store.edit("flood", f"R8 {value}", design(value))
            store.save("flood", Note(f"note {number}"), sheet(design(value), driver=0.2, timer=-0.1))
            store.add_note("flood", number, "result", f"result {number}")
            store.add_note("flood", number, "result", "more")
        assert verify(store) == []
    return path


@pytest.fixture
def shelf(made: Path, path: Path) -> Iterator[Store]:
    path.parent.mkdir()
    shutil.copy(made, path)
    with Store.open(path) as store:
        yield store


@pytest.fixture(params=[False, True], ids=["without recursive triggers", "with recursive triggers"])
def raw(request: pytest.FixtureRequest, path: Path, shelf: Store) -> Iterator[sqlite3.Connection]:
    """The file opened as any other program would."""
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        connection.execute(f"PRAGMA recursive_triggers = {request.param}")
        yield connection


def rows(connection: sqlite3.Connection) -> list[list[tuple[object, ...]]]:
    return [connection.execute(f"SELECT * FROM {table}").fetchall() for table in APPEND_ONLY]


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE revision SET note = 'x'",
        "UPDATE revision SET saved = 'x' WHERE number = 2",
        "UPDATE OR REPLACE revision SET number = 1 WHERE number = 2",
        "UPDATE OR IGNORE revision SET note = 'x'",
        "DELETE FROM revision",
        "DELETE FROM revision WHERE number = 3",
        "INSERT OR REPLACE INTO revision SELECT * FROM revision WHERE number = 2",
        "REPLACE INTO revision SELECT * FROM revision",
        # by the number alone: the row id is left to the database
        "REPLACE INTO revision (design_id, number, saved, note, document, margins, content, hash)"
        " SELECT design_id, number, saved, 'x', document, margins, content, hash FROM revision WHERE number = 2",
        # by the row id alone: the number is a new one
        "REPLACE INTO revision (id, design_id, number, saved, note, document, margins, content, hash)"
        " SELECT id, design_id, 99, saved, 'x', document, margins, content, hash FROM revision WHERE number = 2",
        "INSERT INTO revision SELECT * FROM revision WHERE true ON CONFLICT DO UPDATE SET note = 'x'",
        "UPDATE margin SET margin = 1.0",
        "UPDATE OR REPLACE margin SET position = 0",
        "DELETE FROM margin WHERE margin < 0",
        "REPLACE INTO margin SELECT revision_id, position, check_id, 1, 0, 1, 'PASS', '' FROM margin",
        "INSERT INTO margin SELECT * FROM margin WHERE true ON CONFLICT DO UPDATE SET margin = 1.0",
        "UPDATE note_entry SET text = 'x'",
        "DELETE FROM note_entry",
        "REPLACE INTO note_entry SELECT id, revision_id, field, 'x', added, hash FROM note_entry",
        "UPDATE made_part SET document = '{}'",
        "DELETE FROM made_part WHERE version = 2",
        "REPLACE INTO made_part (name, version, kind, document, made) SELECT name, 1, kind, '{}', made FROM made_part",
        "UPDATE seal SET content = 'x'",
        "DELETE FROM seal WHERE id = (SELECT max(id) FROM seal)",
        "REPLACE INTO seal SELECT id, kind, subject, about, 'x', hash FROM seal",
    ],
)
def test_no_statement_changes_what_is_saved(raw: sqlite3.Connection, shelf: Store, statement: str) -> None:
    before = rows(raw)
    with pytest.raises(sqlite3.IntegrityError, match="is never changed"):
        raw.execute(statement)
    assert rows(raw) == before
    assert verify(shelf) == []


TAMPERED = [
    ("UPDATE revision SET document = replace(document, '22k', '24k') WHERE number = 2", ["r2: the document"]),
    ("UPDATE revision SET note = replace(note, 'note 2', 'note two') WHERE number = 2", ["r2: the hash"]),
    ("UPDATE revision SET margins = replace(margins, '0.2', '0.3') WHERE number = 2", ["r2: the hash"]),
    ("UPDATE revision SET margins = '{' WHERE number = 2", ["r2: the margins cannot be read"]),
    ("UPDATE revision SET saved = '2020-01-01T00:00:00+00:00' WHERE number = 2", ["r2: the hash"]),
    ("UPDATE revision SET parent_id = NULL WHERE number = 3", ["r3: the hash"]),
    ("UPDATE revision SET number = 4 WHERE number = 3", ["r3 is missing before r4", "r4: the hash"]),
    ("UPDATE revision SET hash = 'x' WHERE number = 1", ["r1: the hash", "r2: the hash", "r1: the addition"]),
    ("UPDATE revision SET edit_id = 1 WHERE number = 3", ["do not lead to r3"]),
    ("DELETE FROM revision WHERE number = 2", ["r2 is missing before r3", "r3: its parent is gone", "Row"]),
    ("UPDATE margin SET margin = 0.9 WHERE revision_id = 2", ["r2: the rows of margins"]),
    ("DELETE FROM margin WHERE revision_id = 2 AND position = 1", ["r2: the rows of margins"]),
    ("UPDATE note_entry SET text = 'x' WHERE text = 'result 2'", ["r2: the addition to the note's result"]),
    ("DELETE FROM note_entry WHERE text = 'result 2'", ["r2: the addition to the note's result"]),
    ("UPDATE edit SET forward = replace(forward, '22k', '24k')", ["do not lead to r2"]),
    ("UPDATE edit SET inverse = replace(inverse, '22k', '24k')", ["the edit 'R8 33k' of"]),
    ("UPDATE edit SET inverse = '[{}]'", ["edits of", "damaged"]),
    ("UPDATE draft SET document = replace(document, '33k', '39k')", ["do not lead to the draft"]),
    ("UPDATE draft SET document = '[]'", ["the draft cannot be read"]),
    ("DELETE FROM draft", ["the draft is gone"]),
    ("DELETE FROM design", ["Row"]),
]


@pytest.mark.parametrize(("statement", "says"), TAMPERED)
def test_a_change_behind_the_triggers_is_named(path: Path, shelf: Store, statement: str, says: list[str]) -> None:
    with closing(sqlite3.connect(path, isolation_level=None)) as raw:
        kept = raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'").fetchall()
        for name, _ in kept:
            raw.execute(f"DROP TRIGGER {name}")
        assert raw.execute(statement).rowcount > 0
        for _, sql in kept:
            raw.execute(sql)
    problems = verify(shelf)
    for words in says:
        assert any(words in problem for problem in problems), problems
    assert all("\n" not in problem for problem in problems)
    assert inspect(shelf).problems == tuple(problems)


NEWEST = """
    DELETE FROM note_entry WHERE revision_id = 3;
    DELETE FROM margin WHERE revision_id = 3;
    UPDATE draft SET base_id = 2;
    DELETE FROM revision WHERE id = 3;
"""
GONE = ["'flood' r3 was saved and is gone.", *["'flood' r3, added to result was saved and is gone."] * 2]
SEALED = {
    "the newest revision, with all that points to it": (NEWEST, GONE),
    "and the end of the seal": (
        f"{NEWEST} DELETE FROM seal WHERE id > 9;",
        ["The seal ended with entry 12 and ends with 9 now: what came after may be gone."],
    ),
    "an entry within the seal": (
        "DELETE FROM seal WHERE id = 7;",
        ["The seal has no entry 7 before entry 8: what it was about may be gone."],
    ),
    "an entry of the seal made to fit": (
        "UPDATE seal SET content = (SELECT hash FROM revision WHERE id = 2) WHERE id = 10;",
        ["Entry 10 of the seal, about 'flood' r3, is not the one that was made.", "'flood' r3 is not what was saved."],
    ),
    "the whole design": (
        "DELETE FROM note_entry; DELETE FROM margin; DELETE FROM draft; DELETE FROM revision; DELETE FROM edit;"
        " DELETE FROM sitting; DELETE FROM design;",
        ["'flood' was saved and is gone.", "'flood' r1 was saved and is gone."],
    ),
    "the name of a design": (
        "UPDATE design SET name = 'frost';",
        ["'flood' is not what was saved."],
    ),
    "a part of the drawer": (
        "UPDATE made_part SET document = replace(document, '470k', '47k') WHERE version = 1;",
        ["'film' of the drawer, version 1 is not what was saved."],
    ),
    "the newest version of a part": (
        "DELETE FROM made_part WHERE version = 2;",
        ["'film' of the drawer, version 2 was saved and is gone."],
    ),
    "a part that another program put in": (
        "INSERT INTO made_part (name, version, kind, document, made) SELECT 'odd', 1, kind, document, made"
        " FROM made_part WHERE version = 1;",
        ["'odd' of the drawer, version 1 is not in the seal: another program wrote it."],
    ),
}


@pytest.mark.parametrize(("statements", "says"), SEALED.values(), ids=SEALED)
def test_what_the_hashes_of_revisions_cannot_tell_is_told_by_the_seal(
    path: Path, shelf: Store, statements: str, says: list[str]
) -> None:
    """Nothing else is wrong with these stores: rows, hashes and triggers fit each other."""
    with closing(sqlite3.connect(path, isolation_level=None)) as raw:
        kept = raw.execute("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'").fetchall()
        for name, _ in kept:
            raw.execute(f"DROP TRIGGER {name}")
        raw.executescript(statements)
        for _, sql in kept:
            raw.execute(sql)
    problems = verify(shelf)
    assert problems[: len(says)] == says
    assert len(problems) == len(says) or statements == SEALED["the whole design"][0]


def test_the_seal_goes_on_from_its_last_entry(path: Path, shelf: Store, design: Callable) -> None:
    shelf.create("frost", design("1k"))
    shelf.keep_part("film", {"kind": "resistor", "value": "470k", "rating": "2 W"})
    shelf.keep_part("film", {"kind": "resistor", "value": "470k", "rating": "2 W"})  # the same: nothing is saved
    assert verify(shelf) == []
    with closing(sqlite3.connect(path)) as raw:
        assert raw.execute("SELECT id, about FROM seal ORDER BY id DESC LIMIT 3").fetchall() == [
            (14, "'film' of the drawer, version 3"),
            (13, "'frost'"),
            (12, "'flood' r3, added to result"),
        ]


def test_a_missing_trigger_is_named(path: Path, shelf: Store) -> None:
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("DROP TRIGGER margin_no_delete")
    assert verify(shelf) == [
        "The trigger margin_no_delete, which keeps saved rows from being changed, is missing or altered."
    ]


def test_a_trigger_made_toothless_is_named(path: Path, shelf: Store) -> None:
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("DROP TRIGGER revision_no_update")
        raw.execute("CREATE TRIGGER revision_no_update BEFORE UPDATE ON revision WHEN 0 BEGIN SELECT 1; END")
    assert ["revision_no_update" in problem for problem in verify(shelf)] == [True]


def test_the_stores_own_connection_keeps_sqlites_guards_on(shelf: Store) -> None:
    """SQLite's documentation of pragmas: foreign_keys, recursive_triggers, synchronous 2 = FULL, journal_mode."""
    with shelf.reading() as session:
        run = session.connection().exec_driver_sql
        found = {
            name: run(f"PRAGMA {name}").scalar_one()
            for name in ("foreign_keys", "recursive_triggers", "synchronous", "journal_mode")
        }
    assert found == {"foreign_keys": 1, "recursive_triggers": 1, "synchronous": 2, "journal_mode": "wal"}


def test_inspection_counts_and_advises(path: Path, shelf: Store) -> None:
    found = inspect(shelf)
    assert (found.path, found.schema, found.designs, found.revisions, found.edits) == (path, SCHEMA, 1, 3, 2)
    assert found.size > 0
    assert (found.problems, found.advice) == ((), ())
    path.chmod(0o644)
    assert "chmod 600" in inspect(shelf).advice[0]
