"""The program in a pseudo-terminal of its own: keys go in, what it draws comes out, and it is killed at any time."""

from __future__ import annotations

import codecs
import fcntl
import json
import os
import pty
import select
import signal
import socket
import struct
import subprocess
import sys
import termios
import time
from pathlib import Path
from types import TracebackType
from typing import Any, Protocol, Self

from .terminal_lines import TerminalLines

PATIENCE = 120.0


def environment(home: Path) -> dict[str, str]:
    """A user without anything; nothing is compiled, as what is looked at here is not the solver."""
    return {
        "PATH": os.environ.get("PATH", "/usr/bin:/bin"),
        "PYTHONPATH": os.pathsep.join(sys.path),
        "HOME": str(home),
        "XDG_CACHE_HOME": str(home / "cache"),
        "TERM": "xterm-256color",
        "LANG": "C.UTF-8",
        "STAGEBOOK_UNCOMPILED": "1",
    }


class Running(Protocol):
    """A process that was started; as in subprocess."""

    pid: int

    def wait(self, timeout: float) -> int:
        """How it ended: its status, or the number of a signal with a minus."""

    def poll(self) -> int | None:
        """The same without waiting, None while it runs."""

    def kill(self) -> None:
        """SIGKILL."""


def executed(terminal: int, arguments: list[str], home: Path, *, controlling: bool = True) -> Running:
    """The program started as a shell does; ``controlling`` makes the terminal the one whose signals it gets."""
    return subprocess.Popen(
        [sys.executable, "-m", "stagebook.tui.app", *arguments],
        stdin=terminal,
        stdout=terminal,
        stderr=terminal,
        start_new_session=True,
        preexec_fn=_take_terminal if controlling else None,
        env=environment(home),
        cwd=home,
    )


def _take_terminal() -> None:
    fcntl.ioctl(0, termios.TIOCSCTTY, 0)


class Nursery:
    """Starts the program many times without loading it anew; see nursery.py."""

    def __init__(self, home: Path) -> None:
        self._home = home
        ours, theirs = socket.socketpair()
        with theirs:
            code = Path(__file__).with_name("nursery.py")
            self._process = subprocess.Popen(
                [sys.executable, code, str(theirs.fileno())],
                pass_fds=[theirs.fileno()],
                stdin=subprocess.DEVNULL,
                env=environment(home),
            )
        self._socket = ours
        self._lines = ours.makefile("rw")

    def close(self) -> None:
        """No more programs."""
        self._lines.close()
        self._socket.close()
        self._process.wait(PATIENCE)

    def __call__(self, terminal: int, arguments: list[str], home: Path) -> Running:
        order = {
            "order": "start",
            "terminal": os.ttyname(terminal),
            "arguments": arguments,
            "environment": environment(home),
            "folder": str(home),
        }
        return _Forked(self, self.ask(order))

    def ask(self, order: dict[str, Any]) -> int:
        """One order and its answer."""
        print(json.dumps(order), file=self._lines, flush=True)
        return int(self._lines.readline())


class _Forked:
    def __init__(self, nursery: Nursery, pid: int) -> None:
        self.pid = pid
        self._nursery = nursery
        self._ended: int | None = None

    def poll(self) -> int | None:
        """None while it runs: a process that has ended and was not asked for is a zombie (Linux, proc(5))."""
        if self._ended is None and Path(f"/proc/{self.pid}/stat").read_text().rsplit(")", 1)[1].split()[0] == "Z":
            self.wait(0)
        return self._ended

    def wait(self, timeout: float) -> int:
        """Waits for its end, however long."""
        if self._ended is None:
            self._ended = os.waitstatus_to_exitcode(self._nursery.ask({"order": "wait", "process": self.pid}))
        return self._ended

    def kill(self) -> None:
        """SIGKILL."""
        os.kill(self.pid, signal.SIGKILL)


class Program:
    """The program on a command line, with a terminal of 80x24. ``start`` is what starts it.

    ``attributes`` are the settings of the terminal before it began. What it draws is followed as one text: of every
    drawing the lines that it changed, as they then stand on the screen.
    """

    def __init__(self, *arguments: str | Path, home: Path, start: Any = executed, **how: bool) -> None:
        self._master, self._slave = pty.openpty()
        fcntl.ioctl(self._slave, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
        os.set_blocking(self._master, False)
        self.attributes = termios.tcgetattr(self._slave)
        self._decoder = codecs.getincrementaldecoder("utf-8")("replace")
        self._lines = TerminalLines()
        self.raw = ""
        self.text = ""
        self.process: Running = start(self._slave, [str(argument) for argument in arguments], home, **how)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        if self.process.poll() is None:
            self.process.kill()
            self.process.wait(PATIENCE)
        for handle in (self._master, self._slave):
            if handle >= 0:
                os.close(handle)

    def press(self, keys: str) -> None:
        """Keys as a terminal sends them."""
        os.write(self._master, keys.encode())

    def read(self, seconds: float = 0.0) -> str:
        """Everything drawn so far, after waiting so long for more."""
        if select.select([self._master], [], [], seconds)[0]:
            data = self._decoder.decode(os.read(self._master, 1 << 16))
            self.raw += data
            self.text += self._lines.feed(data)
        return self.text

    def until(self, *words: str, after: int = 0, seconds: float = PATIENCE) -> int:
        """Waits until one of these words is drawn, after a place in ``text``; returns the place behind them."""
        ends = time.monotonic() + seconds
        while True:
            found = [at + len(word) for word in words if (at := self.text.find(word, after)) >= 0]
            if found:
                return min(found)
            running = self.process.poll() is None
            assert time.monotonic() < ends, f"not drawn: {words}\n{self.text[after:][-3000:]}"
            before = len(self.raw)
            self.read(0.02)
            assert running or len(self.raw) > before, f"ended without drawing {words}\n{self.text[after:][-3000:]}"

    def kill(self) -> None:
        """As a power cut would, unless it has just ended by itself; then reads what was drawn before."""
        self.process.kill()
        assert self.process.wait(PATIENCE) in (-signal.SIGKILL, 0)
        self.drain()

    def drain(self) -> None:
        """Reads what is there to be read."""
        before = -1
        while len(self.raw) > before:
            before = len(self.raw)
            self.read()

    def ended(self, seconds: float = 30.0) -> int:
        """The exit status; what is drawn meanwhile is read."""
        ends = time.monotonic() + seconds
        while (status := self.process.poll()) is None:
            assert time.monotonic() < ends, f"still running after {seconds} s"
            if self._master >= 0:
                self.read(0.02)
            else:
                time.sleep(0.02)
        return status

    def close_terminal(self) -> None:
        """As when the window is closed: nobody holds the other side any more."""
        os.close(self._slave)
        os.close(self._master)
        self._master = self._slave = -1

    def settings_now(self) -> list[Any]:
        """The settings of the terminal as they are."""
        return termios.tcgetattr(self._slave)

    def processor_seconds(self) -> float:
        """Time of a processor used so far (Linux, proc(5), fields 14 and 15)."""
        fields = Path(f"/proc/{self.process.pid}/stat").read_text().rsplit(")", 1)[1].split()
        return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")
