"""Who may write to a design: a fencing token, checked inside the transaction of every write.

A sitting begins when a design is opened to be edited, or with the first write to it, and ends when it is left. While
the process behind it lives (presence.py), nobody else sits down without taking the design over; a dead one hinders
nobody. From a take-over on the sitting that had the design before is refused until it takes it back, which makes it
read the draft anew: no sitting ever writes over a state that it has not seen. A crash needs no tidying up.
"""

from __future__ import annotations

import getpass
import os
import socket
from dataclasses import dataclass, field
from pathlib import Path

from sqlmodel import Session

from .errors import DesignOpen, TakenOver
from .presence import Presence, is_present
from .tables import StoredDesign, StoredDraft, StoredSitting
from .values import Sitting

_LONGEST = 80


@dataclass(slots=True)
class Seat:
    """What one store knows of its sittings: by design, the token it holds and the state of the draft it last saw."""

    store: Path
    who: str
    tokens: dict[int, int] = field(default_factory=dict)
    seen: dict[int, int | None] = field(default_factory=dict)
    presence: Presence | None = None

    def sit_down(self, session: Session, design: StoredDesign, now: str) -> int:
        """The token of a sitting that begins now, or of the one that goes on here.

        Raises:
            DesignOpen: Another sitting has the design open.
        """
        row = session.get(StoredSitting, design.id)
        if row is not None and self.tokens.get(design.id) == row.token:
            return row.token
        other = self.sitting(row)
        if other is not None:
            raise DesignOpen(f"'{design.name}' is open in another sitting {_told(other)}.", other)
        return self.claim(session, design, now)

    def checked(self, session: Session, design: StoredDesign, draft: StoredDraft, now: str) -> int:
        """The token under which this write goes, to be kept in ``tokens`` once it is committed.

        Raises:
            TakenOver: Another sitting has the design open, took it over, or changed its draft since this store saw it.
        """
        row = session.get(StoredSitting, design.id)
        held = self.tokens.get(design.id)
        if row is not None and held == row.token:
            return row.token
        if row is not None:
            if held is not None:
                what = "was taken over by another sitting"
            elif self.seen.get(design.id, draft.head_id) != draft.head_id:
                what = "has been edited in another sitting"
            elif self.sitting(row) is not None:
                what = "is open in another sitting"
            else:
                return self.claim(session, design, now)
            raise TakenOver(
                f"'{design.name}' {what} {_told(Sitting(row.since, row.who, here=False))}: nothing was written here; "
                "take the design over to go on from its present state."
            )
        return self.claim(session, design, now)

    def claim(self, session: Session, design: StoredDesign, now: str) -> int:
        """Take the design, whoever has it, and return the new token."""
        if self.presence is None:
            self.presence = Presence(self.store)
        row = session.get(StoredSitting, design.id) or StoredSitting(design_id=design.id, token=0, since=now)
        row.token, row.since, row.closed = row.token + 1, now, False
        row.seat, row.who = self.presence.name, self.who
        session.add(row)
        return row.token

    def sitting(self, row: StoredSitting | None) -> Sitting | None:
        """The sitting of a row as it is handed out; None when it was left or its process is dead."""
        if row is None or row.closed:
            return None
        here = self.tokens.get(row.design_id) == row.token
        if not here and not is_present(self.store, row.seat):
            return None
        return Sitting(row.since, row.who, here)

    def release(self, session: Session, designs: list[int]) -> None:
        """Give back those of the designs whose token is still the one held."""
        for design in designs:
            row = session.get(StoredSitting, design)
            if row is not None and row.token == self.tokens.get(design):
                row.closed = True
                session.add(row)

    def leave(self) -> None:
        """Nobody is present here any more."""
        if self.presence is not None:
            self.presence.leave()
        self.tokens, self.seen, self.presence = {}, {}, None


def whoever(terminal: str) -> str:
    """Who sits here, to be told to others: user, machine and terminal, as far as they are known."""
    try:
        user = getpass.getuser()
    except (OSError, KeyError, ImportError):
        user = f"user {os.getuid()}" if hasattr(os, "getuid") else "somebody"
    words = f"{user} on {socket.gethostname()}{f', {terminal}' if terminal else ''}"
    return "".join(character for character in words if character.isprintable())[:_LONGEST]


def _told(sitting: Sitting) -> str:
    return f"since {sitting.since[:16].replace('T', ' ')} UTC{f' ({sitting.who})' if sitting.who else ''}"
