"""``stagebook drawer``: the parts made of datasheet points; one of them in full, or a new one from a file."""

from __future__ import annotations

import json
from argparse import ArgumentParser, Namespace
from typing import Any

from ...engine.parts.part_data import part_data
from ...storage.values import MadePart
from ..drawer_text import says
from .printing import json_argument, print_json, print_table, print_words
from .refusal import CommandRefused
from .what import open_store, shelf_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare NAME, ``--take`` and ``--store``."""
    parser.add_argument("name", metavar="NAME", nargs="?", help="one part in full, with its versions")
    parser.add_argument(
        "--take", metavar="FILE", help="make it of a file: a part of a design document without 'ref' and 'pins'"
    )
    shelf_arguments(parser)
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Print the drawer or one part of it; with ``--take`` keep that part first."""
    if asked.take is not None and asked.name is None:
        raise CommandRefused("--take makes a part, which needs a name; write it before --take, such as 'low-leak npn'")
    document = None if asked.take is None else _document(asked.take)
    with open_store(asked) as store:
        if document is not None:
            store.keep_part(asked.name, document)
        found = store.drawer() if asked.name is None else store.part_versions(asked.name)
    if asked.json:
        print_json({"parts": [_as_json(made) for made in found]})
    elif asked.name is None:
        _print_all(found)
    else:
        _print_one(found)
    return 0


def _document(path: str) -> dict[str, Any]:
    try:
        with open(path, encoding="utf-8") as file:
            found = json.load(file)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise CommandRefused(f"{path} cannot be read ({reason}); name a JSON file") from error
    if not isinstance(found, dict):
        raise CommandRefused(f'{path} holds no part; write it like {{"kind": "npn", "data": {{"gain": "200"}}}}')
    return found


def _as_json(made: MadePart) -> dict[str, Any]:
    return {"name": made.name, "version": made.version, "kind": made.kind, "made": made.made, "part": made.document}


def _print_all(found: list[MadePart]) -> None:
    if not found:
        print_words("The drawer is empty.")
        return
    rows = [(made.kind.replace("_", " "), made.name, str(made.version), says(made)) for made in found]
    print_table(("kind", "part", "version", "what it says"), rows, right=frozenset({2}))


def _print_one(found: list[MadePart]) -> None:
    newest = found[-1]
    words = ", ".join(f"{made.version} of {made.made[:10]}" for made in found)
    of_class = f", class {newest.part.class_}" if newest.part.class_ else ""
    print_words(
        f"{newest.name}: {newest.kind.replace('_', ' ')}{of_class}, version {words}; figures of version"
        f" {newest.version}:"
    )
    print()
    rows = [
        (
            datum.name.replace("_", " "),
            datum.minimum,
            datum.typical,
            datum.maximum,
            _said(datum.condition, datum.source.partition(",")[0]),
        )
        for datum in part_data(newest.part)
        if datum.source
    ]
    print_table(("datum", "min", "typical", "max", "at, source"), rows, right=frozenset({1, 2, 3}))


def _said(condition: str, source: str) -> str:
    return f"{condition}; {source}" if condition else source
