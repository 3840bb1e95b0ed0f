"""``stagebook list``: the designs on the shelf."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from typing import TYPE_CHECKING, Any

from ..shown import figure
from .printing import json_argument, line_width, print_json, print_table, print_words
from .what import open_store, shelf_arguments

if TYPE_CHECKING:
    from ...storage import DesignRow

_BROAD = 100
_OUTCOME = 9
"""Signs for the words of what happened instead of a figure."""


def arguments(parser: ArgumentParser) -> None:
    """Declare ``--json`` and ``--store``."""
    json_argument(parser)
    shelf_arguments(parser)


def run(asked: Namespace) -> int:
    """Print the shelf, each design with its newest revision's worst margin."""
    with open_store(asked) as store:
        rows = store.designs()
    if asked.json:
        print_json({"designs": [_entry(row) for row in rows]})
    elif rows:
        heads = ("design", "revisions", "edits", "saved", "worst %", "verdict", "check")
        print_table(heads, [_cells(row) for row in rows], right=frozenset({1, 2, 4}))
        if any(row.edits_pending for row in rows):
            print_words("Worst margins are those of the newest revisions, without the edits since.")
    else:
        print_words(
            "The shelf is empty. `stagebook import FILE` puts a design on it, `stagebook demo` the demo designs."
        )
    return 0


def _entry(row: DesignRow) -> dict[str, Any]:
    worst = row.worst and {"id": row.worst.id, "margin": row.worst.margin, "verdict": row.worst.verdict}
    return {"name": row.name, "revisions": row.revisions, "saved": row.saved, "worst": worst}


def _cells(row: DesignRow) -> tuple[str, ...]:
    # On a narrow line ids need the room of the time of day.
    saved = row.saved[: 16 if line_width() >= _BROAD else 10].replace("T", " ") if row.saved else "never"
    worst = ("", "", "")
    if row.worst is not None:
        shown = figure(row.worst.margin, row.worst.outcome, _OUTCOME)
        worst = (shown, str(row.worst.verdict), row.worst.id)
    return (row.name, str(row.revisions), str(row.edits_pending), saved, *worst)
