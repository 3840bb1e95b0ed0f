"""The seal: one entry for everything that was saved, each chained to the one before it.

The hash of a revision covers its parent's, so what is changed within a tree of revisions shows by itself. The seal adds
what that cannot tell: that the newest revision was there, that a design or a part in the drawer was, and as what. It is
no proof against somebody who writes the seal anew as well: whoever can write the whole file can write the whole chain.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterable, Iterator
from typing import Any

from sqlmodel import Session, col, select

from .seal import design_hash, part_hash, seal_hash
from .tables import StoredDesign, StoredEntry, StoredMadePart, StoredRevision, StoredSeal

DESIGN, REVISION, ENTRY, PART = "design", "revision", "note_entry", "made_part"


def seal_design(session: Session, row: StoredDesign) -> None:
    """Add the entry of a design that came onto the shelf just now; as all of these, in the same transaction."""
    session.flush()
    _add(session, DESIGN, row.id, _about_design(row.name), design_hash(row.name, row.created))


def seal_revision(session: Session, design: StoredDesign, row: StoredRevision) -> None:
    """Add the entry of a revision."""
    session.flush()
    _add(session, REVISION, row.id, _about_revision(_about_design(design.name), row.number), row.hash)


def seal_entry(session: Session, revision: StoredRevision, row: StoredEntry) -> None:
    """Add the entry of an addition to a note."""
    session.flush()
    design = session.get_one(StoredDesign, revision.design_id)
    about = _about_revision(_about_design(design.name), revision.number)
    _add(session, ENTRY, row.id, _about_entry(about, row.field), row.hash)


def seal_part(session: Session, row: StoredMadePart) -> None:
    """Add the entry of a version of a part."""
    session.flush()
    content = part_hash(row.name, row.version, row.kind, row.document, row.made)
    _add(session, PART, row.id, _about_part(row.name, row.version), content)


def _add(session: Session, kind: str, subject: int, about: str, content: str) -> None:
    last = session.exec(select(StoredSeal.hash).order_by(col(StoredSeal.id).desc()).limit(1)).first()
    digest = seal_hash(last or "", kind, subject, about, content)
    session.add(StoredSeal(kind=kind, subject=subject, about=about, content=content, hash=digest))
    session.flush()


def seal_all(connection: sqlite3.Connection) -> None:
    """Write the seal of all that is there: of a store that had none."""
    before = ""
    for kind, subject, about, content in list(_everything(connection.execute)):
        before = seal_hash(before, kind, subject, about, content)
        connection.execute(
            "INSERT INTO seal (kind, subject, about, content, hash) VALUES (?, ?, ?, ?, ?)",
            (kind, subject, about, content, before),
        )


def problems(session: Session) -> Iterator[str]:
    """What the seal says was saved and is not there, or is not as it was, a line each."""
    execute = session.connection().exec_driver_sql
    there = {(kind, row): (about, content) for kind, row, about, content in _everything(execute)}
    before, at = "", 0
    for at, entry in enumerate(session.exec(select(StoredSeal).order_by(col(StoredSeal.id))), start=1):
        if entry.id != at:
            yield f"The seal has no entry {at} before entry {entry.id}: what it was about may be gone."
            return
        if seal_hash(before, entry.kind, entry.subject, entry.about, entry.content) != entry.hash:
            yield f"Entry {at} of the seal, about {entry.about}, is not the one that was made."
        before = entry.hash
        now = there.pop((entry.kind, entry.subject), None)
        if now is None:
            yield f"{entry.about} was saved and is gone."
        elif now[1] != entry.content:
            yield f"{entry.about} is not what was saved."
    last = execute("SELECT max(seq) FROM sqlite_sequence WHERE name = 'seal'").scalar_one()
    if (last or 0) > at:
        yield f"The seal ended with entry {last} and ends with {at} now: what came after may be gone."
    for about, _ in there.values():
        yield f"{about} is not in the seal: another program wrote it."


def _everything(execute: Callable[[str], Iterable[Any]]) -> Iterator[tuple[str, int, str, str]]:
    """Kind, row, words and hash of all that belongs into the seal, the oldest of each kind first.

    In plain SQL, for the step from version 2 too; and without the documents, which may be many.
    """
    names = {}
    for row, name, created in execute("SELECT id, name, created FROM design ORDER BY id"):
        names[row] = _about_design(name)
        yield DESIGN, row, names[row], design_hash(name, created)
    about = {}
    for row, design, number, digest in execute("SELECT id, design_id, number, hash FROM revision ORDER BY id"):
        about[row] = _about_revision(names.get(design, "?"), number)
        yield REVISION, row, about[row], digest
    for row, revision, field, digest in execute("SELECT id, revision_id, field, hash FROM note_entry ORDER BY id"):
        yield ENTRY, row, _about_entry(about.get(revision, "?"), field), digest
    for row, *part in execute("SELECT id, name, version, kind, document, made FROM made_part ORDER BY id"):
        name, version, kind, document, made = part
        yield PART, row, _about_part(name, version), part_hash(name, version, kind, document, made)


def _about_design(name: str) -> str:
    return f"'{name}'"


def _about_revision(design: str, number: int) -> str:
    return f"{design} r{number}"


def _about_entry(revision: str, field: str) -> str:
    return f"{revision}, added to {field}"


def _about_part(name: str, version: int) -> str:
    return f"'{name}' of the drawer, version {version}"
