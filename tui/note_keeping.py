"""Notes that are being written are kept on the disk soon after each key, away from the event loop."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Mapping

from ..storage.errors import StorageError

DELAY = 0.2
"""Seconds from a key until what is written is kept: what is typed meanwhile goes with it."""


class NoteKeeping:
    """Keeps the newest text of each design. All methods but :meth:`now` return at once.

    Args:
        keep: Puts what is written for a design on the disk; raises StorageError.
    """

    def __init__(self, keep: Callable[[str, Mapping[str, str]], None]) -> None:
        self.kept: dict[str, Mapping[str, str]] = {}
        """What lies on the disk, by design, as far as this sitting knows."""
        self.trouble: dict[str, str] = {}
        """Why the note of a design could not be kept, by design."""
        self._keep = keep
        self._change = threading.Condition()
        self._one_at_a_time = threading.Lock()
        self._pending: dict[str, dict[str, str]] = {}
        self._failed: dict[str, dict[str, str]] = {}
        self._thread: threading.Thread | None = None

    def soon(self, design: str, written: Mapping[str, str]) -> None:
        """Keeps this a little later."""
        with self._change:
            self._pending[design] = dict(written)
            if self._thread is None:
                # A daemon: leaving does not wait for it, it keeps the rest by itself.
                self._thread = threading.Thread(target=self._run, name="notes", daemon=True)
                self._thread.start()
            self._change.notify()

    def now(self) -> None:
        """Keeps what is not kept yet, and tries again what could not be."""
        with self._one_at_a_time:
            with self._change:
                wanted, self._pending, self._failed = self._failed | self._pending, {}, {}
            for design, written in wanted.items():
                try:
                    self._keep(design, written)
                except StorageError as error:
                    self.trouble[design] = str(error)
                    with self._change:
                        self._failed[design] = written
                else:
                    self.kept[design] = written
                    self.trouble.pop(design, None)

    def _run(self) -> None:
        while True:
            with self._change:
                while not self._pending:
                    self._change.wait()
            time.sleep(DELAY)
            self.now()
