"""Saved states and their notes: writing one, adding to its note, reading them back."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict, replace

from sqlmodel import Session, col, func, select

from ..engine.design.document import Design
from ..engine.results import MarginSheet
from .errors import MarginsRefused, NoteRefused, RevisionMissing
from .seal import canonical, entry_hash, revision_hash
from .sealed import seal_entry, seal_revision
from .tables import StoredDesign, StoredDraft, StoredEntry, StoredMargin, StoredRevision
from .values import ADDABLE, Note, NoteEntry, Revision

_BEYOND = 2**31
"""A number that no revision has; larger ones do not go into the database's integers."""


def save(
    session: Session, design: StoredDesign, draft: StoredDraft, note: Note, sheet: MarginSheet, now: str
) -> StoredRevision:
    """Make the draft's present state the next revision and base the draft on it."""
    document = Design.load(draft.document)
    if sheet.content != document.content:
        raise MarginsRefused(
            f"The margins are not those of the draft of '{design.name}' as it stands: compute them again, then save."
        )
    parent = None if draft.base_id is None else session.get(StoredRevision, draft.base_id)
    newest = session.exec(select(func.max(StoredRevision.number)).where(StoredRevision.design_id == design.id)).one()
    row = StoredRevision(
        design_id=design.id,
        number=(newest or 0) + 1,
        parent_id=draft.base_id,
        edit_id=draft.head_id,
        saved=now,
        note=canonical(asdict(_checked(note))),
        document=document.canonical().decode(),
        margins=canonical(sheet.as_json()),
        content=document.content,
        hash="",
    )
    row.hash = hash_of(row, parent)
    session.add(row)
    session.flush()
    session.add_all(margin_rows(row.id, sheet))
    seal_revision(session, design, row)
    draft.base_id = row.id
    return row


def hash_of(row: StoredRevision, parent: StoredRevision | None) -> str:
    """The hash that belongs to the texts of ``row`` after ``parent``."""
    before = "" if parent is None else parent.hash
    return revision_hash(before, row.number, row.saved, row.document, row.note, row.margins)


def margin_rows(revision: int, sheet: MarginSheet) -> list[StoredMargin]:
    """The sheet's margins as rows, in its order."""
    return [
        StoredMargin(
            revision_id=revision,
            position=position,
            check_id=check.id,
            margin=check.margin,
            required=check.required,
            slack=check.slack,
            verdict=check.verdict.value,
            corner=check.corner,
        )
        for position, check in enumerate(sheet.checks)
    ]


def add_entry(session: Session, revision: StoredRevision, field: str, text: str, now: str) -> None:
    """Add to a place of a saved note."""
    if field not in ADDABLE:
        raise NoteRefused(f"A saved note has no place '{field}' to add to: use one of {', '.join(ADDABLE)}.")
    if not text.strip():
        raise NoteRefused(f"There is nothing to add to the note's {field}: write at least a word.")
    _check_text(field, text)
    before = entries(session, [revision.id])
    digest = entry_hash(before[-1].hash if before else revision.hash, field, text.strip(), now)
    entry = StoredEntry(revision_id=revision.id, field=field, text=text.strip(), added=now, hash=digest)
    session.add(entry)
    seal_entry(session, revision, entry)


def entries(session: Session, revisions: Sequence[int]) -> Sequence[StoredEntry]:
    """The later additions to the notes of ``revisions``, oldest first."""
    found = select(StoredEntry).where(col(StoredEntry.revision_id).in_(revisions))
    return session.exec(found.order_by(col(StoredEntry.id))).all()


def find(session: Session, design: StoredDesign, number: int | None) -> StoredRevision:
    """The revision of this number, the newest for None."""
    rows = select(StoredRevision).where(StoredRevision.design_id == design.id)
    if number is not None:
        rows = rows.where(StoredRevision.number == max(0, min(number, _BEYOND)))
    row = session.exec(rows.order_by(col(StoredRevision.number).desc()).limit(1)).first()
    if row is not None:
        return row
    count = session.exec(select(func.count()).where(StoredRevision.design_id == design.id)).one()
    if count == 0:
        raise RevisionMissing(f"'{design.name}' has no revision yet: save its draft first.")
    there = "only r1" if count == 1 else f"r1 to r{count}"
    raise RevisionMissing(f"'{design.name}' has no revision r{number}: it has {there}.")


def all_of(session: Session, design: StoredDesign) -> Sequence[StoredRevision]:
    """The revisions of a design, oldest first."""
    rows = select(StoredRevision).where(StoredRevision.design_id == design.id)
    return session.exec(rows.order_by(col(StoredRevision.number))).all()


def shown(session: Session, rows: Sequence[StoredRevision]) -> list[Revision]:
    """The revisions as they are handed out, with their notes as of now."""
    parents = {row.parent_id for row in rows if row.parent_id is not None}
    numbers = dict(
        session.exec(select(StoredRevision.id, StoredRevision.number).where(col(StoredRevision.id).in_(parents))).all()
    )
    added: dict[int, list[NoteEntry]] = {row.id: [] for row in rows}
    for entry in entries(session, list(added)):
        added[entry.revision_id].append(NoteEntry(entry.field, entry.text, entry.added))
    return [
        Revision(
            number=row.number,
            parent=None if row.parent_id is None else numbers[row.parent_id],
            saved=row.saved,
            note=_with_additions(Note(**json.loads(row.note)), added[row.id]),
            added=tuple(added[row.id]),
            content=row.content,
            hash=row.hash,
            document=row.document,
            margins=row.margins,
        )
        for row in rows
    ]


def _with_additions(note: Note, additions: list[NoteEntry]) -> Note:
    for entry in additions:
        earlier = getattr(note, entry.field)
        note = replace(note, **{entry.field: f"{earlier}\n{entry.text}" if earlier else entry.text})
    return note


def _checked(note: Note) -> Note:
    texts = {place: text.strip() for place, text in asdict(note).items()}
    if not texts["line"]:
        raise NoteRefused("A revision needs one line that says why it exists: write it in the note.")
    if "\n" in texts["line"]:
        raise NoteRefused("The first line of a note is one line: put the rest under symptom, hypothesis or change.")
    for place, text in texts.items():
        _check_text(place, text)
    return Note(**texts)


def _check_text(place: str, text: str) -> None:
    if not all(character.isprintable() or character in "\n\t" for character in text):
        raise NoteRefused(f"The note's {place} holds a control character: type the text again without it.")
