"""``stagebook inspect``: whether the store is what was saved in it, and what there is to know about it."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from .printing import json_argument, print_json, print_words
from .refusal import CommandRefused
from .what import open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare ``--rescue``, ``--json`` and ``--store``."""
    parser.add_argument(
        "--rescue", metavar="FILE", help="write what can be read of a damaged store to a store of its own"
    )
    json_argument(parser)
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Check file, rows, triggers and every hash; status 1 if something does not match."""
    if asked.rescue is not None:
        return _rescue(asked)
    with open_store(asked) as store:
        # Imported here: no other command needs it.
        from ...storage import inspect

        found, later = inspect(store), store.later
    if asked.json:
        print_json(
            {
                "store": str(found.path),
                "schema": found.schema,
                "size": found.size,
                "log": found.log_size,
                "designs": found.designs,
                "revisions": found.revisions,
                "edits": found.edits,
                "problems": list(found.problems),
                "advice": list(found.advice),
            }
        )
        return 1 if found.problems else 0
    print_words(f"{found.path}: tables of version {found.schema}, {found.size} bytes, log of {found.log_size} bytes")
    print_words(f"designs: {found.designs}, revisions: {found.revisions}, edits: {found.edits}")
    for problem in found.problems:
        print_words(f"X {problem}", hanging=2)
    for line in found.advice:
        print_words(f"- {line}", hanging=2)
    if later and not found.problems:
        print_words(
            "The file is whole. Whether what a later Stagebook keeps in it is as it was saved was not looked at."
        )
    elif not found.problems:
        print_words("Everything is as it was saved: file, rows, triggers, every hash and the seal.")
    return 1 if found.problems else 0


def _rescue(asked: Namespace) -> int:
    """Write the rescued store; status 1 if not all came over as it was saved."""
    from ...storage import StorageError, at_home, default_path, rescue

    try:
        found = rescue(default_path() if asked.store is None else at_home(asked.store), at_home(asked.rescue))
    except StorageError as refusal:
        raise CommandRefused(str(refusal)) from refusal
    if asked.json:
        print_json(
            {
                "store": str(found.path),
                "designs": found.designs,
                "revisions": found.revisions,
                "edits": found.edits,
                "lost": list(found.lost),
            }
        )
        return 1 if found.lost else 0
    print_words(
        f"{found.path} holds what could be read; designs: {found.designs}, revisions: {found.revisions}, "
        f"edits: {found.edits}"
    )
    for line in found.lost:
        print_words(f"X {line}", hanging=2)
    if not found.lost:
        print_words("Everything is as it was saved.")
    return 1 if found.lost else 0
