"""What can still be read of a damaged store, as a store of its own. The damaged file is copied first, never written.

Rows are read table by table, by their row number, past whatever pages cannot be read. Where the list of tables is gone,
that of an empty store stands in for it (SQLite's "Database File Format", sections 1.3, 1.6 and 2.6). What was saved is
taken over as it stands, with its hashes, so that ``inspect`` on the rescued store names what does not match. Edits that
no longer lead from state to state are made anew from the saved documents.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator
from contextlib import closing, suppress
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, Final

from sqlmodel import Session, SQLModel

from ..engine.design.document import Design
from ..engine.errors import EngineError
from ..engine.results import MarginSheet
from . import revisions
from .backup import check_target, copy_database
from .connection import copied, plain_errors
from .errors import StoreUnreadable
from .inspection import draft_problems, verify
from .patch import difference
from .place import beside
from .seal import canonical
from .sealed import seal_all
from .store import Store
from .tables import StoredDesign, triggers

PAGE: Final = 4096
"""Bytes of a page of every store: SQLite's default, which nothing here changes."""
MOST_PROBES: Final = 100_000
"""Row numbers of one gap that are asked for one by one."""

Rows = dict[str, list[dict[str, Any]]]


@dataclass(frozen=True, slots=True)
class Rescued:
    """What came over to the store at ``path``, and ``lost``: what did not, or is not as it was saved, a line each."""

    path: Path
    designs: int
    revisions: int
    edits: int
    lost: tuple[str, ...]


def rescue(store: Path, target: Path) -> Rescued:
    """Write what can be read of the file ``store`` to ``target``, over an earlier copy but over nothing else.

    Raises:
        StoreUnreadable: There is no file, or nothing in it can be read as a store.
        StorageError: ``target`` cannot be written, is the store itself, or is a file of another kind.
    """
    check_target(store, target)
    try:
        store.stat()
        folder = copied(store)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise StoreUnreadable(f"{store} cannot be read ({reason}): name a store with --store.") from error
    with folder, TemporaryDirectory(prefix="stagebook-") as made:
        copy = Path(folder.name) / store.name
        empty = Path(made) / "empty"
        Store.open(empty).close()
        rows, lost = _read(copy, empty)
        lost += _mended(rows)
        if not rows["design"]:
            raise StoreUnreadable(f"Nothing of a store can be read in {store}: put a backup in its place.")
        fresh = Path(made) / store.name
        Store.open(fresh).close()
        with plain_errors(fresh):
            lost += _written(fresh, rows)
        with Store.open(fresh) as whole, whole.reading() as session:
            lost += verify(whole)
            designs, saved, edits = (
                session.connection().exec_driver_sql(f"SELECT count(*) FROM {table}").scalar_one()
                for table in ("design", "revision", "edit")
            )
        with closing(sqlite3.connect(fresh)) as source:
            copy_database(source, target)
    return Rescued(target, designs, saved, edits, tuple(dict.fromkeys(lost)))


def _read(copy: Path, empty: Path) -> tuple[Rows, list[str]]:
    """All rows of all tables that can be read, and what is known to be missing."""
    lost = []
    size = copy.stat().st_size
    with copy.open("r+b") as file:
        pages = int.from_bytes(file.read(32)[28:32], "big")
        if size < pages * PAGE <= 1 << 40:
            file.truncate(pages * PAGE)  # what is cut off reads as empty pages, and the rest as it was
            lost.append(f"The file ends after {size} of {pages * PAGE} bytes.")
    connection = _connected(copy)
    if connection is None:
        _lend_schema(copy, empty.read_bytes())
        lost.append("The list of tables in the file was damaged: that of an empty store stood in for it.")
        connection = _connected(copy)
    names = [table.name for table in SQLModel.metadata.sorted_tables]
    if connection is None:
        return {name: [] for name in names}, lost
    with closing(connection):
        here = {name for (name,) in connection.execute("SELECT name FROM sqlite_schema WHERE type = 'table'")}
        rows = {name: list(_rows(connection, name, lost)) if name in here else [] for name in names}
    return rows, lost


def _lend_schema(copy: Path, whole: bytes) -> None:
    """Put the pages with the list of tables of an empty store over those of the file, which was laid out alike."""
    pages = max(copy.stat().st_size, len(whole)) // PAGE
    lent = {1: whole[:28] + pages.to_bytes(4, "big") + whole[32:PAGE]}
    if whole[100] == 5:  # an interior page: the list itself is in the pages below it
        cells = int.from_bytes(whole[103:105], "big")
        places = [int.from_bytes(whole[112 + 2 * k : 114 + 2 * k], "big") for k in range(cells)]
        for place in (108, *places):
            child = int.from_bytes(whole[place : place + 4], "big")
            lent[child] = whole[(child - 1) * PAGE : child * PAGE]
    with copy.open("r+b") as file:
        file.truncate(pages * PAGE)
        for number, page in lent.items():
            file.seek((number - 1) * PAGE)
            file.write(page)
    beside(copy, "-wal").unlink(missing_ok=True)


def _connected(copy: Path) -> sqlite3.Connection | None:
    """A connection that takes a damaged schema as far as it goes; None where not even the tables' names are there."""
    connection = sqlite3.connect(copy, isolation_level=None)
    connection.text_factory = lambda data: data.decode("utf-8", "replace")
    try:
        connection.execute("PRAGMA writable_schema = ON")
        connection.execute("PRAGMA cell_size_check = ON")
        found = connection.execute("SELECT count(*) FROM sqlite_schema WHERE name IN ('design', 'revision')").fetchone()
    except sqlite3.Error:
        found = (0,)
    if found == (2,):
        return connection
    connection.close()
    return None


def _rows(connection: sqlite3.Connection, table: str, lost: list[str]) -> Iterator[dict[str, Any]]:
    """The rows of a table from both ends up to what cannot be read, and one by one what lies between."""
    seen: set[int] = set()
    ends: list[int] = []
    for order in ("ASC", "DESC"):
        last = 0
        try:
            found = connection.execute(f"SELECT rowid AS place, * FROM {table} NOT INDEXED ORDER BY rowid {order}")
            heads = [head[0] for head in found.description[1:]]
            for place, *cells in found:
                if place in seen:
                    return
                seen.add(place)
                last = place
                yield dict(zip(heads, cells, strict=True))
            if order == "ASC":
                return  # it came to the end
        except sqlite3.Error:
            lost.append(f"A part of the table {table} cannot be read.")
        ends.append(last)
    low, high = ends
    for place in range(low + 1, min(high, low + MOST_PROBES)):
        with suppress(sqlite3.Error):
            found = connection.execute(f"SELECT * FROM {table} NOT INDEXED WHERE rowid = ?", (place,))
            heads = [head[0] for head in found.description]
            for cells in found:
                yield dict(zip(heads, cells, strict=True))


def _written(path: Path, rows: Rows) -> list[str]:
    """Put the rows into an empty store, as far as they belong to each other; what did not come over, a line each."""
    lost = []
    with closing(sqlite3.connect(path, isolation_level=None)) as raw:
        raw.execute("PRAGMA foreign_keys = OFF")
        raw.execute("BEGIN IMMEDIATE")
        for name in triggers():
            raw.execute(f"DROP TRIGGER {name}")
        for table in SQLModel.metadata.sorted_tables:
            if table.name == "sitting":
                continue  # nobody sits at a rescued store
            known = [column.name for column in table.columns]
            for row in rows[table.name]:
                here = [name for name in known if name in row]
                marks = ", ".join("?" * len(here))
                try:
                    raw.execute(
                        f"INSERT INTO {table.name} ({', '.join(here)}) VALUES ({marks})", [row[name] for name in here]
                    )
                except sqlite3.Error:
                    lost.append(f"A row of {table.name} could not be read as a whole.")
        if not rows["seal"]:
            seal_all(raw)  # the store was older, or its seal is lost, which has been told
        raw.execute("COMMIT")
    with Store.open(path) as store, store.reading() as session:
        torn = [design for design in rows["design"] if _torn(session, design["id"])]
    with closing(sqlite3.connect(path, isolation_level=None)) as raw:
        raw.execute("BEGIN IMMEDIATE")
        for design in torn:
            lost.append(f"'{design['name']}': the edits were torn; they were made anew from what was saved.")
            _edits_anew(raw, design["id"])
        for sql in triggers().values():
            raw.execute(sql)
        raw.execute("COMMIT")
    return lost


def _torn(session: Session, design: int) -> bool:
    row = session.get(StoredDesign, design)
    return row is not None and any(draft_problems(session, row, revisions.all_of(session, row)))


def _mended(rows: Rows) -> list[str]:
    """Take out what cannot stand by itself and add what it needs, in place; a line each."""
    lost = []
    kept = []
    for row in rows["revision"]:
        if _design(row["document"]) is None:
            lost.append(f"r{row['number']} of design {row['design_id']}: its document cannot be read.")
        else:
            kept.append(row)
    rows["revision"] = kept
    rows["draft"] = [row for row in rows["draft"] if _design(row["document"]) is not None]
    states = {row["design_id"] for row in (*kept, *rows["draft"])}
    names = {row["id"]: row["name"] for row in rows["design"]}
    for name in (names[design] for design in names if design not in states):
        lost.append(f"'{name}': neither its draft nor a revision can be read.")
    rows["design"] = [row for row in rows["design"] if row["id"] in states]
    for design in sorted(states - names.keys()):
        lost.append(f"The name of design {design} was lost: it is called rescued {design}.")
        rows["design"].append({"id": design, "name": f"rescued {design}", "created": ""})
    drafts = {row["design_id"] for row in rows["draft"]}
    for design in sorted(states - drafts):
        newest = max((row for row in kept if row["design_id"] == design), key=lambda row: row["number"])
        lost.append(f"The draft of design {design} was lost: it begins again from r{newest['number']}.")
        rows["draft"].append(
            {
                "design_id": design,
                "head_id": newest["edit_id"],
                "base_id": newest["id"],
                "document": newest["document"],
            }
        )
    numbers = {row["id"] for row in kept}
    edits = {row["id"] for row in rows["edit"]}
    for row in kept:
        row["parent_id"] = row["parent_id"] if row["parent_id"] in numbers else None
        row["edit_id"] = row["edit_id"] if row["edit_id"] in edits else None
    for row in rows["draft"]:
        row["base_id"] = row["base_id"] if row["base_id"] in numbers else None
        row["head_id"] = row["head_id"] if row["head_id"] in edits else None
    rows["edit"] = [row for row in rows["edit"] if row["design_id"] in states]
    rows["note_entry"] = [row for row in rows["note_entry"] if row["revision_id"] in numbers]
    rows["margin"] = [margin for row in kept for margin in _margins(row)]
    return lost


def _margins(row: dict[str, Any]) -> list[dict[str, Any]]:
    """The rows of margins as the sheet of the revision has them: they hold nothing of their own."""
    try:
        sheet = MarginSheet.from_json(json.loads(row["margins"]))
    except (ValueError, LookupError, TypeError):
        return []
    return [margin.model_dump() for margin in revisions.margin_rows(row["id"], sheet)]


def _design(document: object) -> Design | None:
    try:
        return Design.load(document) if isinstance(document, str) else None
    except EngineError:
        return None


def _edits_anew(raw: sqlite3.Connection, design: int) -> None:
    """One edit from each saved document to the next, and to the draft's."""
    raw.execute("DELETE FROM edit WHERE design_id = ?", (design,))
    saved = raw.execute(
        "SELECT id, number, saved, document FROM revision WHERE design_id = ? ORDER BY number", (design,)
    ).fetchall()
    (draft,) = raw.execute("SELECT document FROM draft WHERE design_id = ?", (design,)).fetchone()
    states = [(f"r{number}", made, document, revision) for revision, number, made, document in saved]
    states.append(("the draft", states[-1][1] if states else "", draft, 0))
    at: int | None = None
    before: dict[str, Any] | None = None
    for label, made, document, revision in states:
        after = json.loads(document)
        forward = [] if before is None else difference(before, after)
        if before is not None and forward:
            backward = difference(after, before)
            at = raw.execute(
                "INSERT INTO edit (design_id, parent_id, label, forward, inverse, made, used)"
                " VALUES (?, ?, ?, ?, ?, ?, 1)",
                (design, at, f"{label}, rescued", canonical(forward), canonical(backward), made),
            ).lastrowid
        before = after
        raw.execute("UPDATE revision SET edit_id = ? WHERE id = ?", (at, revision))
    raw.execute("UPDATE draft SET head_id = ? WHERE design_id = ?", (at, design))
