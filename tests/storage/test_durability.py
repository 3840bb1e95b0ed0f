"""Nothing acknowledged is lost: processes killed with SIGKILL, a full disk, a store kept locked."""

from __future__ import annotations

import os
import signal
import sqlite3
import subprocess
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, StoreBusy, StoreFull, connection, verify

Plain = Callable[[BaseException], str]

pytestmark = pytest.mark.skipif(os.name != "posix", reason="kill -9 is of POSIX systems")


def kill(process: subprocess.Popen[str]) -> None:
    process.kill()
    assert process.wait(10) == -signal.SIGKILL


def test_an_acknowledged_edit_survives_kill_9(
    path: Path, child: Callable, next_line: Callable, design: Callable
) -> None:
    process = child("""
store = Store.open(path)
store.create("flood", design())
store.edit("flood", "R8 22k", design("22k"))
say("done")
sys.stdin.read()
""")
    assert next_line(process) == "done"
    kill(process)
    assert path.with_name(path.name + "-wal").stat().st_size > 0  # it was killed before the log was tidied away
    with Store.open(path) as store:
        draft = store.draft("flood")
        assert (draft.design, draft.undo_label) == (design("22k"), "R8 22k")
        assert verify(store) == []
        assert store.undo("flood").design == design()


def test_an_acknowledged_save_survives_kill_9(
    path: Path, child: Callable, next_line: Callable, design: Callable
) -> None:
    process = child("""
store = Store.open(path)
store.create("flood", design())
store.edit("flood", "R8 22k", design("22k"))
say(store.save("flood", Note("why"), sheet_of(design("22k"))).hash)
sys.stdin.read()
""")
    acknowledged = next_line(process)
    kill(process)
    with Store.open(path) as store:
        revision = store.revision("flood")
        assert (revision.number, revision.hash, revision.note.line) == (1, acknowledged, "why")
        assert revision.design == design("22k")
        assert store.draft("flood").edits == 0
        assert verify(store) == []


def test_kill_9_in_the_midst_of_edits_loses_none_that_was_acknowledged(
    path: Path, child: Callable, next_line: Callable, design: Callable
) -> None:
    """The kill falls anywhere in a later edit or save, which is then there as a whole or not at all."""
    process = child("""
store = Store.open(path)
store.create("flood", design())
for number in range(1, 100000):
    store.edit("flood", "R8", design(f"{number}k"))
    if number % 3 == 0:
        store.save("flood", Note(str(number)), sheet_of(design(f"{number}k")))
    say(number)
""")
    for _ in range(20):
        acknowledged = int(next_line(process))
    kill(process)
    assert process.stdout is not None
    acknowledged = int((process.stdout.read().split() or [acknowledged])[-1])
    with Store.open(path) as store:
        value = store.draft("flood").design.part("R8").value
        assert value in (f"{acknowledged}k", f"{acknowledged + 1}k")
        assert len(store.revisions("flood")) in (acknowledged // 3, (acknowledged + 1) // 3)
        assert verify(store) == []


def test_a_full_disk_refuses_the_edit_and_keeps_the_rest(flood: Store, design: Callable, plain: Plain) -> None:
    """SQLite's own limit of pages stands for the disk: both end in SQLITE_FULL."""
    flood.edit("flood", "R8 22k", design("22k"))
    with flood.reading() as session:
        pages = session.connection().exec_driver_sql("PRAGMA page_count").scalar_one()
        session.connection().exec_driver_sql(f"PRAGMA max_page_count = {pages}")
    with pytest.raises(StoreFull) as refusal:
        flood.edit("flood", "a label that needs pages of its own " * 1000, design("27k"))
    assert "not saved" in plain(refusal.value)
    assert flood.draft("flood").design == design("22k")
    with flood.reading() as session:
        session.connection().exec_driver_sql("PRAGMA max_page_count = 100000")
    assert flood.edit("flood", "R8 33k", design("33k")).edits == 2
    assert verify(flood) == []


def test_a_locked_store_is_told_and_goes_on_later(
    path: Path, design: Callable, sheet: Callable, plain: Plain, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(connection, "PATIENCE", 0.05)
    with Store.open(path) as store:
        store.create("flood", design())
        with closing(sqlite3.connect(path, isolation_level=None)) as other:
            other.execute("BEGIN IMMEDIATE")
            for attempt in (
                lambda: store.edit("flood", "R8", design("22k")),
                lambda: store.save("flood", Note("x"), sheet(design())),
            ):
                with pytest.raises(StoreBusy) as refusal:
                    attempt()
                assert "nothing was written" in plain(refusal.value)
            assert store.draft("flood").design == design()  # reading goes on
            other.execute("ROLLBACK")
        assert store.edit("flood", "R8", design("22k")).edits == 1
