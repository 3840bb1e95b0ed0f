"""Opening the shelf on the screen."""

from __future__ import annotations

import os
import sys
import warnings
from argparse import Namespace

from .commands.refusal import CommandRefused
from .commands.what import open_store
from .terminal import refusal


def open_shelf(asked: Namespace) -> int:
    """Run the interface on the shelf that the command line names until it is left. Returns the exit status.

    Raises CommandRefused where this terminal cannot show it or the store cannot be opened.
    """
    check_terminal()
    with open_store(asked, _terminal(), begins=True) as store:
        # Imported here: no headless command waits for the screens to load.
        from .solver import own_solver
        from .stagebook_app import StagebookApp

        app = StagebookApp(store, own_solver())
        # A terminal that changes its size while it is left has no loop any more that could hear of it.
        warnings.filterwarnings("ignore", "coroutine 'MessagePump._post_message' was never awaited", RuntimeWarning)
        app.run()
        return app.return_code or 0


def _terminal() -> str:
    """The terminal's name as ``who`` shows it."""
    try:
        return os.ttyname(sys.stdin.fileno()).removeprefix("/dev/")
    except (OSError, AttributeError, ValueError):
        return "a terminal"


def check_terminal() -> None:
    """Raise CommandRefused where this terminal cannot show the interface."""
    streams = (sys.stdin, sys.stdout, sys.stderr)
    words = refusal(os.environ, all(stream is not None and stream.isatty() for stream in streams))
    if words:
        raise CommandRefused(words)
