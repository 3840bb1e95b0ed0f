"""What the store hands out: frozen values. Times are ISO 8601 texts in UTC."""

from __future__ import annotations

import gc
import json
from dataclasses import dataclass, fields
from functools import cached_property
from typing import Any, Final

from ..engine.design.document import Design
from ..engine.design.part import Part
from ..engine.results import MarginSheet, Verdict


@dataclass(frozen=True, slots=True)
class Note:
    """Why a revision exists. One line is enough; the other places may stay empty, and the result is added later."""

    line: str
    symptom: str = ""
    hypothesis: str = ""
    change: str = ""
    prediction: str = ""
    result: str = ""
    next: str = ""


ADDABLE: Final = tuple(field.name for field in fields(Note) if field.name != "line")
"""The places of a saved note that can still be added to."""


@dataclass(frozen=True, slots=True)
class NoteEntry:
    """One later addition to a place of a revision's note."""

    field: str
    text: str
    added: str


@dataclass(frozen=True, slots=True)
class Worst:
    """The check with the least slack of a revision; ``margin`` is a fraction, None when it is unknown.

    ``outcome`` says what happened where the margin is none of figures, as in the sheet.
    """

    id: str
    margin: float | None
    verdict: Verdict
    outcome: str | None = None


@dataclass(frozen=True)
class MadePart:
    """One version of a part in the drawer: a part of a document without designator and nets."""

    name: str
    version: int
    kind: str
    document_text: str
    made: str

    @property
    def title(self) -> str:
        """The name with the version, as a design that uses it keeps it."""
        return f"{self.name}, version {self.version}"

    @cached_property
    def document(self) -> dict[str, Any]:
        """The part as a design document writes it."""
        found: dict[str, Any] = json.loads(self.document_text)
        return found

    @property
    def part(self) -> Part:
        """The same as a part; a value that it needs and does not have is there as a stand-in."""
        from ..engine.parts.made import as_design

        return as_design(self.document).parts[0]


@dataclass(frozen=True, slots=True)
class DesignRow:
    """One line of the shelf. ``edits_pending`` counts the steps between the draft and the revision it is based on.

    ``worst`` is the newest revision's; ``content`` is the SHA-256 of the draft's document, as in its own figures.
    """

    name: str
    revisions: int
    saved: str | None
    worst: Worst | None
    edits_pending: int
    content: str


@dataclass(frozen=True, slots=True)
class Draft:
    """The working copy of a design.

    ``base_revision`` is the revision that the next save has as its parent, None before the first save. ``edits`` counts
    the steps of undo or redo between the draft and that revision, or since the start when there is none.
    ``undo_label`` and ``redo_label`` are the labels of the edits that an undo takes back and a redo brings again.
    """

    name: str
    design: Design
    base_revision: int | None
    edits: int
    undo_label: str | None
    redo_label: str | None

    @property
    def can_undo(self) -> bool:
        """Whether an edit leads to the present state."""
        return self.undo_label is not None

    @property
    def can_redo(self) -> bool:
        """Whether an edit follows the present state."""
        return self.redo_label is not None


@dataclass(frozen=True)
class Revision:
    """An immutable saved state of a design.

    ``note`` reads as of now, with what was ``added`` later on further lines; the hash covers it as it was when saved.
    ``content`` is the SHA-256 of the document alone, ``hash`` covers the parent's hash, document, note and margins.
    ``design`` and ``sheet`` are read from the stored texts when they are first asked for.
    """

    number: int
    parent: int | None
    saved: str
    note: Note
    added: tuple[NoteEntry, ...]
    content: str
    hash: str
    document: str
    margins: str

    @cached_property
    def design(self) -> Design:
        """The document of this revision."""
        return Design.load(self.document)

    @cached_property
    def sheet(self) -> MarginSheet:
        """The margins as they were when the revision was saved."""
        # Thousands of small values and no cycle: to look for garbage among them takes as long as to make them.
        collects = gc.isenabled()
        gc.disable()
        try:
            return MarginSheet.from_json(json.loads(self.margins))
        finally:
            if collects:
                gc.enable()


@dataclass(frozen=True, slots=True)
class Sitting:
    """Who has a design open at present: since when, who in words, and whether it is this store itself."""

    since: str
    who: str
    here: bool
