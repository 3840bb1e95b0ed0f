"""A program in a terminal of 80x24, driven as a person would: keys are sent, the screen is read until it shows."""

from __future__ import annotations

import itertools
import os
import re
import signal
import subprocess
import time
from collections.abc import Callable, Mapping
from pathlib import Path

PATIENCE = 60.0
LOOK_EVERY = 0.05
# tmux itself now and then misses how a program ended: a shell notes it, and the process id, in files beside $0.
_RUN = """sh -c 'echo $$ >"$0.process"; exec "$@"' "$0" "$@"; echo $? >"$0.part"; mv "$0.part" "$0.status" """
_numbers = itertools.count(1)


class Terminal:
    """A tmux server of its own with one pane. ``keys`` counts the keystrokes sent; ``notes`` is an empty folder."""

    def __init__(self, environment: Mapping[str, str], notes: Path, *command: str | Path) -> None:
        self._server = f"stagebook-test-{os.getpid()}-{next(_numbers)}"
        self._note = notes / self._server
        self.keys = 0
        clean = ("env", "-i", "TERM=screen-256color", *(f"{name}={value}" for name, value in environment.items()))
        shell = (*clean, "sh", "-c", _RUN, str(self._note))
        self._tmux("new-session", "-d", "-x", "80", "-y", "24", *shell, *map(str, command))

    @property
    def screen(self) -> str:
        """What stands on the screen, 24 lines."""
        return self._tmux("capture-pane", "-p")

    def press(self, *keys: str) -> None:
        """One keystroke each, by tmux's names: ``Enter``, ``Right``, ``q``."""
        self.keys += len(keys)
        self._tmux("send-keys", *keys)

    def write(self, text: str) -> None:
        """One keystroke a character."""
        self.keys += len(text)
        self._tmux("send-keys", "-l", text)

    def until(self, shows: str | Callable[[str], bool], seconds: float = PATIENCE) -> str:
        """The screen once it shows what is awaited: a regular expression, or whatever a function finds in it."""
        holds = shows if callable(shows) else lambda screen: re.search(shows, screen) is not None
        ends = time.monotonic() + seconds
        while not holds(screen := self.screen):
            assert time.monotonic() < ends, f"not shown within {seconds} s: {shows}\n{screen}"
            time.sleep(LOOK_EVERY)
        return screen

    def ended(self, seconds: float = PATIENCE) -> int:
        """The exit status once the program has ended, as a shell tells it: 128 and its number after a signal."""
        status = self._note.with_suffix(".status")
        ends = time.monotonic() + seconds
        while not status.exists():
            assert time.monotonic() < ends, f"still running after {seconds} s\n{self.screen}"
            time.sleep(LOOK_EVERY)
        return int(status.read_text())

    def kill(self) -> None:
        """Ends the program as a power cut would."""
        os.kill(int(self._note.with_suffix(".process").read_text()), signal.SIGKILL)

    def close(self) -> None:
        """Ends the terminal, if the program has not done so by ending."""
        subprocess.run(["tmux", "-L", self._server, "kill-server"], capture_output=True, check=False)

    def _tmux(self, *command: str) -> str:
        full = ["tmux", "-L", self._server, "-f", os.devnull, *command]
        return subprocess.run(full, capture_output=True, text=True, check=True, timeout=PATIENCE).stdout
