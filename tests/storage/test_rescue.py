"""Saving what can be read of a damaged store. The form of the file: SQLite's "Database File Format", section 1."""

from __future__ import annotations

import random
import sqlite3
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Note, StorageError, Store, StoreUnreadable, rescue, verify

Plain = Callable[[BaseException], str]
VALUES = ("22k", "33k", "47k")
PAGE = 4096
RELEASED = sorted((Path(__file__).parent / "stores").glob("schema-*.sqlite3"))


@pytest.fixture
def closed(path: Path, design: Callable, sheet: Callable) -> Path:
    """A store of some 30 pages with two designs, closed."""
    with Store.open(path) as store:
        for name in ("flood", "frost"):
            store.create(name, design())
            for value in VALUES:
                store.edit(name, value, design(value))
                store.save(name, Note(value, symptom="a word " * 300), sheet(design(value), driver=0.2))
            store.add_note(name, 2, "result", "it holds")
            store.edit(name, "68k", design("68k"))
    return path


def told(path: Path) -> dict[str, tuple[str, list[str]]]:
    """By design: the draft's R8, and the revisions' notes."""
    with Store.open(path) as store:
        return {
            row.name: (
                str(store.draft(row.name).design.part("R8").value),
                [revision.note.line for revision in store.revisions(row.name)],
            )
            for row in store.designs()
        }


WHOLE = {name: ("68k", list(VALUES)) for name in ("flood", "frost")}


@pytest.mark.parametrize("released", RELEASED, ids=[file.stem for file in RELEASED])
def test_a_store_of_an_earlier_version_comes_over_and_is_sealed(released: Path, tmp_path: Path) -> None:
    found = rescue(released, tmp_path / "saved")
    assert (found.designs, found.revisions, found.lost) == (2, 3, ())
    with Store.open(tmp_path / "saved") as store:
        assert verify(store) == []


def test_a_whole_store_comes_over_as_it_is(closed: Path, tmp_path: Path) -> None:
    before = closed.read_bytes()
    found = rescue(closed, tmp_path / "saved")
    assert (found.designs, found.revisions, found.edits, found.lost) == (2, 6, 8, ())
    assert told(tmp_path / "saved") == told(closed) == WHOLE
    assert (tmp_path / "saved").stat().st_mode & 0o777 == 0o600
    with Store.open(tmp_path / "saved") as store:
        assert verify(store) == []
        assert store.revision("flood", 2).note.result == "it holds"
        assert store.undo("flood").design.part("R8").value == "47k"
    with Store.open(closed) as store:  # nor was the store itself touched
        assert verify(store) == []
    assert len(before) == closed.stat().st_size


def test_what_is_only_in_the_log_comes_over(path: Path, child: Callable, next_line: Callable, tmp_path: Path) -> None:
    process = child("""
store = Store.open(path)
store.create("flood", design())
store.edit("flood", "R8", design("22k"))
say("done")
sys.stdin.read()
""")
    assert next_line(process) == "done"
    process.kill()
    process.wait(10)
    assert rescue(path, tmp_path / "saved").lost == ()
    assert told(tmp_path / "saved") == {"flood": ("22k", [])}


def test_without_its_first_page_all_comes_over(closed: Path, tmp_path: Path) -> None:
    content = closed.read_bytes()
    closed.write_bytes(random.Random(1).randbytes(PAGE) + content[PAGE:])
    with pytest.raises(StoreUnreadable):
        Store.open(closed)
    found = rescue(closed, tmp_path / "saved")
    assert found.lost == ("The list of tables in the file was damaged: that of an empty store stood in for it.",)
    assert told(tmp_path / "saved") == WHOLE


def test_whatever_page_is_noise_the_rest_comes_over(closed: Path, tmp_path: Path) -> None:
    """Every second page in turn; what does not come over is named, and what does is a store in which one can go on."""
    content = closed.read_bytes()
    pages = len(content) // PAGE
    assert pages > 20
    untouched = 0
    for page in range(1, pages, 2):
        noise = random.Random(page).randbytes(PAGE)
        closed.write_bytes(content[: page * PAGE] + noise + content[(page + 1) * PAGE :])
        found = rescue(closed, tmp_path / "saved")
        saved = told(tmp_path / "saved")
        assert saved == WHOLE or found.lost
        untouched += saved == WHOLE
        assert saved, (page, found.lost)
        assert all("\n" not in line for line in found.lost)
        with Store.open(tmp_path / "saved") as store:
            for name in saved:
                store.edit(name, "100k", store.draft(name).design)
    assert untouched >= 3  # indexes, triggers and rows of margins hold nothing of their own


@pytest.mark.parametrize("share", [0.75, 0.9])
def test_the_beginning_of_a_truncated_file_comes_over(closed: Path, tmp_path: Path, share: float) -> None:
    content = closed.read_bytes()
    closed.write_bytes(content[: int(len(content) * share)])
    found = rescue(closed, tmp_path / "saved")
    assert found.lost[0].startswith(f"The file ends after {int(len(content) * share)} of {len(content)} bytes")
    assert found.designs >= 1
    assert told(tmp_path / "saved")


def test_what_was_altered_is_named_in_the_rescued_store(closed: Path, tmp_path: Path) -> None:
    with closing(sqlite3.connect(closed)) as raw:
        raw.execute("DROP TRIGGER revision_no_update")
        raw.execute("UPDATE revision SET note = replace(note, '33k', '99k') WHERE number = 2 AND design_id = 1")
        raw.execute("DELETE FROM edit WHERE id = (SELECT edit_id FROM revision WHERE number = 2 AND design_id = 1)")
        raw.commit()
    found = rescue(closed, tmp_path / "saved")
    assert "'flood' r2: the hash does not fit its parent, number, time, document, note and margins." in found.lost
    assert "'flood': the edits were torn; they were made anew from what was saved." in found.lost
    assert told(tmp_path / "saved")["flood"] == ("68k", ["22k", "99k", "47k"])
    with Store.open(tmp_path / "saved") as store:
        assert store.undo("flood").design.part("R8").value == "47k"
        assert store.undo("flood").design.part("R8").value == "33k"
        assert store.redo("flood").design.part("R8").value == "47k"


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        ("DELETE FROM draft WHERE design_id = 1", "begins again from r3"),
        ("DELETE FROM design WHERE id = 1", "it is called rescued 1"),
        ("UPDATE draft SET document = 'x' WHERE design_id = 1", "begins again from r3"),
    ],
)
def test_what_is_gone_is_made_from_what_is_there(closed: Path, tmp_path: Path, spoil: str, says: str) -> None:
    with closing(sqlite3.connect(closed)) as raw:
        raw.execute(spoil)
        raw.commit()
    found = rescue(closed, tmp_path / "saved")
    assert any(says in line for line in found.lost)
    assert (found.designs, found.revisions) == (2, 6)
    assert [notes for _, notes in told(tmp_path / "saved").values()] == [list(VALUES)] * 2


def test_a_file_that_ends_before_any_document_is_told(closed: Path, tmp_path: Path, plain: Plain) -> None:
    closed.write_bytes(closed.read_bytes()[: 3 * PAGE])
    with pytest.raises(StoreUnreadable) as refusal:
        rescue(closed, tmp_path / "saved")
    assert "Nothing of a store can be read" in plain(refusal.value)


@pytest.mark.parametrize("content", [b"", b"x", b"dear reader " * 2000, random.Random(2).randbytes(40_000)])
def test_where_there_is_no_store_nothing_is_made(tmp_path: Path, plain: Plain, content: bytes) -> None:
    (tmp_path / "letter").write_bytes(content)
    with pytest.raises(StoreUnreadable) as refusal:
        rescue(tmp_path / "letter", tmp_path / "saved")
    assert "Nothing of a store can be read" in plain(refusal.value)
    assert [file.name for file in tmp_path.iterdir()] == ["letter"]


@pytest.mark.parametrize("kind", ["itself", "a letter", "a folder", "no folder", "no store"])
def test_a_rescued_copy_goes_over_nothing_else(closed: Path, tmp_path: Path, plain: Plain, kind: str) -> None:
    target = tmp_path / "target"
    store = closed
    if kind == "itself":
        target = closed
    elif kind == "a folder":
        target.mkdir()
    elif kind == "no folder":
        target = target / "copy"
    elif kind == "no store":
        store = tmp_path / "missing"
    else:
        target.write_text("dear reader")
    before = closed.read_bytes()
    with pytest.raises(StorageError) as refusal:
        rescue(store, target)
    assert "name a" in plain(refusal.value)
    assert closed.read_bytes() == before
