"""What commands say while somebody waits: once, on standard error, and never before a refusal."""

from __future__ import annotations

import io
import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from stagebook.engine.errors import CircuitError
from stagebook.tui import solver_cache
from stagebook.tui.commands import waiting
from stagebook.tui.solver_cache import CacheFolder, choose_cache_folder

Run = Callable[..., tuple[int, str, str]]
Refused = Callable[..., str]

PREPARING = "stagebook: preparing the solver, once on this machine: about 20 s\n"


@pytest.fixture
def prepared(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """A machine on which nothing was compiled yet; holds a word for every preparation."""
    done: list[str] = []
    monkeypatch.setattr(solver_cache, "ready", lambda: bool(done))
    monkeypatch.setattr(solver_cache, "prepare_here", lambda: done.append("prepared"))
    return done


def test_preparing_is_said_once_and_not_on_standard_output(stagebook: Run, written: Path, prepared: list[str]) -> None:
    status, out, err = stagebook("margins", written, "--lanes", 0, "--json")
    assert (status, err) == (0, PREPARING)
    assert json.loads(out)["design"] == "buzzer"
    assert stagebook("margins", written, "--lanes", 0, "--json")[2] == ""
    assert prepared == ["prepared"]


def test_waves_and_causes_say_it_too(
    stagebook: Run, shelve: Callable[..., None], written: Path, prepared: list[str]
) -> None:
    assert stagebook("waves", written, "--csv", "o.csv") == (0, "", PREPARING)
    prepared.clear()
    shelve({}, {"R1": "2k2"})
    assert stagebook("causes", "buzzer", 1, 2)[2] == PREPARING
    prepared.clear()
    assert stagebook("compare", "buzzer", 1, 2)[2] == ""


@pytest.mark.parametrize(
    "arguments",
    [
        ("waves", "buzzer.json", "--csv", "o.csv", "--nets", "nothing"),
        ("waves", "buzzer.json", "--csv", "o.csv", "--sequence", "dawn"),
        ("waves", "buzzer.json", "--csv", "o.csv", "--at", "9 s"),
        ("waves", "buzzer.json", "--csv", "."),
        ("margins", "empty.json"),
    ],
)
def test_nobody_waits_for_a_refusal(
    refused: Refused, written: Path, prepared: list[str], arguments: tuple[str, ...]
) -> None:
    (written.parent / "empty.json").write_text('{"stagebook": 1, "name": "x", "sequences": {"alarm": {"ends": "1 s"}}}')
    refused(*arguments)
    assert prepared == []


def test_a_compiled_solver_that_cannot_be_kept_is_one_line(
    stagebook: Run, written: Path, prepared: list[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def full() -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(solver_cache, "prepare_here", full)
    status, out, err = stagebook("margins", written)
    assert (status, out) == (2, "")
    assert err.startswith(PREPARING)
    assert "No space left on device" in err
    assert len(err.splitlines()) == 2


def test_a_folder_for_this_run_only_is_told(
    stagebook: Run, written: Path, prepared: list[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    folder = CacheFolder(tmp_path, False, "/x cannot be written (why): the solver is compiled anew each time")
    monkeypatch.setattr(solver_cache, "choose_cache_folder", lambda: folder)
    said = stagebook("margins", written, "--lanes", 0)[2]
    assert said == "stagebook: /x cannot be written (why): the solver is compiled anew each time: about 20 s\n"


def test_a_compiled_solver_is_loaded_before_anything_asks_for_the_compiler(written: Path, tmp_path: Path) -> None:
    compiled = choose_cache_folder().path
    if compiled is None:
        pytest.skip("nothing is compiled here")
    home = tmp_path / "cache"
    (home / "stagebook" / "solver" / compiled.name).mkdir(mode=0o700, parents=True)
    shutil.copy(compiled / "solver.code", home / "stagebook" / "solver" / compiled.name)
    environment = {key: value for key, value in os.environ.items() if key != "NUMBA_CACHE_DIR"}
    code = "import sys; from stagebook.tui.app import main; status = main(sys.argv[1:]); print('numba' in sys.modules)"
    done = subprocess.run(
        [sys.executable, "-c", code, "margins", str(written), "--lanes", "0"],
        env={**environment, "XDG_CACHE_HOME": str(home)},
        capture_output=True,
        text=True,
        check=True,
    )
    assert done.stdout.splitlines()[-1] == "False"
    assert done.stderr == ""


class Terminal(io.StringIO):
    """A standard error that somebody watches."""

    def isatty(self) -> bool:
        return True


def test_progress_keeps_one_line_and_takes_it_away(monkeypatch: pytest.MonkeyPatch) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    clock = iter(range(100))
    monkeypatch.setattr(waiting, "monotonic", lambda: next(clock))

    def refused_in_the_middle() -> None:
        with waiting.progress("margins: lane") as show:
            show(1, 9)
            show(2, 9)
            raise CircuitError("no")

    with pytest.raises(CircuitError):
        refused_in_the_middle()
    written = terminal.getvalue()
    assert "margins: lane 1 of 9" in written
    assert "\n" not in written
    assert written.endswith("\r\x1b[K")


def test_progress_is_silent_where_nobody_watches(monkeypatch: pytest.MonkeyPatch) -> None:
    elsewhere = io.StringIO()
    monkeypatch.setattr(sys, "stderr", elsewhere)
    clock = iter(range(100))
    monkeypatch.setattr(waiting, "monotonic", lambda: next(clock))
    with waiting.progress("margins: lane") as show:
        show(1, 9)
    assert elsewhere.getvalue() == ""
