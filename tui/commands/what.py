"""Which design a command is about: one on the shelf, in a revision or as the draft stands, or a file."""

from __future__ import annotations

import sys
from argparse import SUPPRESS, ArgumentParser, ArgumentTypeError, Namespace
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from ...engine.design.document import Design
from ...engine.design.intake import MOST_BYTES
from ...engine.errors import DesignError
from ..shown import visible
from .refusal import CommandRefused

if TYPE_CHECKING:
    from ...storage import Store


@dataclass(frozen=True, slots=True)
class Subject:
    """The design that a command is about. ``revision`` is None for a file and for a draft, ``file`` on the shelf."""

    name: str
    design: Design
    revision: int | None
    file: str | None = None
    edits: int = 0
    """Edits of the draft that are not in the revision, where that one was not asked for by its number."""

    @property
    def title(self) -> str:
        """The name with the revision, as headings show it."""
        return self.name if self.revision is None else f"{self.name} r{self.revision}"


def shelf_arguments(parser: ArgumentParser) -> None:
    """Declare ``--store``, which may stand before or behind the command."""
    parser.add_argument("--store", metavar="PATH", default=SUPPRESS, help="the database file")


def subject_arguments(parser: ArgumentParser) -> None:
    """Declare WHAT, ``--revision``, ``--draft`` and ``--store``."""
    parser.add_argument(
        "what", metavar="WHAT", help="a design on the shelf, or a file (ends in .json or has a / in it)"
    )
    which = parser.add_mutually_exclusive_group()
    which.add_argument("--revision", metavar="N", type=revision_number, help="a revision (default: the newest one)")
    which.add_argument("--draft", action="store_true", help="the draft instead of a revision")
    shelf_arguments(parser)


def revision_number(text: str) -> int:
    """A revision number as the command line writes it: ``3`` or ``r3``."""
    digits = text.removeprefix("r")
    if not (digits.isascii() and digits.isdecimal() and len(digits) < 10 and int(digits) > 0):
        raise ArgumentTypeError(f"{text!r} is not a revision; write its number, such as 3")
    return int(digits)


def is_file(what: str) -> bool:
    """Whether WHAT names a file and not a design on the shelf."""
    return what.endswith(".json") or "/" in what


def find(asked: Namespace) -> Subject:
    """The design that the arguments of :func:`subject_arguments` name. A design never saved yet stands as its draft."""
    if is_file(asked.what):
        if asked.draft or asked.revision is not None:
            raise CommandRefused(f"{asked.what} is a file, which has no revisions; leave out --revision and --draft")
        design = load_file(asked.what)
        return Subject(design.name, design, None, asked.what)
    with open_store(asked) as store:
        draft = store.draft(asked.what)
        if asked.draft or (asked.revision is None and draft.base_revision is None):
            return Subject(draft.name, draft.design, None)
        revision = store.revision(asked.what, asked.revision)
        edits = 0 if asked.revision is not None or draft.design == revision.design else draft.edits
        return Subject(draft.name, revision.design, revision.number, edits=edits)


def load_file(path: str) -> Design:
    """The design document in a file. Refusals name the file."""
    try:
        with open(path, "rb") as file:
            document = file.read(MOST_BYTES + 1)
    except (OSError, ValueError) as error:
        raise CommandRefused(f"{path} cannot be read ({_reason(error)}); name a design document") from error
    try:
        return Design.load(document)
    except DesignError as refusal:
        raise CommandRefused(f"{path}: {refusal}") from refusal


@contextmanager
def open_store(asked: Namespace, terminal: str = "", *, begins: bool = False) -> Iterator[Store]:
    """The shelf that ``--store`` or the environment names. What the store refuses is refused by the command.

    ``terminal`` is that of the screens, which say by themselves when the store can only be looked at. Only what
    ``begins`` a store makes one of a name given by hand: a slip in the name would read as an empty shelf.
    """
    # Imported here: the database machinery takes longer to load than a command on a file needs altogether.
    from ...storage import StorageError, Store, at_home, default_path, is_missing

    if asked.store is not None and not begins and is_missing(at_home(asked.store)):
        raise CommandRefused(
            f"there is no store {asked.store}; name one that is there, or begin it with import or demo"
        )
    try:
        with Store.open(default_path() if asked.store is None else Path(asked.store), terminal=terminal) as store:
            if store.later and not terminal:
                print(f"stagebook: {visible(store.why_read_only)}", file=sys.stderr)
            yield store
    except StorageError as refusal:
        raise CommandRefused(str(refusal)) from refusal


def _reason(error: Exception) -> str:
    return getattr(error, "strerror", None) or str(error)
