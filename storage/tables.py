"""The tables of the store, and the triggers that keep what is saved from being changed."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Final

from sqlalchemy import Index
from sqlmodel import Field, SQLModel

SCHEMA: Final = 3
"""Version of the tables, kept as ``user_version``; a step in migration.py leads to each later one."""

APPLICATION: Final = 0x53544742
"""``application_id`` of a store, the letters STGB, by which a database of another program is told apart."""


class StoredDesign(SQLModel, table=True):
    """A name on the shelf."""

    __tablename__ = "design"
    id: int = Field(default=None, primary_key=True)
    name: str = Field(unique=True)
    created: str


class StoredEdit(SQLModel, table=True):
    """One edit of a draft: a node of the tree of states; the state before the first edit has no row.

    ``forward`` and ``inverse`` are JSON patches. ``used`` grows with use: redo follows the child with the largest.
    """

    __tablename__ = "edit"
    id: int = Field(default=None, primary_key=True)
    design_id: int = Field(foreign_key="design.id")
    parent_id: int | None = Field(default=None, foreign_key="edit.id")
    label: str
    forward: str
    inverse: str
    made: str
    used: int
    __table_args__ = (Index("edit_by_parent", "design_id", "parent_id", "used"),)


class StoredRevision(SQLModel, table=True):
    """A saved state. ``edit_id`` is where in the tree of edits it was saved, None for the state before the first."""

    __tablename__ = "revision"
    id: int = Field(default=None, primary_key=True)
    design_id: int = Field(foreign_key="design.id")
    number: int
    parent_id: int | None = Field(default=None, foreign_key="revision.id")
    edit_id: int | None = Field(default=None, foreign_key="edit.id")
    saved: str
    note: str
    document: str
    margins: str
    content: str
    hash: str
    __table_args__ = (Index("revision_by_number", "design_id", "number", unique=True),)


class StoredMargin(SQLModel, table=True):
    """One margin of a revision, for queries; the sheet itself is the text in the revision."""

    __tablename__ = "margin"
    revision_id: int = Field(primary_key=True, foreign_key="revision.id")
    position: int = Field(primary_key=True)
    check_id: str
    margin: float | None
    required: float
    slack: float
    verdict: str
    corner: str


class StoredEntry(SQLModel, table=True):
    """A later addition to a note; its hash covers the hash of the entry before it, or of the revision."""

    __tablename__ = "note_entry"
    id: int = Field(default=None, primary_key=True)
    revision_id: int = Field(foreign_key="revision.id", index=True)
    field: str
    text: str
    added: str
    hash: str


class StoredDraft(SQLModel, table=True):
    """The working copy: where in the tree it stands, the revision it is based on, and the document at that place."""

    __tablename__ = "draft"
    design_id: int = Field(primary_key=True, foreign_key="design.id")
    head_id: int | None = Field(default=None, foreign_key="edit.id")
    base_id: int | None = Field(default=None, foreign_key="revision.id")
    document: str


class StoredSitting(SQLModel, table=True):
    """Who edits a design: a fencing token that grows whenever another sitting takes the design over.

    ``seat`` names the presence of its process (presence.py), ``who`` is told to others.
    """

    __tablename__ = "sitting"
    design_id: int = Field(primary_key=True, foreign_key="design.id")
    token: int
    since: str
    closed: bool = False
    seat: str = Field(default="", sa_column_kwargs={"server_default": ""})
    who: str = Field(default="", sa_column_kwargs={"server_default": ""})


class StoredMadePart(SQLModel, table=True):
    """One version of a part in the drawer. ``document`` is a part of a document without designator and nets."""

    __tablename__ = "made_part"
    id: int = Field(default=None, primary_key=True)
    name: str
    version: int
    kind: str
    document: str
    made: str
    __table_args__ = (Index("made_part_by_name", "name", "version", unique=True),)


class StoredSeal(SQLModel, table=True):
    """One thing that was saved: what (a table and its row), in words, and its hash, chained to the entry before.

    The numbers have no gaps, and ``sqlite_sequence`` keeps the largest there ever was.
    """

    __tablename__ = "seal"
    id: int = Field(default=None, primary_key=True)
    kind: str
    subject: int
    about: str
    content: str
    hash: str
    __table_args__ = ({"sqlite_autoincrement": True},)


KEYS: Final = {
    "revision": ("id = NEW.id", "design_id = NEW.design_id AND number = NEW.number"),
    "margin": ("revision_id = NEW.revision_id AND position = NEW.position",),
    "note_entry": ("id = NEW.id",),
    "made_part": ("id = NEW.id", "name = NEW.name AND version = NEW.version"),
    "seal": ("id = NEW.id",),
}
"""The append-only tables, each with its keys."""


def triggers(tables: Iterable[str] = KEYS) -> dict[str, str]:
    """Name and SQL of the triggers that refuse to change, delete or replace a row of the append-only ``tables``.

    INSERT OR REPLACE deletes without firing delete triggers unless ``recursive_triggers`` is on, so an insert of a key
    that exists is refused by itself.
    """
    found = {}
    for table in tables:
        refusal = f"SELECT RAISE(ABORT, 'what is saved in {table} is never changed')"
        exists = " OR ".join(f"EXISTS (SELECT 1 FROM {table} WHERE {key})" for key in KEYS[table])
        for name, event in {
            f"{table}_no_update": f"BEFORE UPDATE ON {table}",
            f"{table}_no_delete": f"BEFORE DELETE ON {table}",
            f"{table}_no_replace": f"BEFORE INSERT ON {table} WHEN {exists}",
        }.items():
            found[name] = f"CREATE TRIGGER {name} {event} BEGIN {refusal}; END"
    return found
