"""``stagebook import``: put a design document on the shelf."""

from __future__ import annotations

import sys
from argparse import ArgumentParser, Namespace

from ...engine.circuit.circuit import build
from ...engine.errors import EngineError
from ...storage.errors import NameTaken
from ..shown import visible
from .what import load_file, open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare FILE, ``--as`` and ``--store``."""
    parser.add_argument("file", metavar="FILE", help="a design document")
    parser.add_argument("--as", dest="name", metavar="NAME", help="its name on the shelf (default: its own)")
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Take the document in as a draft; one that cannot be computed too, with the reason on standard error."""
    design = load_file(asked.file)
    with open_store(asked, begins=True) as store:
        name = design.name if asked.name is None else asked.name
        try:
            draft = store.create(name, design)
        except NameTaken as taken:
            raise NameTaken(
                f"There is a design '{name}' on the shelf already: --as NAME takes it in as NAME."
            ) from taken
    print(f"{visible(draft.name)} is on the shelf, as a draft without a revision yet")
    try:
        build(design)
    except EngineError as fault:
        print(f"stagebook import: it cannot be computed as it stands: {visible(str(fault))}", file=sys.stderr)
    return 0
