"""Who may write to a design: a fencing token, checked inside the transaction of every write.

The first write of a store to a design claims it, provided that the draft is still where this store last saw it. From
then on the store that held the design before is refused until it takes the design over, which makes it read the draft
anew: no sitting ever writes over a state that it has not seen. A crash needs no tidying up.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from sqlmodel import Session

from .errors import TakenOver
from .tables import StoredDesign, StoredDraft, StoredSitting


@dataclass(slots=True)
class Seat:
    """What one store knows of its sittings: by design, the token it holds and the state of the draft it last saw."""

    tokens: dict[int, int] = field(default_factory=dict)
    seen: dict[int, int | None] = field(default_factory=dict)

    def checked(self, session: Session, design: StoredDesign, draft: StoredDraft, now: str) -> int:
        """The token under which this write goes, to be kept in ``tokens`` once it is committed.

        Raises:
            TakenOver: Another sitting took the design over, or changed its draft since this store saw it.
        """
        sitting = session.get(StoredSitting, design.id)
        held = self.tokens.get(design.id)
        if sitting is not None and held == sitting.token:
            return sitting.token
        if sitting is not None and (held is not None or self.seen.get(design.id, draft.head_id) != draft.head_id):
            raise TakenOver(
                f'"{design.name}" has been edited in another sitting since {sitting.since}: nothing was written here; '
                "take the design over to go on from its present state."
            )
        return claim(session, design, now)


def claim(session: Session, design: StoredDesign, now: str) -> int:
    """Take the design, whoever has it, and return the new token."""
    sitting = session.get(StoredSitting, design.id) or StoredSitting(design_id=design.id, token=0, since=now)
    sitting.token, sitting.since, sitting.closed = sitting.token + 1, now, False
    session.add(sitting)
    return sitting.token


def release(session: Session, tokens: dict[int, int]) -> None:
    """Give back the designs whose token is still the one held."""
    for design, token in tokens.items():
        sitting = session.get(StoredSitting, design)
        if sitting is not None and sitting.token == token:
            sitting.closed = True
            session.add(sitting)
