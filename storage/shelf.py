"""The shelf: every design in one line."""

from __future__ import annotations

import json
from hashlib import sha256

from sqlmodel import Session, col, func, select

from ..engine.results import Verdict
from .edits import distance
from .tables import StoredDesign, StoredDraft, StoredMargin, StoredRevision
from .values import DesignRow, Worst


def rows(session: Session) -> list[DesignRow]:
    """The designs by name, each with its newest revision's time and worst margin and the state of its draft."""
    counts = dict(
        session.exec(select(StoredRevision.design_id, func.count()).group_by(col(StoredRevision.design_id))).all()
    )
    newest = {
        design: (revision, saved)
        for design, revision, saved in session.exec(
            select(StoredRevision.design_id, StoredRevision.id, StoredRevision.saved).order_by(
                col(StoredRevision.design_id), col(StoredRevision.number)
            )
        )
    }
    found = []
    drafts = select(StoredDesign, StoredDraft).where(StoredDraft.design_id == StoredDesign.id)
    for design, draft in session.exec(drafts):
        revision, saved = newest.get(design.id, (None, None))
        found.append(
            DesignRow(
                name=design.name,
                revisions=counts.get(design.id, 0),
                saved=saved,
                worst=None if revision is None else worst(session, revision),
                edits_pending=pending(session, draft),
                content=sha256(draft.document.encode()).hexdigest(),
            )
        )
    return sorted(found, key=lambda row: (row.name.casefold(), row.name))


def worst(session: Session, revision: int) -> Worst | None:
    """The check with the least slack of a revision, the first of equals as in its sheet; None on an empty sheet."""
    margins = select(StoredMargin).where(StoredMargin.revision_id == revision)
    row = session.exec(margins.order_by(col(StoredMargin.slack), col(StoredMargin.position)).limit(1)).first()
    if row is None:
        return None
    return Worst(row.check_id, row.margin, Verdict(row.verdict), _outcome(session, row))


def _outcome(session: Session, row: StoredMargin) -> str | None:
    """What happened in a check instead of a figure. Only a margin of one, lost or whole, can stand for that."""
    if row.margin is None or abs(row.margin) != 1.0:
        return None
    stored = session.exec(select(StoredRevision.margins).where(StoredRevision.id == row.revision_id)).first()
    try:
        checks = json.loads(stored or "")["checks"]
        outcome = next((check["outcome"] for check in checks if check["id"] == row.check_id), None)
    except (ValueError, KeyError, TypeError):  # a torn sheet is told where it is opened
        return None
    return outcome if isinstance(outcome, str) else None


def base(session: Session, draft: StoredDraft) -> tuple[int | None, int | None]:
    """Number of the revision that the draft is based on, and the edit at which that one was saved."""
    found = select(StoredRevision.number, StoredRevision.edit_id).where(StoredRevision.id == draft.base_id)
    return session.exec(found).first() or (None, None)


def pending(session: Session, draft: StoredDraft) -> int:
    """How many edits lie between the draft and the revision that it is based on."""
    return distance(session, draft.head_id, base(session, draft)[1])
