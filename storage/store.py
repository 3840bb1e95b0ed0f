"""The store: designs with their drafts and revisions in one SQLite file. Used from one thread."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from datetime import UTC, datetime
from difflib import get_close_matches
from pathlib import Path
from types import TracebackType
from typing import Any, Self
from unicodedata import normalize

from sqlmodel import Session, select

from ..engine.design.document import Design
from ..engine.errors import EngineError
from ..engine.results import MarginSheet
from . import drawer, edits, half_notes, revisions, shelf, sittings
from .backup import back_up
from .connection import Opened, open_database, plain_errors
from .errors import DesignMissing, NameTaken, StorageError, StoreTooNew, StoreUnreadable
from .names import checked_name
from .place import at_home, default_path
from .sealed import seal_design
from .tables import StoredDesign, StoredDraft, StoredSitting
from .values import DesignRow, Draft, MadePart, Note, Revision, Sitting

Clock = Callable[[], datetime]


def utc_now() -> datetime:
    """The time of the machine's clock."""
    return datetime.now(UTC)


@dataclass(slots=True)
class _Place:
    """A design inside a transaction: its row and its draft's."""

    design: StoredDesign
    draft: StoredDraft


class Store:
    """The shelf of one user. Every method that changes something has it on the disk before it returns.

    All methods raise :class:`StorageError` with one plain line when they cannot do what they are asked; nothing is
    written then. A method that takes the name of a design raises :class:`DesignMissing` for a name not on the shelf,
    and one that writes raises :class:`TakenOver` when another sitting edits that design now.
    """

    def __init__(self, path: Path, opened: Opened, clock: Clock, terminal: str) -> None:
        """Use :meth:`open`."""
        self.path = path
        self._opened = opened
        self._clock = clock
        self._seat = sittings.Seat(path, sittings.whoever(terminal))

    @classmethod
    def open(cls, path: Path | str | None = None, *, clock: Clock = utc_now, terminal: str = "") -> Self:
        """Open the store at ``path`` or at the default place; one is made where there is none.

        A store that cannot be written, or that a later version wrote, opens ``read_only``. ``terminal`` is told to
        other sittings, beside the user's name.

        Raises:
            StoreUnreadable: The file is damaged, no store, or cannot be reached.
        """
        place = at_home(path) if path is not None else default_path()
        return cls(place, open_database(place), clock, terminal)

    @property
    def read_only(self) -> bool:
        """Whether the store can be looked at and not written."""
        return self._opened.refusal is not None

    @property
    def why_read_only(self) -> str:
        """Why it cannot be written, in one line; "" when it can."""
        return str(self._opened.refusal or "")

    @property
    def later(self) -> bool:
        """Whether a later version wrote the store."""
        return isinstance(self._opened.refusal, StoreTooNew)

    @property
    def schema(self) -> int:
        """The version of its tables."""
        return self._opened.schema

    def close(self) -> None:
        """Give the designs back that this store edits, and the file."""
        # All that was acknowledged is on the disk; a sitting that stays marked is no more than after a crash.
        with suppress(StorageError):
            if self._seat.tokens:
                with self._writing() as session:
                    self._seat.release(session, list(self._seat.tokens))
        self._seat.leave()
        self._opened.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self.close()

    def designs(self) -> list[DesignRow]:
        """The shelf, by name."""
        with self.reading() as session:
            return shelf.rows(session)

    def create(self, name: str, design: Design) -> Draft:
        """Put a new design on the shelf, without a revision.

        Raises:
            NameRefused: ``name`` may not be a name.
            NameTaken: The shelf has a design of this name.
        """
        name = checked_name(name)
        with self._writing() as session:
            if session.exec(select(StoredDesign).where(StoredDesign.name == name)).first():
                raise NameTaken(f"There is a design '{name}' on the shelf already: choose another name.")
            row = StoredDesign(name=name, created=self._now())
            session.add(row)
            seal_design(session, row)
            draft = StoredDraft(design_id=row.id, document=design.canonical().decode())
            session.add(draft)
            shown = self._shown(session, _Place(row, draft), design)
        self._seat.seen[row.id] = None
        return shown

    def draft(self, name: str) -> Draft:
        """The working copy of a design, as it stands on the disk."""
        with self.reading() as session:
            place = self._find(session, name)
            shown = self._shown(session, place)
        self._seat.seen[place.design.id] = place.draft.head_id
        return shown

    def beginning(self, name: str) -> Design:
        """The design as it was put on the shelf, before its first edit."""
        with self.reading() as session:
            place = self._find(session, name)
            return Design.load(edits.beginning(session, place.draft, name))

    def edit(self, name: str, label: str, design_after: Design) -> Draft:
        """Change the draft to ``design_after``; a document that says the same makes no edit."""
        with self._editing(name) as (session, place):
            edits.append(session, place.draft, label, design_after.canonical().decode(), self._now())
            return self._shown(session, place, design_after)

    def undo(self, name: str) -> Draft:
        """Take the last edit back, also one of an earlier sitting.

        Raises:
            NothingToUndo: The draft stands where the design began.
        """
        with self._editing(name) as (session, place):
            edits.undo(session, place.draft, place.design.name)
            return self._shown(session, place)

    def redo(self, name: str) -> Draft:
        """Bring the most recently used edit that follows the draft's state again.

        Raises:
            NothingToRedo: No edit follows.
        """
        with self._editing(name) as (session, place):
            edits.redo(session, place.draft, place.design.name)
            return self._shown(session, place)

    def save(self, name: str, note: Note, sheet: MarginSheet) -> Revision:
        """Make the draft's present state the next revision, with the margins of just this state.

        Raises:
            NoteRefused: The note has no line, or a text that cannot be kept.
            MarginsRefused: ``sheet`` belongs to another document than the draft's.
        """
        with self._editing(name) as (session, place):
            row = revisions.save(session, place.design, place.draft, note, sheet, self._now())
            return revisions.shown(session, [row])[0]

    def revisions(self, name: str) -> list[Revision]:
        """All revisions of a design, oldest first."""
        with self.reading() as session:
            return revisions.shown(session, revisions.all_of(session, self._find(session, name).design))

    def revision(self, name: str, number: int | None = None) -> Revision:
        """One revision of a design, the newest without a number.

        Raises:
            RevisionMissing: There is none of this number, or none at all.
        """
        with self.reading() as session:
            row = revisions.find(session, self._find(session, name).design, number)
            return revisions.shown(session, [row])[0]

    def branch(self, name: str, number: int) -> Draft:
        """Move the draft to a revision, which the next save then has as its parent.

        Edits that were not saved stay in the tree: going back to the revision they follow and redo bring them again.

        Raises:
            RevisionMissing: There is no revision of this number.
        """
        with self._editing(name) as (session, place):
            row = revisions.find(session, place.design, number)
            edits.jump(session, place.draft, row.edit_id, row.document)
            place.draft.base_id = row.id
            return self._shown(session, place)

    def add_note(self, name: str, revision: int, field: str, text: str) -> Revision:
        """Add ``text`` to a place of a revision's note, below what stands there.

        Raises:
            NoteRefused: ``field`` is not a place of a note that can be added to, or ``text`` cannot be kept.
            RevisionMissing: There is no revision of this number.
        """
        with self._editing(name) as (session, place):
            row = revisions.find(session, place.design, revision)
            revisions.add_entry(session, row, field, text, self._now())
            session.flush()
            return revisions.shown(session, [row])[0]

    def half_note(self, name: str) -> dict[str, str]:
        """What was written for the next revision of a design, by place of the note."""
        return half_notes.half_note(self.path, name)

    def keep_half_note(self, name: str, written: Mapping[str, str]) -> None:
        """Keep a note that is still being written; from any thread. Nothing written forgets it.

        Raises:
            StorageError: It cannot be kept.
        """
        self._check_writable()
        half_notes.keep_half_note(self.path, name, written)

    def drawer(self) -> list[MadePart]:
        """The newest version of every part in the drawer, by kind and name."""
        with self.reading() as session:
            return drawer.newest(session)

    def part_versions(self, name: str) -> list[MadePart]:
        """All versions of a part in the drawer, oldest first.

        Raises:
            PartMissing: There is no part of this name.
        """
        with self.reading() as session:
            return drawer.versions(session, name)

    def keep_part(self, name: str, document: Mapping[str, Any]) -> MadePart:
        """Put a part into the drawer, as a new version where there is one of this name and it differs.

        Raises:
            PartRefused: The name may not be one, or belongs to a part of another kind.
            EngineError: No part can be made of the document.
        """
        with self._writing() as session:
            return drawer.keep(session, name, document, self._now())

    def sitting(self, name: str) -> Sitting | None:
        """Who has the design open to edit it; None when nobody does, or whoever did is dead."""
        with self.reading() as session:
            return self._seat.sitting(session.get(StoredSitting, self._find(session, name).design.id))

    def sit_down(self, name: str) -> Draft:
        """Open a design to edit it; the first write to it does the same by itself.

        Raises:
            DesignOpen: Another sitting has it open. It can still be looked at, or taken over.
        """
        with self._writing() as session:
            place = self._find(session, name)
            token = self._seat.sit_down(session, place.design, self._now())
            shown = self._shown(session, place)
        self._seat.tokens[place.design.id] = token
        return shown

    def take_over(self, name: str) -> Draft:
        """Take a design from the sitting that edits it, whose next write is refused; the draft is read anew."""
        with self._writing() as session:
            place = self._find(session, name)
            token = self._seat.claim(session, place.design, self._now())
            shown = self._shown(session, place)
        self._seat.tokens[place.design.id] = token
        return shown

    def leave(self, name: str) -> None:
        """Give a design back that is open here; nothing happens to one that is not."""
        with self.reading() as session:
            design = self._find(session, name).design.id
        if design in self._seat.tokens:
            with self._writing() as session:
                self._seat.release(session, [design])
            del self._seat.tokens[design]
            self._seat.seen.pop(design, None)

    def backup(self, target: Path | str) -> None:
        """Write a consistent copy of the store to ``target``, also while it is in use.

        Raises:
            StorageError: ``target`` cannot be written, is the store itself, or is a file of another kind.
        """
        with self.reading() as session:
            back_up(session, self.path, at_home(target))

    @contextmanager
    def reading(self) -> Iterator[Session]:
        """A session on one consistent state of the store, for functions of this folder that only read."""
        try:
            with plain_errors(self.path), Session(self._opened.reading, expire_on_commit=False) as session:
                yield session
        except (StoreUnreadable, EngineError, LookupError, TypeError, ValueError) as error:
            if not self.later:
                raise
            raise StoreTooNew(f"{self.why_read_only} What was asked for cannot be read here ({error}).") from error

    def _check_writable(self) -> None:
        if self._opened.refusal is not None:
            raise type(self._opened.refusal)(self.why_read_only)

    @contextmanager
    def _writing(self) -> Iterator[Session]:
        self._check_writable()
        with plain_errors(self.path), Session(self._opened.writing, expire_on_commit=False) as session:
            yield session
            session.commit()

    @contextmanager
    def _editing(self, name: str) -> Iterator[tuple[Session, _Place]]:
        with self._writing() as session:
            place = self._find(session, name)
            token = self._seat.checked(session, place.design, place.draft, self._now())
            yield session, place
        self._seat.tokens[place.design.id] = token

    def _find(self, session: Session, name: str) -> _Place:
        rows = select(StoredDesign, StoredDraft).where(StoredDraft.design_id == StoredDesign.id)
        # What cannot be written as UTF-8 is in no name; a ? stands for it here, which is in no name either.
        wanted = normalize("NFC", name).encode(errors="replace").decode()
        found = session.exec(rows.where(StoredDesign.name == wanted)).first()
        if found is not None:
            return _Place(*found)
        names = session.exec(select(StoredDesign.name)).all()
        near = get_close_matches(name, names, n=1)
        advice = f"did you mean '{near[0]}'?" if near else "see the names with `stagebook list`."
        raise DesignMissing(f"There is no design {name[:70]!r} on the shelf: {advice}")

    def _shown(self, session: Session, place: _Place, design: Design | None = None) -> Draft:
        number, saved_at = shelf.base(session, place.draft)
        before, after = edits.last(session, place.draft), edits.following(session, place.draft)
        return Draft(
            name=place.design.name,
            design=design or Design.load(place.draft.document),
            base_revision=number,
            edits=edits.distance(session, place.draft.head_id, saved_at),
            undo_label=None if before is None else before.label,
            redo_label=None if after is None else after.label,
        )

    def _now(self) -> str:
        return self._clock().astimezone(UTC).isoformat(timespec="seconds")
