"""Where the compiled solver is kept. The rules are our own."""

from __future__ import annotations

import json
import os
import shutil
import stat
import subprocess
import sys
from pathlib import Path
from typing import NamedTuple

import pytest

from stagebook.engine.kernel import machine_code
from stagebook.tui import solver_cache
from stagebook.tui.solver_cache import choose_cache_folder, ready, solver_key

pytest.importorskip("numba")
FOLDER = choose_cache_folder().path
assert FOLDER is not None
COMPILED = (FOLDER / "solver.code").read_bytes()


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


def test_ready_only_after_everything_was_compiled(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(machine_code, "_loaded", None)
    assert not ready()
    folder = choose_cache_folder().path
    assert folder is not None
    (folder / "solver.code").write_bytes(COMPILED[:-1])
    assert not ready()
    (folder / "solver.code").write_bytes(COMPILED)
    assert ready()


def test_choosing_does_not_load_the_compiler(cache: Path) -> None:
    code = "import sys; from stagebook.tui.solver_cache import ready; ready(); sys.exit('numba' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


USER = """
import json, sys
from pathlib import Path

from stagebook.tui import solver_cache

folder = solver_cache.choose_cache_folder()
found = solver_cache.ready()
if not found:
    from stagebook.engine.kernel import compiling

    compiling.compiled_code = lambda: Path(sys.argv[1]).read_bytes()  # the tests cannot wait for the compiler again
    solver_cache.prepare_here()

from stagebook.engine.design.document import Design
from stagebook.engine.studies.waves import waves

design = Design.load(Path(sys.argv[2]).read_bytes())
last = float(waves(design, "alarm", ["n"]).values[-1, 0])
kept = [path.name for path in folder.path.iterdir()]
print(json.dumps([last, str(folder.path), folder.lasting, folder.words, kept, found, "numba" in sys.modules]))
"""
DIVIDER = {
    "stagebook": 1,
    "name": "divider",
    "conditions": {"supply": {"nominal": "9 V"}},
    "stages": [
        {
            "name": "divider",
            "parts": [
                {"ref": "R1", "kind": "resistor", "pins": {"a": "supply", "b": "n"}, "value": "1k"},
                {"ref": "R2", "kind": "resistor", "pins": {"a": "n", "b": "0V"}, "value": "2k"},
            ],
        }
    ],
    "sequences": {"alarm": {"ends": "1 s"}},
}


class Found(NamedTuple):
    last: float
    path: str
    lasting: bool
    words: str | None
    kept: list[str]
    ready: bool
    compiler: bool


def using(tmp_path: Path, home: str) -> Found:
    """What a process with this cache home computes, and with what: see the last line of ``USER``."""
    script, compiled, design = (tmp_path / name for name in ("user.py", "compiled.code", "divider.json"))
    script.write_text(USER)
    compiled.write_bytes(COMPILED)
    design.write_text(json.dumps(DIVIDER))
    environment = {**os.environ, "XDG_CACHE_HOME": home, "NUMBA_CACHE_DIR": "elsewhere"}
    environment.pop("STAGEBOOK_UNCOMPILED", None)
    done = subprocess.run(
        [sys.executable, "-P", str(script), str(compiled), str(design)],
        env=environment, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    return Found(*json.loads(done.stdout))


def test_a_fresh_folder_is_filled_and_read_the_next_time(cache: Path, tmp_path: Path) -> None:
    first, second = (using(tmp_path, str(cache.parents[1])) for _ in range(2))
    for found in (first, second):
        assert found.last == pytest.approx(6.0, rel=1e-3)  # V, what two thirds of the supply are
        assert Path(found.path).parent == cache
        assert (found.lasting, found.words) == (True, None)
        assert found.kept == ["solver.code"]
    assert (first.ready, second.ready) == (False, True)
    assert not second.compiler


@pytest.mark.skipif(not Path("/proc/self").exists(), reason="no folder here that nobody may write, root included")
def test_a_read_only_folder_is_done_without(tmp_path: Path) -> None:
    # Nobody makes a folder in /proc: the permissions of a folder of our own would not stop root.
    found = using(tmp_path, "/proc")
    assert found.last == pytest.approx(6.0, rel=1e-3)
    assert not found.lasting
    assert found.words is not None
    assert "/proc/stagebook" in found.words
    assert "cannot be written" in found.words
    assert found.kept == ["solver.code"]
    assert not Path(found.path).exists()  # private, and gone with its process
