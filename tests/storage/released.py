"""Makes the store that is kept of a released version: run once, when tables of a new version go out.

``python -m tests.storage.released`` writes ``stores/schema-N.sqlite3``, with N of the tables as they are. A file that
is there is what users have on their disks, and is never made again.
"""

from __future__ import annotations

import itertools
import sqlite3
import sys
from contextlib import closing
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

from stagebook.engine.design.document import Design
from stagebook.engine.results import Depth, MarginSheet
from stagebook.storage import Note, Store
from stagebook.storage.tables import SCHEMA

from .conftest import check_of, document

STORES = Path(__file__).parent / "stores"


def of(value: str) -> Design:
    """The example document with a value of R8."""
    return Design.load(document(value))


def sheet_of(design: Design, **margins: float | None) -> MarginSheet:
    """Margins of the design, one check for each stage named."""
    checks = tuple(check_of(stage, margin) for stage, margin in margins.items())
    return MarginSheet(design.name, design.content, "1", 1, 0, 0.5, Depth.CORNERS, checks)


def make(path: Path) -> None:
    """All that a store can hold: a tree of revisions, additions to notes, edits undone, a sitting left by a crash,
    a part in the drawer in two versions."""
    ticks = itertools.count()
    with Store.open(path, clock=lambda: datetime(2026, 12, 1, 9, tzinfo=UTC) + timedelta(seconds=next(ticks))) as store:
        store.create("flood", of("10k"))
        store.save("flood", Note("first try"), sheet_of(of("10k"), driver=0.2))
        store.edit("flood", "R8 22k", of("22k"))
        note = Note("more", "too weak", "R8", "R8 22k", "stronger", next="measure")
        store.save("flood", note, sheet_of(of("22k"), driver=0.3, timer=-0.1, piezo=None))
        store.add_note("flood", 2, "result", "as predicted")
        store.add_note("flood", 2, "result", "also in the cold: 2 \u03a9 less")
        store.branch("flood", 1)
        store.edit("flood", "R8 8k2", of("8k2"))
        store.edit("flood", "R8 6k8", of("6k8"))
        store.save("flood", Note("the other way"), replace(sheet_of(of("6k8")), depth=Depth.NOMINAL))
        store.edit("flood", "R8 5k6", of("5k6"))
        store.edit("flood", "R8 4k7", of("4k7"))
        store.undo("flood")
        store.create("frost", of("1k"))
        store.keep_part("film", {"kind": "resistor", "value": "470k", "tolerance": "1 %", "rating": "0.6 W"})
        store.keep_part("film", {"kind": "resistor", "value": "470k", "tolerance": "1 %", "rating": "1 W"})
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("UPDATE sitting SET closed = 0 WHERE design_id = 1")
        raw.commit()


if __name__ == "__main__":
    STORES.mkdir(exist_ok=True)
    target = STORES / f"schema-{SCHEMA}.sqlite3"
    if target.exists():
        sys.exit(f"{target} is what users have: it stays as it is.")
    make(target)
