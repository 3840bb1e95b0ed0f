"""The tree of a draft's edits: every state that the draft has had is a node, undo and redo move along it.

The state before the first edit has no row and is written None. Children are younger than their parents, so ids grow
along every way from the root.
"""

from __future__ import annotations

import json

from sqlalchemy import text
from sqlmodel import Session, col, func, select

from .errors import NothingToRedo, NothingToUndo, StoreUnreadable
from .patch import Patch, difference, patched
from .seal import canonical
from .tables import StoredDraft, StoredEdit

_DISTANCE = text(
    """
    WITH RECURSIVE walk(here, there, steps) AS (
        SELECT :here, :there, 0
        UNION ALL
        SELECT
            CASE WHEN here > there THEN (SELECT ifnull(parent_id, 0) FROM edit WHERE id = here) ELSE here END,
            CASE WHEN here > there THEN there ELSE (SELECT ifnull(parent_id, 0) FROM edit WHERE id = there) END,
            steps + 1
        FROM walk WHERE here <> there
    )
    SELECT max(steps) FROM walk
    """
)

_MARK = text(
    """
    WITH RECURSIVE way(id) AS (
        SELECT :head
        UNION ALL
        SELECT parent_id FROM edit JOIN way ON edit.id = way.id WHERE parent_id IS NOT NULL
    )
    UPDATE edit SET used = :used WHERE id IN (SELECT id FROM way)
    """
)


def distance(session: Session, here: int | None, there: int | None) -> int:
    """How many steps of undo and redo lie between two states of one draft."""
    if here == there:
        return 0
    steps: int = session.connection().execute(_DISTANCE, {"here": here or 0, "there": there or 0}).scalar_one()
    return steps


def last(session: Session, draft: StoredDraft) -> StoredEdit | None:
    """The edit that led to the draft's present state."""
    return None if draft.head_id is None else session.get(StoredEdit, draft.head_id)


def following(session: Session, draft: StoredDraft) -> StoredEdit | None:
    """The most recently used edit that follows the draft's present state."""
    children = select(StoredEdit).where(
        StoredEdit.design_id == draft.design_id, col(StoredEdit.parent_id).is_not_distinct_from(draft.head_id)
    )
    return session.exec(children.order_by(col(StoredEdit.used).desc(), col(StoredEdit.id).desc()).limit(1)).first()


def append(session: Session, draft: StoredDraft, label: str, document: str, made: str) -> None:
    """Add the edit that leads from the draft's present state to ``document``; none if that is what it is already."""
    before, after = json.loads(draft.document), json.loads(document)
    forward = difference(before, after)
    if not forward:
        return
    edit = StoredEdit(
        design_id=draft.design_id,
        parent_id=draft.head_id,
        label=label,
        forward=canonical(forward),
        inverse=canonical(difference(after, before)),
        made=made,
        used=_next_use(session, draft.design_id),
    )
    session.add(edit)
    session.flush()
    draft.head_id = edit.id
    draft.document = document


def undo(session: Session, draft: StoredDraft, name: str) -> None:
    """Move the draft to the state before its last edit."""
    edit = last(session, draft)
    if edit is None:
        raise NothingToUndo(f"There is nothing to undo in '{name}': this is where it began.")
    draft.document = moved(draft.document, edit.inverse, name)
    draft.head_id = edit.parent_id


def redo(session: Session, draft: StoredDraft, name: str) -> None:
    """Move the draft to the state after the most recently used edit that follows."""
    edit = following(session, draft)
    if edit is None:
        raise NothingToRedo(f"There is nothing to redo in '{name}': no edit follows this state.")
    draft.document = moved(draft.document, edit.forward, name)
    draft.head_id = edit.id


def beginning(session: Session, draft: StoredDraft, name: str) -> str:
    """The document before the first of the edits that led to the draft's present state."""
    document, edit = draft.document, last(session, draft)
    while edit is not None:
        document = moved(document, edit.inverse, name)
        edit = None if edit.parent_id is None else session.get(StoredEdit, edit.parent_id)
    return document


def jump(session: Session, draft: StoredDraft, head: int | None, document: str) -> None:
    """Move the draft to any state of its tree. The way there counts as used, so undo and redo lead back along it."""
    draft.head_id, draft.document = head, document
    if head is not None:
        session.connection().execute(_MARK, {"head": head, "used": _next_use(session, draft.design_id)})


def moved(document: str, patch: str, name: str) -> str:
    """The document after one stored patch."""
    try:
        operations: Patch = json.loads(patch)
        return canonical(patched(json.loads(document), operations))
    except ValueError as error:
        raise StoreUnreadable(
            f"The edits of '{name}' are damaged ({error}): take a saved revision as the draft, or restore a backup."
        ) from error


def _next_use(session: Session, design: int) -> int:
    newest = session.exec(select(func.max(StoredEdit.used)).where(StoredEdit.design_id == design)).one()
    return (newest or 0) + 1
