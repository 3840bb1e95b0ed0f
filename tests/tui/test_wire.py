"""What goes over the line: a quiet wire, and a terminal that is given back on every way out.

Limits are this project's own (style sheet, "Terminals"): about 1.5 kB a keystroke, nothing while idle.
"""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import sys
import termios
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from stagebook.storage import Store

PROGRAM = Path(__file__).with_name("program.py")
QUIET = 0.4


class Line:
    """The program at the other end of a pseudo terminal of 80x24."""

    def __init__(self, path: Path, **environment: str) -> None:
        self.path = path
        self.process, self.end = pty.fork()
        if self.process == 0:
            known = {**os.environ, "TERM": "xterm-256color", "PYTHONPATH": os.pathsep.join(sys.path), **environment}
            os.execve(sys.executable, [sys.executable, str(PROGRAM), str(path)], known)
        fcntl.ioctl(self.end, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))

    def read(self, seconds: float, *, until: bytes = b"") -> bytes:
        """What comes until ``until`` has come, or until nothing came for ``seconds``."""
        found, last = b"", time.monotonic()
        while time.monotonic() - last < seconds:
            if select.select([self.end], [], [], 0.02)[0]:
                try:
                    found += os.read(self.end, 65536)
                except OSError:
                    break
                last = time.monotonic()
                if until and until in found:
                    break
        return found

    def press(self, keys: bytes, *, until: bytes = b"") -> bytes:
        """Sends keys in one packet; returns what came until the line was quiet, at least until ``until``."""
        os.write(self.end, keys)
        return (self.read(30, until=until) if until else b"") + self.read(QUIET)

    def ended(self) -> int | None:
        """The exit status once the program has ended; None if it still runs after ten seconds."""
        began = time.monotonic()
        while time.monotonic() - began < 10:
            found, status = os.waitpid(self.process, os.WNOHANG)
            if found:
                self.process = 0
                return os.waitstatus_to_exitcode(status)
            self.read(0.05)
        return None

    def close(self) -> None:
        if self.process:
            os.kill(self.process, signal.SIGKILL)
            os.waitpid(self.process, 0)


@pytest.fixture
def line(tmp_path: Path) -> Iterator[Line]:
    made = Line(tmp_path / "shelf.sqlite3")
    made.read(30, until=b"help")
    made.read(QUIET)
    yield made
    made.close()


def test_the_wire_is_quiet(line: Line) -> None:
    line.press(b"\r", until=b"spread of 40 lanes")
    sizes = {key: len(line.press(key)) for key in (b"\x1b[C", b"\x1b[D", b"\x1b[B", b"\x1b[A", b"\t", b"4", b"7", b"k")}
    assert {key: size for key, size in sizes.items() if size > 1700} == {}
    assert line.read(2.0) == b""


def test_keys_that_arrive_in_one_packet_keep_their_order(line: Line) -> None:
    line.press(b"\r100k\r..us\x1b")
    os.write(line.end, b"sa whole note\rh")
    assert b"from r1" in line.read(10, until=b"from r1")
    with Store.open(line.path) as store:
        assert store.revision("flood").note.line == "a whole note"
        assert store.revision("flood").design.part("R1").value == "110k"


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP])
def test_a_polite_kill_gives_the_terminal_back(line: Line, number: signal.Signals) -> None:
    line.press(b"\r", until=b"draft on r1")
    line.press(b"100k\r", until=b", 1 edit")
    os.kill(line.process, number)
    said = line.read(5, until=b"\x1b[?1049l")
    assert b"\x1b[?1049l" in said
    assert line.ended() == 0
    assert b"Traceback" not in said
    with Store.open(line.path) as store:
        assert store.draft("flood").design.part("R1").value == "100k"


def test_a_dropped_line_loses_nothing(line: Line) -> None:
    line.press(b"\r", until=b"draft on r1")
    line.press(b"100k\r", until=b", 1 edit")
    os.close(line.end)
    began = time.monotonic()
    while time.monotonic() - began < 10 and not os.waitpid(line.process, os.WNOHANG)[0]:
        time.sleep(0.02)
    line.process = 0
    assert time.monotonic() - began < 10
    with Store.open(line.path) as store:
        assert store.draft("flood").design.part("R1").value == "100k"


def test_no_colour_is_sent_when_none_is_wanted(tmp_path: Path) -> None:
    # NO_COLOR convention; SGR codes after ECMA-48: 30-37, 40-47, 90-107 and 38/48 set a colour, 39 and 49 take it back.
    line = Line(tmp_path / "shelf.sqlite3", NO_COLOR="1")
    try:
        said = line.read(30, until=b"help") + line.read(QUIET) + line.press(b"\r")
    finally:
        line.close()
    codes = [code for part in said.split(b"\x1b[")[1:] if b"m" in part for code in part.split(b"m")[0].split(b";")]
    numbers = {int(code) for code in codes if code.isdigit()}
    assert 7 in numbers
    assert not {n for n in numbers if 30 <= n <= 38 or 40 <= n <= 48 or 90 <= n <= 107}
