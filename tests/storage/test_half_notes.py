"""A note that is still being written: kept whole or not at all, for its owner, and given back as it was typed.

What is promised is the project's own; permissions are those of POSIX.
"""

from __future__ import annotations

import json
import os
import sqlite3
import subprocess
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Store, StoreFull, StoreReadOnly, half_notes
from stagebook.storage.half_notes import half_note, keep_half_note


def files(store: Path) -> list[Path]:
    return [file for file in store.parent.iterdir() if file.name != store.name]


def test_what_is_written_is_given_back_and_leaves_nothing_behind(path: Path) -> None:
    path.parent.mkdir()
    assert half_note(path, "flood") == {}
    keep_half_note(path, "flood", {"line": "why\x1b[2J \u00b5 \ud800", "symptom": "s" * 20_000, "next": ""})
    keep_half_note(path, "../../etc", {"line": "another"})
    assert half_note(path, "flood") == {"line": "why\x1b[2J \u00b5 \ud800", "symptom": "s" * 20_000, "next": ""}
    assert half_note(path, "../../etc") == {"line": "another"}
    kept = files(path)
    assert len(kept) == 2
    assert all(file.stat().st_mode & 0o777 == 0o600 for file in kept)
    keep_half_note(path, "flood", {"line": ""})
    keep_half_note(path, "../../etc", {})
    assert half_note(path, "flood") == {}
    assert files(path) == []


@pytest.mark.parametrize(
    "text",
    [
        "",
        "{",
        "[" * 100_000,
        "[]",
        '"flood"',
        '{"design": "flood"}',
        '{"design": "flood", "note": ["why"]}',
        '{"design": "other", "note": {"line": "why"}}',
        '{"design": "flood", "note": {"line": 1, "hash": "x"}}',
        "\x00\xff",
    ],
)
def test_a_file_that_says_something_else_is_no_note(path: Path, text: str) -> None:
    path.parent.mkdir()
    keep_half_note(path, "flood", {"line": "why"})
    (file,) = files(path)
    file.write_text(text, encoding="latin-1")
    assert half_note(path, "flood") == {}
    keep_half_note(path, "flood", {"line": "again"})
    assert half_note(path, "flood") == {"line": "again"}


def test_a_disk_without_room_keeps_what_was_kept_before(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path.parent.mkdir()
    keep_half_note(path, "flood", {"line": "why"})

    def full(handle: int) -> None:
        raise OSError(28, "No space left on device")  # ENOSPC of Linux

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(StoreFull, match=r"cannot be kept \(No space left on device\): make room\."):
        keep_half_note(path, "flood", {"line": "why not"})
    monkeypatch.undo()
    assert half_note(path, "flood") == {"line": "why"}
    assert len(files(path)) == 1


def test_a_folder_that_is_gone_is_one_line(path: Path) -> None:
    with pytest.raises(StoreReadOnly, match=r"give yourself write permission on "):
        keep_half_note(path, "flood", {"line": "why"})


def test_a_store_of_a_later_version_keeps_none(path: Path, design: Callable) -> None:
    with Store.open(path) as store:
        store.create("flood", design())
        store.keep_half_note("flood", {"line": "why"})
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("PRAGMA user_version = 99")
    with Store.open(path) as store:
        with pytest.raises(StoreReadOnly, match="was written by a later Stagebook"):
            store.keep_half_note("flood", {})
        assert store.half_note("flood") == {"line": "why"}


def test_what_a_killed_process_left_half_written_goes_with_the_next(path: Path, child: Callable) -> None:
    path.parent.mkdir()
    keep_half_note(path, "flood", {"line": "why"})
    writing: subprocess.Popen[str] = child(
        """
import os
from stagebook.storage.half_notes import keep_half_note
os.fsync = lambda handle: os.kill(os.getpid(), 9)
keep_half_note(path, "flood", {"line": "why not"})
""",
        path,
    )
    writing.wait(30)
    assert len(files(path)) == 2
    assert half_note(path, "flood") == {"line": "why"}
    keep_half_note(path, "flood", {"line": "because"})
    (file,) = files(path)
    assert json.loads(file.read_text())["note"] == {"line": "because"}
    assert half_notes.half_note(path, "flood") == {"line": "because"}
