"""Polite signals and a terminal that goes away: the program leaves by itself, and leaves nothing behind.

Sequences of the terminal: xterm's control sequences (DECSET 1049 alternate screen, 25 cursor, 1000 mouse, 2004 paste).
"""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

import pytest

from stagebook.storage import Store, verify

from .bench_model import divider
from .program import Program, executed

pytestmark = pytest.mark.skipif(not Path("/proc/self/stat").exists(), reason="processes are watched as on Linux")


@pytest.fixture
def shelf(tmp_path: Path) -> Path:
    path = tmp_path / "shelf.sqlite3"
    with Store.open(path) as store:
        store.create("flood", divider("flood"))
    return path


def edited(program: Program) -> None:
    """To the bench, where a value is written and another one begun."""
    at = program.until("> flood")
    program.press("\r")
    at = program.until(" higher ", after=at)
    program.press("47k\r")
    at = program.until(" R1 47k ", after=at)
    program.press("33")


def a_second_of(program: Program) -> float:
    """Seconds of a processor used in one second."""
    before = program.processor_seconds()
    time.sleep(1)
    program.drain()
    return program.processor_seconds() - before


def kept(shelf: Path, home: Path) -> None:
    """The edit is there, the design is free, and no file of the program's but the store."""
    with Store.open(shelf) as store:
        assert store.draft("flood").design.part("R1").value == "47k"
        assert store.sitting("flood") is None
        assert verify(store) == []
    assert [file.name for file in shelf.parent.iterdir() if file.name.startswith(shelf.name)] == [shelf.name]


def of_session(session: int) -> list[int]:
    """The processes that live in a session (proc(5), field 6)."""
    found = []
    for place in Path("/proc").glob("[0-9]*"):
        try:
            fields = (place / "stat").read_text().rsplit(")", 1)[1].split()
        except OSError:
            continue
        if int(fields[3]) == session and fields[0] != "Z":
            found.append(int(place.name))
    return found


def test_a_polite_signal_restores_the_terminal(shelf: Path, tmp_path: Path) -> None:
    """Idle first: an open bench takes no processor."""
    with Program("--store", shelf, home=tmp_path) as program:
        edited(program)
        used = [a_second_of(program)]
        while used[-1] > 0.1 and len(used) < 20:  # the figures of the edit are still being computed
            used.append(a_second_of(program))
        assert used[-1] <= 0.1, used
        os.kill(program.process.pid, signal.SIGTERM)
        assert program.ended() == 0
        program.drain()
        for on, off in (("\x1b[?1049h", "\x1b[?1049l"), ("\x1b[?25l", "\x1b[?25h"), ("\x1b[?2004h", "\x1b[?2004l")):
            assert 0 <= program.raw.rindex(on) < program.raw.rindex(off)
        assert program.raw.rindex("\x1b[?1000h") < program.raw.rindex("\x1b[?1000l")
        assert program.settings_now() == program.attributes
        assert "Traceback" not in program.text
        assert of_session(program.process.pid) == []
    kept(shelf, tmp_path)


@pytest.mark.parametrize("moment", ["at the start", "amid a question"])
def test_a_hang_up_signal_is_enough(shelf: Path, tmp_path: Path, moment: str) -> None:
    with Program("--store", shelf, home=tmp_path) as program:
        if moment == "at the start":
            while "\x1b[?1049h" not in program.raw:
                program.read(0.02)
        else:
            edited(program)
            program.press("\x07s")
            program.until("Why does this revision exist?")
        os.kill(program.process.pid, signal.SIGHUP)
        assert program.ended() == 0
        program.drain()
        assert program.raw.rindex("\x1b[?1049h") < program.raw.rindex("\x1b[?1049l")
        assert program.settings_now() == program.attributes
        assert of_session(program.process.pid) == []


@pytest.mark.parametrize("controlling", [True, False], ids=["with its signal", "without a signal"])
def test_a_terminal_that_is_closed_ends_the_program(shelf: Path, tmp_path: Path, controlling: bool) -> None:
    """Without the signal it reads the end of the file for ever, which must not keep a processor busy."""
    with Program("--store", shelf, home=tmp_path, start=executed, controlling=controlling) as program:
        edited(program)
        program.drain()
        process = program.process.pid
        program.close_terminal()
        program.ended()
        assert of_session(process) == []
    kept(shelf, tmp_path)


@pytest.mark.parametrize("way", ["hang-up signal", "closed terminal", "kill"])
def test_a_note_that_is_being_written_is_offered_again(shelf: Path, tmp_path: Path, way: str) -> None:
    with Program("--store", shelf, home=tmp_path) as program:
        edited(program)
        program.press("\x07sthe horn is late\t33 s")
        program.until("33 s")
        if way == "kill":
            time.sleep(1.0)  # five times the delay with which it is kept
            program.kill()
        elif way == "closed terminal":
            program.close_terminal()
            program.ended()
        else:
            os.kill(program.process.pid, signal.SIGHUP)
            assert program.ended() == 0
    with Store.open(shelf) as store:
        assert store.half_note("flood") == {"line": "the horn is late", "symptom": "33 s"}
        assert store.revisions("flood") == []
    (file,) = shelf.parent.glob("shelf.sqlite3-note-*")
    assert file.stat().st_mode & 0o777 == 0o600
    with Program("--store", shelf, home=tmp_path) as program:
        at = program.until("> flood")
        program.press("\r")
        at = program.until(" s goes on with it", after=at)
        program.press("s")
        at = program.until(" the horn is late", after=at)
        program.press("\r")
        program.until("saved as r1", " waiting for the worst corners", after=at)
        program.press("i")
        program.until("saved as r1", after=at)
        program.press("\x11")
        assert program.ended() == 0
    with Store.open(shelf) as store:
        assert store.revisions("flood")[0].note.symptom == "33 s"
    assert not list(shelf.parent.glob("shelf.sqlite3-*"))
