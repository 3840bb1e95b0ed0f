"""``stagebook backup``: a consistent copy of the store, also while it is in use."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from ..shown import visible
from .what import open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare FILE and ``--store``."""
    parser.add_argument("file", metavar="FILE", help="where the copy goes; an earlier copy there is replaced")
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Write the copy: whole or not at all, and over nothing but an earlier copy."""
    with open_store(asked) as store:
        store.backup(asked.file)
        print(f"{visible(str(store.path))} is copied to {visible(asked.file)}")
    return 0
