"""Designs, drafts, revisions, margins and notes in SQLite. Knows no screen."""

from __future__ import annotations

from .errors import (
    DesignMissing,
    DesignOpen,
    MarginsRefused,
    NameRefused,
    NameTaken,
    NoteRefused,
    NothingToRedo,
    NothingToUndo,
    PartMissing,
    PartRefused,
    RevisionMissing,
    StorageError,
    StoreBusy,
    StoreFull,
    StoreReadOnly,
    StoreTooNew,
    StoreUnreadable,
    TakenOver,
)
from .inspection import Inspection, inspect, verify
from .names import checked_name
from .place import at_home, default_path, is_missing
from .rescue import Rescued, rescue
from .store import Store
from .values import ADDABLE, DesignRow, Draft, MadePart, Note, NoteEntry, Revision, Sitting, Worst

__all__ = [
    "ADDABLE",
    "DesignMissing",
    "DesignOpen",
    "DesignRow",
    "Draft",
    "Inspection",
    "MadePart",
    "MarginsRefused",
    "NameRefused",
    "NameTaken",
    "Note",
    "NoteEntry",
    "NoteRefused",
    "NothingToRedo",
    "NothingToUndo",
    "PartMissing",
    "PartRefused",
    "Rescued",
    "Revision",
    "RevisionMissing",
    "Sitting",
    "StorageError",
    "Store",
    "StoreBusy",
    "StoreFull",
    "StoreReadOnly",
    "StoreTooNew",
    "StoreUnreadable",
    "TakenOver",
    "Worst",
    "at_home",
    "checked_name",
    "default_path",
    "inspect",
    "is_missing",
    "rescue",
    "verify",
]
