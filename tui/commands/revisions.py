"""Several revisions of one design on the shelf, as commands that compare ask for them."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING

from ..shown import counted
from .refusal import CommandRefused
from .what import is_file, open_store, revision_number, shelf_arguments

if TYPE_CHECKING:
    from ...storage import Revision


def revision_arguments(parser: ArgumentParser, how_many: str) -> None:
    """Declare WHAT, ``how_many`` revisions (in words) and ``--store``."""
    parser.add_argument("what", metavar="WHAT", help="a design on the shelf")
    parser.add_argument(
        "revisions", metavar="N", type=revision_number, nargs="+", help=f"the numbers of {how_many} revisions"
    )
    shelf_arguments(parser)


def stored(asked: Namespace, least: int, most: int) -> tuple[str, list[Revision]]:
    """The design's name and the revisions that were asked for, in that order; ``least`` to ``most`` different ones."""
    numbers = asked.revisions
    if is_file(asked.what):
        raise CommandRefused(f"{asked.what} is a file, which has no revisions; name a design on the shelf")
    if not least <= len(numbers) <= most:
        wanted = f"{least}" if least == most else f"{least} to {most}"
        raise CommandRefused(
            f"{counted(len(numbers), 'revision')} where {wanted} are asked for; write their numbers, such as 1 2"
        )
    twice = next((number for number in numbers if numbers.count(number) > 1), None)
    if twice is not None:
        raise CommandRefused(f"revision {twice} stands twice; name different ones")
    with open_store(asked) as store:
        found = [store.revision(asked.what, number) for number in numbers]
        return store.draft(asked.what).name, found
