"""Where the compiled solver is kept. The rules are our own (numba's cache knows neither callees nor owners)."""

from __future__ import annotations

import os
import shutil
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from stagebook.tui import solver_cache
from stagebook.tui.solver_cache import choose_cache_folder, ready, solver_key


@pytest.fixture
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A cache folder of its own; the environment is put back afterwards."""
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    monkeypatch.setenv("NUMBA_CACHE_DIR", "elsewhere")
    monkeypatch.delenv("STAGEBOOK_UNCOMPILED", raising=False)
    return tmp_path / "cache" / "stagebook" / "solver"


def test_the_folder_is_the_users_own(cache: Path) -> None:
    folder = choose_cache_folder()
    assert folder.path is not None
    assert folder.path.parent == cache
    assert folder.lasting
    assert folder.words is None
    assert stat.S_IMODE(folder.path.stat().st_mode) == 0o700
    assert os.environ["NUMBA_CACHE_DIR"] == str(folder.path)
    assert choose_cache_folder() == folder


def test_an_open_folder_is_closed_again(cache: Path) -> None:
    first = choose_cache_folder().path
    assert first is not None
    first.chmod(0o777)
    os.environ["NUMBA_CACHE_DIR"] = "elsewhere"
    choose_cache_folder()
    assert stat.S_IMODE(first.stat().st_mode) == 0o700


def test_without_a_writable_folder_a_private_one_is_used_and_said(cache: Path) -> None:
    cache.parents[1].write_text("a file where the cache folder should be")
    folder = choose_cache_folder()
    assert folder.path is not None
    assert not folder.lasting
    assert folder.words is not None
    assert "compiled anew each time" in folder.words
    assert folder.path.is_dir()
    assert choose_cache_folder().path == folder.path
    shutil.rmtree(folder.path.parent)


def test_a_folder_of_somebody_else_is_not_used(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    choose_cache_folder()
    own = os.getuid()
    monkeypatch.setenv("NUMBA_CACHE_DIR", "elsewhere")
    monkeypatch.setattr(os, "getuid", lambda: own + 1)
    folder = choose_cache_folder()
    assert folder.path is not None
    assert folder.path.parent != cache
    assert folder.words is not None
    assert "belongs to somebody else" in folder.words
    shutil.rmtree(folder.path.parent)


def test_a_link_is_not_followed(cache: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    first = choose_cache_folder().path
    assert first is not None
    first.rename(tmp_path / "moved")
    first.symlink_to(tmp_path / "moved")
    monkeypatch.setenv("NUMBA_CACHE_DIR", "elsewhere")
    second = choose_cache_folder().path
    assert second is not None
    assert second.parent != cache
    shutil.rmtree(second.parent)


def test_any_edit_of_the_kernel_takes_another_folder(tmp_path: Path) -> None:
    (tmp_path / "deep").mkdir()
    (tmp_path / "laws.py").write_text("x = 1\n")
    (tmp_path / "deep" / "march.py").write_text("y = 1\n")
    before = solver_key(tmp_path, "numba 1")
    assert solver_key(tmp_path, "numba 1") == before
    assert solver_key(tmp_path, "numba 2") != before
    (tmp_path / "deep" / "march.py").write_text("y = 2\n")
    assert solver_key(tmp_path, "numba 1") != before


def test_nothing_is_to_be_prepared_where_nothing_is_compiled(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(solver_cache, "_compiler", lambda: None)
    folder = choose_cache_folder()
    assert folder.path is None
    assert folder.words is not None
    assert "uncompiled" in folder.words
    assert ready()


def test_ready_only_after_everything_was_compiled(cache: Path) -> None:
    assert not ready()
    folder = choose_cache_folder().path
    assert folder is not None
    (folder / "half.nbi").touch()
    assert not ready()
    (folder / "complete").touch()
    assert ready()


def test_choosing_does_not_load_the_compiler(cache: Path) -> None:
    code = "import sys; from stagebook.tui.solver_cache import ready; ready(); sys.exit('numba' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
