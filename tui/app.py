"""The program: reads the command line, runs one headless command or opens the shelf, and turns refusals into a line."""

from __future__ import annotations

import os
import sys
from argparse import ArgumentParser, Namespace
from collections.abc import Sequence
from importlib.metadata import PackageNotFoundError, version
from io import TextIOWrapper
from typing import Any, NoReturn

from ..engine.errors import EngineError
from .commands import COMMANDS, command
from .commands.refusal import CommandRefused
from .out_file import FileRefused

DONE, WRONG_INPUT, OWN_FAULT, STOPPED = 0, 2, 3, 130
"""Exit statuses; 1 is left to ``--strict``."""
LONGEST_LINE = 800
"""Characters of a refusal: what was typed is repeated in it and has no bounds."""


class _Parser(ArgumentParser):
    """Answers a wrong command line in one line."""

    def __init__(self, **how: Any) -> None:
        super().__init__(allow_abbrev=False, **how)

    def error(self, message: str) -> NoReturn:
        self.exit(WRONG_INPUT, f"{self.prog}: {_one_line(message)}; {self.prog} --help says what can be written\n")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the program with these arguments (default: those of the command line) and return its exit status."""
    if isinstance(sys.stdout, TextIOWrapper):
        sys.stdout.reconfigure(errors="replace")
    written = list(sys.argv[1:] if arguments is None else arguments)
    asked = _parser(written).parse_args(written)
    try:
        status = _open_shelf(asked) if asked.command is None else command(asked.command).run(asked)
        print(end="", flush=True)
    except BrokenPipeError:
        # Whoever read the output has seen enough.
        _drop_output()
        return DONE
    except OSError as error:
        if error.filename is not None:
            return _own_fault(asked, error)
        _drop_output()
        return _refuse(asked, f"the output cannot be written ({error.strerror}); send it elsewhere")
    except KeyboardInterrupt:
        return STOPPED
    except (EngineError, CommandRefused, FileRefused) as refusal:
        return _refuse(asked, str(refusal))
    except Exception as fault:
        return _own_fault(asked, fault)
    return status


def _parser(written: Sequence[str]) -> ArgumentParser:
    parser = _Parser(
        prog="stagebook",
        description="Design small discrete-transistor alarm and timer units. Without a command the shelf is opened.",
        epilog="WHAT is a design on the shelf, or a file if it ends in .json or has a / in it.",
    )
    parser.add_argument("--version", action="version", version=f"stagebook {_version()}")
    shelf_help = "the database file (otherwise STAGEBOOK_STORE, or the user's own)"
    parser.add_argument("--store", metavar="PATH", help=shelf_help)
    parsers = parser.add_subparsers(dest="command", metavar="COMMAND", parser_class=_Parser)
    for name, (_, line) in COMMANDS.items():
        one = parsers.add_parser(name, help=line, description=f"{line[0].upper()}{line[1:]}.")
        if name in written:
            command(name).arguments(one)
    return parser


def _version() -> str:
    try:
        return version("stagebook")
    except PackageNotFoundError:
        return "not installed"


def _open_shelf(asked: Namespace) -> int:
    from .opening import open_shelf

    return open_shelf(asked)


def _own_fault(asked: Namespace, fault: Exception) -> int:
    if os.environ.get("STAGEBOOK_TRACE"):
        raise fault
    _refuse(asked, f"a fault of the program itself ({type(fault).__name__}: {fault}); STAGEBOOK_TRACE=1 shows where")
    return OWN_FAULT


def _drop_output() -> None:
    """What is still buffered goes nowhere instead of into a traceback when the program ends."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _refuse(asked: Namespace, words: str) -> int:
    name = f"stagebook {asked.command}" if asked.command else "stagebook"
    print(f"{name}: {_one_line(words)}", file=sys.stderr)
    return WRONG_INPUT


def _one_line(words: str) -> str:
    """The words without anything that could break the line or steer the terminal, and cut where they go on and on."""
    if len(words) > LONGEST_LINE:
        words = f"{words[: LONGEST_LINE // 2]} ... {words[-LONGEST_LINE // 2 :]}"
    return "".join(c if c.isprintable() else " " if c.isspace() else "?" for c in words)


if __name__ == "__main__":
    sys.exit(main())
