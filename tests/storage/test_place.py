"""Where the store lies and who can read it. File modes: POSIX.1."""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from pathlib import Path

import platformdirs
import pytest

from stagebook.storage import StorageError, Store, StoreUnreadable, default_path

Plain = Callable[[BaseException], str]
posix = pytest.mark.skipif(os.name != "posix", reason="modes are those of POSIX systems")


def mode(path: Path) -> int:
    return stat.S_IMODE(path.stat().st_mode)


def test_the_default_place_is_in_the_users_data_folder(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("STAGEBOOK_STORE", raising=False)
    assert default_path() == platformdirs.user_data_path("stagebook") / "stagebook.sqlite3"


def test_the_environment_names_another_place(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setenv("STAGEBOOK_STORE", str(tmp_path / "other.sqlite3"))
    with Store.open() as store:
        assert store.path == tmp_path / "other.sqlite3"
    assert (tmp_path / "other.sqlite3").stat().st_size > 0


@posix
def test_files_and_folder_are_for_their_owner_only(tmp_path: Path) -> None:
    before = os.umask(0)
    try:
        with Store.open(tmp_path / "data" / "s.sqlite3") as store:
            store.designs()
            files = sorted(store.path.parent.iterdir())
            assert [file.name for file in files] == ["s.sqlite3", "s.sqlite3-shm", "s.sqlite3-wal"]
            assert {mode(file) for file in files} == {0o600}
            assert mode(store.path.parent) == 0o700
    finally:
        os.umask(before)


def test_names_with_characters_of_addresses_are_no_trouble(tmp_path: Path) -> None:
    path = tmp_path / "a?mode=memory #%41.db"
    with Store.open(path):
        pass
    assert path.stat().st_size > 0


@pytest.mark.parametrize("kind", ["folder", "root", "below a file", "no character", "lost database"])
def test_a_place_that_cannot_be_used_is_told_in_one_line(tmp_path: Path, kind: str, plain: Plain) -> None:
    path = tmp_path / "s.sqlite3"
    if kind == "folder":
        path.mkdir()
    elif kind == "root":
        path = Path("/")
    elif kind == "below a file":
        path.write_text("x")
        path = path / "s.sqlite3"
    elif kind == "no character":
        path = tmp_path / "a\0b"
    else:
        (tmp_path / "s.sqlite3-wal").write_text("what was saved last")
    with pytest.raises(StoreUnreadable) as refusal:
        Store.open(path)
    assert plain(refusal.value)
    if kind == "lost database":
        assert "put s.sqlite3 back" in str(refusal.value)
        assert (tmp_path / "s.sqlite3-wal").read_text() == "what was saved last"
    else:
        assert "--store" in str(refusal.value)


def test_every_refusal_is_of_one_family() -> None:
    assert issubclass(StoreUnreadable, StorageError)
