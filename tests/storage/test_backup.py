"""Copies of a store in use: whole, consistent, over nothing else."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest

from stagebook.storage import StorageError, Store, backup, verify

Plain = Callable[[BaseException], str]


def test_a_copy_is_a_store_of_its_own(flood: Store, design: Callable, tmp_path: Path) -> None:
    flood.edit("flood", "R8 22k", design("22k"))
    target = tmp_path / "copy.db"
    flood.backup(target)
    flood.edit("flood", "R8 33k", design("33k"))
    assert target.stat().st_mode & 0o777 == 0o600
    assert [file.name for file in tmp_path.iterdir() if file.is_file()] == ["copy.db"]
    with Store.open(target) as copy:
        assert copy.draft("flood").design == design("22k")
        assert verify(copy) == []
    flood.backup(target)  # over an earlier copy
    with Store.open(target) as copy:
        assert copy.draft("flood").design == design("33k")


def test_a_copy_while_another_process_writes_is_consistent(
    path: Path, child: Callable, next_line: Callable, tmp_path: Path
) -> None:
    process = child("""
store = Store.open(path)
store.create("flood", design())
for number in range(1, 100000):
    store.edit("flood", "R8", design(f"{number}k"))
    store.save("flood", Note(str(number)), sheet_of(design(f"{number}k")))
    say(number)
""")
    assert next_line(process) == "1"
    with Store.open(path) as store:
        for number in range(5):
            target = tmp_path / f"copy {number}"
            acknowledged = int(next_line(process))
            store.backup(target)
            with Store.open(target) as copy:
                assert verify(copy) == []
                assert len(copy.revisions("flood")) >= acknowledged


@pytest.mark.parametrize("kind", ["itself", "a letter", "a folder", "no folder", "an empty file"])
def test_a_copy_goes_over_nothing_else(flood: Store, tmp_path: Path, plain: Plain, kind: str) -> None:
    target = tmp_path / "target"
    if kind == "itself":
        target.symlink_to(flood.path)
    elif kind == "a folder":
        target.mkdir()
    elif kind == "no folder":
        target = target / "copy"
    else:
        target.write_text("dear reader" if kind == "a letter" else "")
    with pytest.raises(StorageError) as refusal:
        flood.backup(target)
    assert "name another place" in plain(refusal.value)
    if kind == "a letter":
        assert target.read_text() == "dear reader"
    assert verify(flood) == []


def test_a_copy_that_fails_leaves_the_earlier_one(
    flood: Store, tmp_path: Path, plain: Plain, monkeypatch: pytest.MonkeyPatch
) -> None:
    target = tmp_path / "copy"
    flood.backup(target)
    content = target.read_bytes()

    def refuse(handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", refuse)
    with pytest.raises(StorageError) as refusal:
        flood.backup(target)
    assert "No space left on device" in plain(refusal.value)
    assert target.read_bytes() == content
    assert [file.name for file in tmp_path.iterdir() if file.is_file()] == ["copy"]


def test_the_copy_is_on_the_disk_before_it_has_its_name(
    flood: Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    done: list[str] = []
    real_sync, real_replace = os.fsync, os.replace
    monkeypatch.setattr(backup.os, "fsync", lambda handle: (done.append("sync"), real_sync(handle))[1])
    monkeypatch.setattr(backup.os, "replace", lambda a, b: (done.append("rename"), real_replace(a, b))[1])
    flood.backup(tmp_path / "copy")
    assert done == ["sync", "rename", "sync"]
