"""Starts the program again and again, each time as a process of its own with its own terminal.

Loading its modules takes most of a second; here they are loaded once, and every start is a fork of that. Run with the
number of a socket, over which orders come as lines of JSON: ``start`` answers with a process id, ``wait`` with how the
process ended. What is started is ``stagebook.tui.app.main`` on the command line that was ordered.
"""

from __future__ import annotations

import json
import os
import socket
import sys
from importlib import import_module
from typing import Any

LOADED = (
    "tui.stagebook_app",
    "tui.opening",
    "tui.solver",
    "tui.commands.backup",
    "tui.commands.take_in",
    "storage.migration",
    "engine.studies.margins",
    "engine.studies.causes",
)


def main() -> None:
    for name in LOADED:
        import_module(f"stagebook.{name}")
    import_module("textual.drivers.linux_driver")
    with socket.socket(fileno=int(sys.argv[1])) as orders, orders.makefile("rw") as lines:
        for line in lines:
            order = json.loads(line)
            answer = _start(order) if order["order"] == "start" else os.waitpid(order["process"], 0)[1]
            print(answer, file=lines, flush=True)


def _start(order: dict[str, Any]) -> int:
    process = os.fork()
    if process:
        return process
    try:
        os.closerange(3, 64)
        os.setsid()
        terminal = os.open(order["terminal"], os.O_RDWR)  # the first that a session opens becomes its own
        for stream in (0, 1, 2):
            os.dup2(terminal, stream)
        os.close(terminal)
        sys.stdin = sys.__stdin__ = os.fdopen(0, closefd=False)  # type: ignore[misc]
        sys.stdout = sys.__stdout__ = os.fdopen(1, "w", closefd=False)  # type: ignore[misc]
        sys.stderr = sys.__stderr__ = os.fdopen(2, "w", closefd=False)  # type: ignore[misc]
        os.environ.update(order["environment"])
        os.chdir(order["folder"])
        sys.argv = ["stagebook", *order["arguments"]]
        status = import_module("stagebook.tui.app").main()
        sys.stdout.flush()
    except SystemExit as leaving:
        status = int(leaving.code or 0)
    except BaseException:
        import traceback

        traceback.print_exc()
        status = 99
    os._exit(status)


if __name__ == "__main__":
    main()
