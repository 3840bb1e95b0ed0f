"""``stagebook import``: put a design document on the shelf."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from ..shown import visible
from .what import load_file, open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare FILE, ``--as`` and ``--store``."""
    parser.add_argument("file", metavar="FILE", help="a design document")
    parser.add_argument("--as", dest="name", metavar="NAME", help="its name on the shelf (default: its own)")
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Take the document in as a draft."""
    design = load_file(asked.file)
    with open_store(asked, begins=True) as store:
        draft = store.create(design.name if asked.name is None else asked.name, design)
    print(f"{visible(draft.name)} is on the shelf, as a draft without a revision yet")
    return 0
