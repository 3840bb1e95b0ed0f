"""The draft under the hand: every edit is a pure function of the design, kept in the store before anything else."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from ..engine import edit
from ..engine.design.differences import Change, differences
from ..engine.design.document import Design
from ..engine.design.part import Part
from ..engine.errors import EngineError
from ..engine.parts.made import as_design, kept
from ..engine.results import ENGINE, Depth, MarginSheet
from ..storage.errors import StorageError
from ..storage.store import Store
from ..storage.values import Draft, MadePart, Note, Revision


class Drawer:
    """The parts in the drawer of a store. Methods raise EngineError or StorageError with one line."""

    def __init__(self, store: Store) -> None:
        self._store = store

    def drawer(self, *, every_version: bool = False) -> list[MadePart]:
        """The parts in the drawer: the newest version of each, or all."""
        newest = self._store.drawer()
        if not every_version:
            return newest
        return [made for part in newest for made in reversed(self._store.part_versions(part.name))]

    def keep_part(self, name: str, document: Mapping[str, Any]) -> MadePart:
        """Puts a part into the drawer."""
        return self._store.keep_part(name, document)


class Drafting(Drawer):
    """One design's draft and the revision it began from. ``looking`` is set while it is not open to be edited here.

    Every method that changes something raises EngineError or StorageError with one line and then has changed
    nothing; after it returns, the edit is committed.
    """

    def __init__(self, store: Store, name: str) -> None:
        super().__init__(store)
        self.draft: Draft = store.draft(name)
        self.looking = True
        self.base: Revision | None = self._base()
        self._changes: tuple[Change, ...] = ()
        self._changes_of: tuple[str, str] | None = None
        self._begun: Design | None = None
        self._noted: tuple[Change, ...] = ()
        self._noted_of = ""

    @property
    def name(self) -> str:
        """The design's name on the shelf."""
        return self.draft.name

    @property
    def design(self) -> Design:
        """The design as it stands."""
        return self.draft.design

    def stored_figures(self) -> MarginSheet | None:
        """The revision's own margins where the draft is just that revision and this engine made them in full."""
        sheet = None if self.base is None else self.base.sheet
        if sheet is None or sheet.content != self.design.content or sheet.engine != ENGINE:
            return None
        return sheet if sheet.depth is Depth.SPREAD else None

    def sit_down(self) -> None:
        """Opens the design to edit it and reads it anew. Raises DesignOpen when another sitting has it open."""
        self.draft = self._store.sit_down(self.name)
        self.base = self._base()
        self.looking = False

    def leave(self) -> None:
        """Gives the design back to whoever opens it next."""
        self._store.leave(self.name)

    def take_over(self) -> None:
        """Takes the design from another sitting and reads the draft as that one left it."""
        self.draft = self._store.take_over(self.name)
        self.base = self._base()
        self.looking = False

    def branch(self, number: int) -> None:
        """Lets the draft go on from a revision, which the next one then has as its parent."""
        self.draft = self._store.branch(self.name, number)
        self.base = self._base()

    def revisions(self) -> list[Revision]:
        """All revisions, oldest first."""
        return self._store.revisions(self.name)

    def add_result(self, number: int, text: str) -> None:
        """Writes what came of it under a revision's note."""
        self._store.add_note(self.name, number, "result", text)

    def set_value(self, ref: str, text: str) -> None:
        """Writes the value of a part."""
        self._keep(f"{ref} {text}", edit.with_value(self.design, ref, text))

    def step(self, ref: str, direction: int) -> None:
        """Puts in the next preferred value above (+1) or below (-1)."""
        after = edit.stepped_value(self.design, ref, direction)
        self._keep(f"{ref} {after.part(ref).value}", after)

    def put(self, label: str, after: Design) -> None:
        """Keeps a design that another pure edit made."""
        self._keep(label, after)

    def undo(self) -> str:
        """Takes the last edit back; returns what it was."""
        label = self.draft.undo_label or ""
        self.draft = self._store.undo(self.name)
        return label

    def redo(self) -> str:
        """Brings the undone edit again; returns what it is."""
        label = self.draft.redo_label or ""
        self.draft = self._store.redo(self.name)
        return label

    def save(self, note: Note, sheet: MarginSheet | None) -> Revision:
        """Keeps the draft as a revision. Without a sheet of corners it is stamped incomplete by its depth."""
        revision = self._store.save(self.name, note, sheet or self._no_margins())
        self.draft = self._store.draft(self.name)
        self.base = revision
        return revision

    def half_note(self) -> dict[str, str]:
        """What was written for the next revision before this program began; nothing that has become one since."""
        written = self._store.half_note(self.name)
        revisions = self._store.revisions(self.name) if written else []
        newest = revisions[-1].note if revisions else Note("")
        return {} if all(getattr(newest, place) == text for place, text in written.items()) else written

    def changes(self) -> tuple[Change, ...]:
        """What differs from the revision the draft began from."""
        if self.base is None:
            return ()
        now = (self.base.hash, self.design.content)
        if self._changes_of != now:
            self._changes_of, self._changes = now, differences(self.base.design, self.design)
        return self._changes

    def noted_changes(self) -> tuple[Change, ...]:
        """What the next revision changes: from the revision before it, or from the design as it was put on the
        shelf."""
        if self.base is not None or self.draft.edits == 0:
            return self.changes()
        if self._begun is None:
            try:
                self._begun = self._store.beginning(self.name)
            except StorageError:  # a note can be written without; undo says what is damaged
                return ()
        if self._noted_of != self.design.content:
            self._noted_of, self._noted = self.design.content, differences(self._begun, self.design)
        return self._noted

    def neighbours(self, ref: str) -> tuple[str | None, str | None]:
        """The next lower and next higher preferred value of a part; None where there is none."""
        return self._stepped(ref, -1), self._stepped(ref, 1)

    def was(self, ref: str) -> str | None:
        """The value the part had in the revision the draft began from; None if it was not there."""
        if self.base is None or ref not in {part.ref for part in self.base.design.parts}:
            return None
        return self.base.design.part(ref).value

    def _keep(self, label: str, after: Design) -> None:
        if after != self.design:
            self.draft = self._store.edit(self.name, label, after)

    def _stepped(self, ref: str, direction: int) -> str | None:
        try:
            return edit.stepped_value(self.design, ref, direction).part(ref).value
        except EngineError:
            return None

    def _base(self) -> Revision | None:
        number = self.draft.base_revision
        return None if number is None else self._store.revision(self.name, number)

    def _no_margins(self) -> MarginSheet:
        return MarginSheet(
            design=self.name,
            content=self.design.content,
            engine="",
            seed=0,
            lanes=0,
            seconds=0.0,
            depth=Depth.NOMINAL,
            checks=(),
        )


class MadeDraft:
    """A part that is being made for the drawer. Nothing is kept before :meth:`Drawer.keep_part`."""

    def __init__(self, document: Mapping[str, Any], name: str) -> None:
        """Raises DesignError for a document that is no part."""
        self._design = as_design(document)
        self._name = name
        self._stands_in = "value" not in document

    @property
    def part(self) -> Part:
        """The part as it stands."""
        return self._design.parts[0]

    @property
    def document(self) -> dict[str, Any]:
        """What is to be kept of it."""
        found = kept(self.part)
        if self._stands_in:
            found.pop("value", None)
        return found

    def write(self, field: str, value: Any) -> Part:
        """Writes one field; None takes it out. Raises DesignError."""
        if field == "value" and value is None:
            self._design = as_design({key: entry for key, entry in self.document.items() if key != "value"})
            self._stands_in = True
            return self.part
        self._design = edit.with_field(self._design, self.part.ref, field, value)
        if field == "value":
            self._stands_in = False
        return self.part


def refuse_newly_wrong(before: Design, after: Design) -> None:
    """Raise DesignError, in one line, for what an edit makes wrong; to be asked before it is kept."""
    # Imported here: the checks load the compiler.
    from ..engine.studies.newly_wrong import refuse_newly_wrong as refuse

    refuse(before, after)


def incomplete(sheet: MarginSheet) -> bool:
    """Whether a revision was saved before its worst corners were known."""
    return sheet.depth is Depth.NOMINAL


def changes_words(changes: tuple[Change, ...]) -> str:
    """All differences in one line."""
    return ", ".join(change_words(change) for change in changes)


def change_words(change: Change) -> str:
    """One difference in words: ``R8 330k > 470k``, ``+R9 1k``, ``-D2``."""
    if change.before is None:
        return f"+{change.what} {change.after or ''}".strip()
    if change.after is None:
        return f"-{change.what}"
    return f"{change.what} {change.before} > {change.after}"
