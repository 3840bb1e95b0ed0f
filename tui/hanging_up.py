"""A terminal that goes away: a dropped line or a closed window. The program leaves at once and by itself.

Every edit is on the disk already, so there is nothing to save and nobody left to show anything to.
"""

from __future__ import annotations

import os
import select
import threading
import time
from collections.abc import Callable
from contextlib import suppress

GRACE = 3.0
"""Seconds for leaving in order after the terminal went away."""


def watch(terminal: int, leave: Callable[[], object]) -> None:
    """Call ``leave``, from another thread, when the terminal goes away; end the process if it lives on all the same.

    The signal for it, SIGHUP, comes only to those who have it as their controlling terminal and is often ignored (as
    under nohup); a program that goes on reading gets the end of the file for ever, at the cost of a whole processor.

    Args:
        terminal: Its file descriptor.
        leave: Begins to leave and returns.
    """
    if hasattr(select, "poll"):
        threading.Thread(target=_watch, args=(terminal, leave), name="hanging-up", daemon=True).start()


def let_go() -> None:
    """Turn what is still read and written to nothing: writing to a terminal that is gone fails, in any thread."""
    nothing = os.open(os.devnull, os.O_RDWR)
    for stream in (0, 1, 2):
        os.dup2(nothing, stream)
    os.close(nothing)


def _watch(terminal: int, leave: Callable[[], object]) -> None:
    waiting = select.poll()
    waiting.register(terminal, 0)  # hanging up is told without being asked for
    gone = False
    while not gone:
        (_, event), *_ = waiting.poll()
        if event & select.POLLNVAL:  # such a terminal cannot be watched
            return
        gone = bool(event & (select.POLLHUP | select.POLLERR))
    let_go()
    with suppress(RuntimeError):  # it is being left already
        leave()
    time.sleep(GRACE)
    os._exit(1)
