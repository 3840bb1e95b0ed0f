"""The exception family of the store. Each message is one line: what is wrong, where, and what to do instead."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from .values import Sitting


class StorageError(Exception):
    """Any refusal of the store, in one line that can be shown as it is."""


class StoreUnreadable(StorageError):
    """The file is not a store, is damaged, or cannot be reached."""


class StoreReadOnly(StorageError):
    """The store can be looked at and not written."""


class StoreTooNew(StoreReadOnly):
    """A later Stagebook wrote the store: it can be looked at as far as this one knows its tables, and not written."""


class StoreBusy(StorageError):
    """Another program keeps the store locked."""


class StoreFull(StorageError):
    """The disk has no room for the write; what was saved before stands."""


class NameRefused(StorageError):
    """A text cannot be the name of a design."""


class NameTaken(StorageError):
    """The shelf already has a design of this name."""


class DesignMissing(StorageError):
    """The shelf has no design of this name."""


class RevisionMissing(StorageError):
    """The design has no revision of this number."""


class NothingToUndo(StorageError):
    """The draft stands at its first state."""


class NothingToRedo(StorageError):
    """No edit follows the draft's present state."""


class NoteRefused(StorageError):
    """A note cannot be kept as written."""


class MarginsRefused(StorageError):
    """The margins handed in are not those of the draft."""


class TakenOver(StorageError):
    """Another sitting edits the design now; nothing was written."""


class DesignOpen(StorageError):
    """Another sitting has the design open; it can be looked at or taken over. ``sitting`` says who and since when."""

    def __init__(self, words: str, sitting: Sitting) -> None:
        super().__init__(words)
        self.sitting = sitting


class PartRefused(StorageError):
    """A part cannot be put into the drawer as it is."""


class PartMissing(StorageError):
    """The drawer has no part of this name or version."""
