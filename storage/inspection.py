"""Whether a store is what was saved in it: file, rows, triggers, hash chain; and what there is to know about it."""

from __future__ import annotations

import json
import os
from collections.abc import Iterator, Sequence
from contextlib import suppress
from dataclasses import dataclass
from hashlib import sha256
from itertools import pairwise
from pathlib import Path

from sqlalchemy import text
from sqlmodel import Session, col, func, select

from ..engine.design.document import Design
from ..engine.errors import EngineError
from ..engine.results import MarginSheet
from . import revisions, sealed
from .edits import moved
from .errors import StorageError
from .place import beside
from .seal import canonical, entry_hash
from .store import Store
from .tables import StoredDesign, StoredDraft, StoredEdit, StoredMargin, StoredRevision, triggers

_DERIVED = {"slack"}
"""Columns that an engine of another version may compute otherwise."""


@dataclass(frozen=True, slots=True)
class Inspection:
    """What is to know about a store; sizes in bytes. ``problems`` is empty when all is as it was saved."""

    path: Path
    schema: int
    size: int
    log_size: int
    designs: int
    revisions: int
    edits: int
    problems: tuple[str, ...]
    advice: tuple[str, ...]


def inspect(store: Store) -> Inspection:
    """Verify the store and tell its sizes, with advice."""
    log = beside(store.path, "-wal")
    with store.reading() as session:
        designs, saved, edits = (
            session.exec(select(func.count()).select_from(table)).one()
            for table in (StoredDesign, StoredRevision, StoredEdit)
        )
    return Inspection(
        path=store.path,
        schema=store.schema,
        size=store.path.stat().st_size,
        log_size=log.stat().st_size if log.exists() else 0,
        designs=designs,
        revisions=saved,
        edits=edits,
        problems=tuple(verify(store)),
        advice=tuple(_advice(store)),
    )


def verify(store: Store) -> list[str]:
    """What is not as it was saved, one line each; an empty list when all is well.

    Of the store of a later version only the file is looked at: how it keeps the rest is not known here.
    """
    problems: list[str] = []
    try:
        with store.reading() as session:
            for problem in _of_file(session) if store.later else _problems(session):
                problems.append(problem)
    except StorageError as error:
        problems.append(str(error))
    return problems


def _of_file(session: Session) -> Iterator[str]:
    connection = session.connection()
    for (line,) in connection.execute(text("PRAGMA integrity_check")):
        if line != "ok":
            yield f"The file is damaged: {'; '.join(each for each in line.splitlines() if not each.startswith('***'))}."
    for table, row, owner, _ in connection.execute(text("PRAGMA foreign_key_check")):
        yield f"Row {row} of {table} belongs to a row of {owner} that is gone."


def _problems(session: Session) -> Iterator[str]:
    yield from _of_file(session)
    connection = session.connection()
    found = connection.execute(text("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'"))
    there = {row.name: row.sql for row in found}
    for name, sql in triggers().items():
        if there.get(name) != sql:
            yield f"The trigger {name}, which keeps saved rows from being changed, is missing or altered."
    for design in session.exec(select(StoredDesign).order_by(col(StoredDesign.name))):
        yield from _of_design(session, design)
    yield from sealed.problems(session)


def _of_design(session: Session, design: StoredDesign) -> Iterator[str]:
    rows = revisions.all_of(session, design)
    by_id = {row.id: row for row in rows}
    for number, row in enumerate(rows, start=1):
        if row.number != number:
            yield f"'{design.name}': r{number} is missing before r{row.number}."
            break
    for row in rows:
        where = f"'{design.name}' r{row.number}"
        if sha256(row.document.encode()).hexdigest() != row.content:
            yield f"{where}: the document is not the one that was saved."
        if row.parent_id is not None and row.parent_id not in by_id:
            yield f"{where}: its parent is gone."
        elif revisions.hash_of(row, by_id.get(row.parent_id or 0)) != row.hash:
            yield f"{where}: the hash does not fit its parent, number, time, document, note and margins."
        yield from _of_margins(session, row, where)
        yield from _of_entries(session, row, where)
    yield from draft_problems(session, design, rows)


def _of_margins(session: Session, row: StoredRevision, where: str) -> Iterator[str]:
    stored = session.exec(
        select(StoredMargin).where(StoredMargin.revision_id == row.id).order_by(col(StoredMargin.position))
    ).all()
    try:
        sheet = MarginSheet.from_json(json.loads(row.margins))
    except (ValueError, LookupError, TypeError):
        yield f"{where}: the margins cannot be read."
        return
    made = revisions.margin_rows(row.id, sheet)
    if [row.model_dump(exclude=_DERIVED) for row in stored] != [row.model_dump(exclude=_DERIVED) for row in made]:
        yield f"{where}: the rows of margins are not those of its sheet."


def _of_entries(session: Session, row: StoredRevision, where: str) -> Iterator[str]:
    before = row.hash
    for entry in revisions.entries(session, [row.id]):
        if entry_hash(before, entry.field, entry.text, entry.added) != entry.hash:
            yield f"{where}: the addition to the note's {entry.field} of {entry.added} is not the one that was made."
        before = entry.hash


def draft_problems(session: Session, design: StoredDesign, rows: Sequence[StoredRevision]) -> Iterator[str]:
    """What is wrong with a design's draft and the tree of its edits, a line each; ``rows`` are its revisions."""
    draft = session.get(StoredDraft, design.id)
    if draft is None:
        yield f"'{design.name}': the draft is gone."
        return
    try:
        Design.load(draft.document)
        yield from _of_edits(session, design, draft, rows)
    except (EngineError, StorageError, ValueError) as error:
        yield f"'{design.name}': the draft cannot be read: {error}"


def _of_edits(
    session: Session, design: StoredDesign, draft: StoredDraft, rows: Sequence[StoredRevision]
) -> Iterator[str]:
    """Undo all edits of the draft in memory, then do every edit of the tree, and compare at each saved state."""
    edits = session.exec(select(StoredEdit).where(StoredEdit.design_id == design.id)).all()
    by_id = {edit.id: edit for edit in edits}
    after: dict[int | None, list[StoredEdit]] = {}
    for edit in edits:
        after.setdefault(edit.parent_id, []).append(edit)
    saved: dict[int | None, list[StoredRevision]] = {}
    for row in rows:
        saved.setdefault(row.edit_id, []).append(row)

    head = canonical(json.loads(draft.document))
    document, at = head, draft.head_id
    while at is not None and at in by_id:
        document, at = moved(document, by_id[at].inverse, design.name), by_id[at].parent_id
    states: list[tuple[int | None, str]] = [(None, document)]
    while states:
        at, document = states.pop()
        if at == draft.head_id and document != head:
            yield f"'{design.name}': the edits do not lead to the draft."
        for row in saved.get(at, []):
            if Design.load(row.document) != Design.load(document):
                yield f"'{design.name}': the edits do not lead to r{row.number}."
        for edit in after.get(at, []):
            states.append((edit.id, moved(document, edit.forward, design.name)))
            if moved(states[-1][1], edit.inverse, design.name) != document:
                yield f"'{design.name}': the edit '{edit.label}' of {edit.made} is not the one that was made."


def _advice(store: Store) -> Iterator[str]:
    if os.name == "posix" and store.path.stat().st_mode & 0o077:
        yield f"Other users can read {store.path}: `chmod 600` keeps it to you."
    if store.read_only:
        yield store.why_read_only
    for copy in sorted(store.path.parent.glob(f"{store.path.name}-version-*")):
        yield f"{copy} is a copy from before a change of version: delete it when all is well."
    with suppress(StorageError), store.reading() as session:
        yield from _of_clock(session)


def _of_clock(session: Session) -> Iterator[str]:
    """Where the clock went back between two revisions, once for each design. Numbers and hashes do not depend on it."""
    saved = select(StoredDesign.name, StoredRevision.number, StoredRevision.saved).where(
        StoredDesign.id == StoredRevision.design_id
    )
    told = set()
    rows = session.exec(saved.order_by(col(StoredDesign.name), col(StoredRevision.number))).all()
    for (name, before, earlier), (other, number, later) in pairwise(rows):
        if name == other and later < earlier and name not in told:
            told.add(name)
            yield (
                f"'{name}' r{number} was saved on {later[:10]} by the clock, before r{before} on {earlier[:10]}: "
                "the clock of this machine was or is wrong; set it. Nothing is lost by that."
            )
