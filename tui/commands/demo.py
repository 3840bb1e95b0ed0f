"""``stagebook demo``: the demo designs, each with its history, on the shelf."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from ..opening import check_terminal, open_shelf
from .printing import print_words
from .what import open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare ``--only-store`` and ``--store``."""
    parser.add_argument("--only-store", action="store_true", help="put them there without opening the shelf")
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Store the demo designs that are missing, with the margins they came with; what is there stays as it is."""
    if not asked.only_store:
        check_terminal()
    with open_store(asked, begins=True) as store:
        from ..demo import put_on_shelf

        names = put_on_shelf(store)
    if not asked.only_store:
        return open_shelf(asked)
    if names:
        print_words(f"On the shelf now: {', '.join(names)}")
    else:
        print_words("The demo designs are on the shelf already; they were left as they are.")
    return 0
