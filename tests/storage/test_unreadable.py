"""Files that are no store, damaged, of a later version, or not to be written: one plain line, nothing touched.

The form of the file is that of SQLite's documentation ("Database File Format", sections 1.3 and 4).
"""

from __future__ import annotations

import os
import random
import sqlite3
import tempfile
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path
from textwrap import indent

import pytest

from stagebook.storage import (
    DesignMissing,
    DesignOpen,
    Note,
    StorageError,
    Store,
    StoreReadOnly,
    StoreTooNew,
    StoreUnreadable,
    TakenOver,
    inspect,
    verify,
)
from stagebook.storage.tables import SCHEMA

Plain = Callable[[BaseException], str]


@pytest.fixture
def closed(path: Path, design: Callable, sheet: Callable) -> Path:
    """A store of some pages, closed: all of it is in one file."""
    with Store.open(path) as store:
        store.create("flood", design())
        for value in ("22k", "33k"):
            store.edit("flood", value, design(value))
            store.save("flood", Note(value), sheet(design(value), driver=0.2))
    assert [file.name for file in path.parent.iterdir()] == [path.name]
    return path


@pytest.mark.parametrize("content", [b"no database\n", b"x", random.Random(1).randbytes(9000), b"SQLite format 3\0"])
def test_what_is_no_database_is_told_and_left(tmp_path: Path, plain: Plain, content: bytes) -> None:
    path = tmp_path / "letter.txt"
    path.write_bytes(content)
    with pytest.raises(StoreUnreadable) as refusal:
        Store.open(path)
    assert "is not a Stagebook store" in plain(refusal.value)
    assert str(path) in str(refusal.value)
    assert path.read_bytes() == content
    assert [file.name for file in tmp_path.iterdir()] == ["letter.txt"]


@pytest.mark.parametrize("pragma", ["user_version = 0", "user_version = 1", "application_id = 252006674"])
def test_another_programs_database_is_told_and_left(tmp_path: Path, plain: Plain, pragma: str) -> None:
    path = tmp_path / "other.db"
    with closing(sqlite3.connect(path)) as other:
        other.execute("CREATE TABLE design (id INTEGER PRIMARY KEY, name TEXT)")
        other.execute(f"PRAGMA {pragma}")
    content = path.read_bytes()
    with pytest.raises(StoreUnreadable) as refusal:
        Store.open(path)
    assert "database of another program" in plain(refusal.value)
    assert path.read_bytes() == content


def test_a_later_version_is_looked_at_and_left(closed: Path, plain: Plain, design: Callable) -> None:
    with closing(sqlite3.connect(closed)) as later:
        later.execute("PRAGMA user_version = 7")
    content = closed.read_bytes()
    with Store.open(closed) as store:
        assert (store.read_only, store.later, store.schema) == (True, True, 7)
        assert f"later Stagebook (tables of version 7, this one knows {SCHEMA})" in store.why_read_only
        assert store.revision("flood", 2).design == store.draft("flood").design == design("33k")
        assert [row.revisions for row in store.designs()] == [2]
        for write in (
            lambda: store.edit("flood", "R8", design("47k")),
            lambda: store.sit_down("flood"),
            lambda: store.take_over("flood"),
            lambda: store.create("frost", design()),
        ):
            with pytest.raises(StoreTooNew) as refusal:
                write()
            assert "update Stagebook" in plain(refusal.value)
        found = inspect(store)
        assert (found.schema, found.problems, found.advice) == (7, (), (store.why_read_only,))
    assert closed.read_bytes() == content
    assert [file.name for file in closed.parent.iterdir()] == [closed.name]


def test_a_log_of_a_later_version_is_read_and_kept(closed: Path, design: Callable) -> None:
    """A later version was killed: its last commits are in the log, and nothing of it may be lost here."""
    with closing(sqlite3.connect(closed, isolation_level=None)) as later:
        later.execute("PRAGMA user_version = 7")
        later.execute("CREATE TABLE reading (id INTEGER PRIMARY KEY)")
        later.execute("ALTER TABLE revision ADD COLUMN approved TEXT")
        kept = {file: file.read_bytes() for file in closed.parent.iterdir() if not file.name.endswith("-shm")}
    for file, content in kept.items():
        file.write_bytes(content)
    assert len(kept) == 2
    with Store.open(closed) as store:
        assert store.schema == 7
        assert store.revision("flood").design == design("33k")
    with closing(sqlite3.connect(closed)) as later:
        assert later.execute("PRAGMA user_version").fetchone() == (7,)
        assert later.execute("SELECT count(*) FROM reading").fetchone() == (0,)
        assert later.execute("SELECT approved FROM revision").fetchall() == [(None,), (None,)]


def test_tables_of_a_later_version_that_are_not_known_are_told(closed: Path, plain: Plain) -> None:
    with closing(sqlite3.connect(closed, isolation_level=None)) as later:
        later.execute("PRAGMA user_version = 7")
        later.execute("ALTER TABLE revision RENAME COLUMN note TO notes")
        later.execute("""UPDATE draft SET document = '{"stagebook": 2}'""")
    with Store.open(closed) as store:
        assert [row.name for row in store.designs()] == ["flood"]
        for look in (lambda: store.revisions("flood"), lambda: store.draft("flood")):
            with pytest.raises(StoreTooNew) as refusal:
                look()
            assert "update Stagebook" in plain(refusal.value)
        with pytest.raises(DesignMissing):
            store.draft("frost")


@pytest.mark.parametrize("keep", [1, 50, 99, 100, 1000, 4096, 5000, 3 * 4096, 0.5, 0.9, -1, -4096])
def test_a_truncated_file_is_told(closed: Path, plain: Plain, keep: float) -> None:
    content = closed.read_bytes()
    length = int(len(content) * keep) if isinstance(keep, float) else keep % len(content)
    closed.write_bytes(content[:length])
    with pytest.raises(StoreUnreadable) as refusal, Store.open(closed) as store:
        store.designs()
    message = plain(refusal.value)
    assert "is damaged" in message or "is not a Stagebook store" in message
    assert str(closed) in message
    assert closed.read_bytes() == content[:length]


@pytest.mark.parametrize("text", [b'"value":"33k"', b'"value":"22k"', b"load-voltage:driver:LS1", b"cold, low supply"])
def test_damage_inside_is_found_by_verify(closed: Path, text: bytes) -> None:
    """Each place in the file where a text stands, one at a time, whichever table or index it belongs to."""
    content = closed.read_bytes()
    places = [at for at in range(len(content)) if content.startswith(text, at)]
    assert len(places) >= 3
    for at in places:
        closed.write_bytes(content[: at + 9] + b"5" + content[at + 10 :])
        with Store.open(closed) as store:
            assert verify(store)


def test_a_page_of_noise_is_found(closed: Path) -> None:
    content = closed.read_bytes()
    for page in range(1, len(content) // 4096):
        noise = random.Random(page).randbytes(4096)
        closed.write_bytes(content[: page * 4096] + noise + content[(page + 1) * 4096 :])
        problems = problems_of(closed)
        assert problems
        assert not any("\n" in problem for problem in problems)


def problems_of(path: Path) -> list[str]:
    try:
        with Store.open(path) as store:
            return verify(store)
    except StoreUnreadable as refusal:
        return [str(refusal)]


def test_an_empty_file_becomes_a_store(tmp_path: Path) -> None:
    path = tmp_path / "made by mktemp"
    path.touch(0o600)
    with Store.open(path) as store:
        assert store.designs() == []


NOBODY = """
import tempfile
with Store.open(Path(tempfile.mkdtemp()) / "s") as warm:  # all that is imported later is imported now
    warm.create("a", design())
    warm.designs(), verify(warm)
if os.getuid() == 0:
    os.setgroups([]), os.setgid(65534), os.setuid(65534)
"""
"""Root may write anything, so the child goes on as a user without rights."""


@pytest.fixture
def locked_folder() -> Iterator[Path]:
    """A folder in which a user without rights may read and not write."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        folder.chmod(0o755)
        yield folder
        folder.chmod(0o755)


LOOK = """
try:
    with Store.open(path) as store:
        say(store.read_only, [row.edits_pending for row in store.designs()], verify(store))
        try:
            store.edit("flood", "R8", design("39k"))
        except StorageError as refusal:
            say(type(refusal).__name__, refusal)
        try:
            store.backup(path.parent / "copy")
        except StorageError as refusal:
            say(type(refusal).__name__, refusal)
        say(*inspect(store).advice)
except StorageError as refusal:
    say(type(refusal).__name__, refusal)
say(sorted(os.listdir(path.parent)), os.listdir(tempfile.gettempdir()).count("never"))
"""


@pytest.mark.skipif(os.name != "posix", reason="permissions are those of POSIX systems")
@pytest.mark.parametrize("mode", [0o555, 0o777], ids=["folder not to be written", "folder to be written"])
def test_a_file_not_to_be_written_can_be_looked_at(
    locked_folder: Path, closed: Path, child: Callable, next_line: Callable, mode: int
) -> None:
    path = locked_folder / "s.sqlite3"
    path.write_bytes(closed.read_bytes())
    path.chmod(0o444)
    locked_folder.chmod(mode)
    process = child(NOBODY + LOOK, path)
    assert next_line(process) == "True [0] []"
    refusal = next_line(process)
    assert refusal.startswith(f"StoreReadOnly {path} can be looked at and not written")
    assert "give yourself write permission" in refusal
    if mode == 0o555:
        assert "cannot be written (Permission denied)" in next_line(process)
    advice = next_line(process)
    assert "not written" in advice
    assert "s.sqlite3" in next_line(process)


@pytest.mark.skipif(os.name != "posix", reason="permissions are those of POSIX systems")
def test_a_log_left_in_a_folder_not_to_be_written_is_not_lost(
    locked_folder: Path, child: Callable, next_line: Callable
) -> None:
    """The last commits are in the log only: SQLite's immutable mode would pass over them without a word."""
    path = locked_folder / "s.sqlite3"
    maker = child(
        """
store = Store.open(path)
store.create("flood", design())
for value in ("22k", "33k", "47k"):
    store.edit("flood", value, design(value))
say("done")
sys.stdin.read()
""",
        path,
    )
    assert next_line(maker) == "done"
    maker.kill()
    maker.wait(10)
    (locked_folder / "s.sqlite3-shm").unlink()
    for file in locked_folder.iterdir():
        file.chmod(0o444)
    locked_folder.chmod(0o555)
    before = {file.name: file.read_bytes() for file in locked_folder.iterdir()}
    assert {path.name, f"{path.name}-wal"} <= set(before)
    process = child(NOBODY + LOOK, path)
    assert next_line(process) == "True [3] []"
    assert next_line(process).startswith("StoreReadOnly")
    process.wait(10)
    assert {file.name: file.read_bytes() for file in locked_folder.iterdir()} == before


@pytest.mark.skipif(os.name != "posix", reason="permissions are those of POSIX systems")
def test_a_file_that_cannot_be_reached_is_told(locked_folder: Path, child: Callable, next_line: Callable) -> None:
    for name, mode in (("missing", None), ("secret", 0o000), ("empty", 0o444)):
        path = locked_folder / name
        if mode is not None:
            path.touch()
            path.chmod(mode)
    locked_folder.chmod(0o555)
    names = {"missing": "Permission denied", "secret": "Permission denied", "empty": "is empty"}
    each = f"for path in [path.parent / name for name in {list(names)}]:\n"
    process = child(NOBODY + each + indent(LOOK, "    "), locked_folder / "missing")
    for says in names.values():
        line = next_line(process)
        assert line.startswith(("StoreUnreadable", "StoreReadOnly"))
        assert says in line
        assert "--store" in line
        next_line(process)  # what lies in the folder


def test_the_family_holds_all_refusals() -> None:
    assert issubclass(StoreTooNew, StoreReadOnly)
    assert all(issubclass(kind, StorageError) for kind in (StoreReadOnly, StoreUnreadable, DesignOpen, TakenOver))


def test_inspection_of_a_store_that_is_well_says_nothing(closed: Path) -> None:
    with Store.open(closed) as store:
        assert inspect(store).problems == ()


def test_a_text_that_is_no_text_any_more_is_damage(closed: Path, plain: Plain) -> None:
    """Bytes that UTF-8 never has (RFC 3629, section 1), in the midst of the document of the draft."""
    content = closed.read_bytes()
    at = content.rindex(b"sounds while S1 is closed")
    closed.write_bytes(content[:at] + b"\xff" * 9 + content[at + 9 :])
    with Store.open(closed) as store:
        texts = [lambda: store.draft("flood"), lambda: store.revisions("flood"), store.designs]
        refusals = []
        for text in texts:
            try:
                text()
            except StorageError as refusal:
                refusals.append(plain(refusal))
    assert refusals
    for line in refusals:
        assert "is damaged: put a backup in the place of it" in line
        assert "sounds" not in line


def test_a_damaged_store_is_not_copied_over_a_good_copy(closed: Path, tmp_path: Path, plain: Plain) -> None:
    target = tmp_path / "copy"
    with Store.open(closed) as store:
        store.backup(target)
        with store.reading() as session:
            raw = session.connection()
            (root,) = raw.exec_driver_sql("SELECT rootpage FROM sqlite_schema WHERE name = 'edit'").one()
            (size,) = raw.exec_driver_sql("PRAGMA page_size").one()
    good = target.read_bytes()
    content = bytearray(closed.read_bytes())
    content[(root - 1) * size] = 0x77  # no kind of page (section 1.6)
    closed.write_bytes(content)
    with Store.open(closed) as store, pytest.raises(StorageError) as refusal:
        store.backup(target)
    assert "The store is damaged and is not copied to" in plain(refusal.value)
    assert target.read_bytes() == good
    assert [file.name for file in tmp_path.iterdir() if file.is_file()] == ["copy"]
