"""Threads that compute while the interface stays live: only the newest job matters, at the lowest priority."""

from __future__ import annotations

import os
import threading
from collections.abc import Callable
from contextlib import suppress

Job = Callable[[Callable[[], bool]], None]


class LatestOnly:
    """One thread with one place to wait in: a newer job cancels the running one and replaces the waiting one.

    A job is called with a function that says whether it has become stale; it looks often and returns early.
    It reports by posting messages and handles its own errors. ``idle`` is set while nothing runs or waits.
    """

    def __init__(self, name: str) -> None:
        self.idle = threading.Event()
        self.idle.set()
        self._name = name
        self._change = threading.Condition()
        self._next: Job | None = None
        self._stale = threading.Event()
        self._closed = False
        self._thread: threading.Thread | None = None

    def submit(self, job: Job) -> None:
        """Runs this job as soon as the running one has stopped. Returns at once."""
        with self._change:
            self._stale.set()
            self._next = job
            self.idle.clear()
            if self._thread is None:
                # A daemon, so that leaving never waits for a computation to notice that it is stale.
                self._thread = threading.Thread(target=self._run, name=self._name, daemon=True)
                self._thread.start()
            self._change.notify()

    def cancel(self) -> None:
        """Makes the running job stale and forgets the waiting one."""
        with self._change:
            self._stale.set()
            self._next = None

    def close(self) -> None:
        """Cancels and lets the thread end."""
        with self._change:
            self._closed = True
            self._stale.set()
            self._next = None
            self._change.notify()

    def _run(self) -> None:
        _give_way()
        while True:
            with self._change:
                while self._next is None and not self._closed:
                    self.idle.set()
                    self._change.wait()
                if self._closed:
                    self.idle.set()
                    return
                job, self._next = self._next, None
                self._stale = stale = threading.Event()
            if job is not None:
                job(stale.is_set)


def _give_way() -> None:
    """Lowest priority for this thread, where the system allows it: a keystroke is answered first."""
    if hasattr(os, "setpriority"):
        with suppress(OSError):
            os.setpriority(os.PRIO_PROCESS, threading.get_native_id(), 19)
