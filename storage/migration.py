"""Bringing a store of an earlier version forward, one step and one transaction a version."""

from __future__ import annotations

import itertools
import sqlite3
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Final

from .backup import copy_database
from .errors import StoreUnreadable
from .place import beside
from .sealed import seal_all
from .tables import KEYS, triggers

Step = Callable[[sqlite3.Connection], None]


def _to_second(connection: sqlite3.Connection) -> None:
    """To version 2: a sitting names its process and who sits there; the drawer."""
    for column in ("seat", "who"):
        connection.execute(f"ALTER TABLE sitting ADD COLUMN {column} VARCHAR DEFAULT '' NOT NULL")
    connection.execute(
        "CREATE TABLE made_part (id INTEGER NOT NULL, name VARCHAR NOT NULL, version INTEGER NOT NULL,"
        " kind VARCHAR NOT NULL, document VARCHAR NOT NULL, made VARCHAR NOT NULL, PRIMARY KEY (id))"
    )
    connection.execute("CREATE UNIQUE INDEX made_part_by_name ON made_part (name, version)")


def _to_third(connection: sqlite3.Connection) -> None:
    """To version 3: the seal, of all that is there."""
    connection.execute(
        "CREATE TABLE seal (id INTEGER NOT NULL PRIMARY KEY AUTOINCREMENT, kind VARCHAR NOT NULL,"
        " subject INTEGER NOT NULL, about VARCHAR NOT NULL, content VARCHAR NOT NULL, hash VARCHAR NOT NULL)"
    )
    seal_all(connection)


STEPS: Final[Mapping[int, Step]] = {1: _to_second, 2: _to_third}
"""For each version that a store may still have, what leads to the next one. It must end at the tables of tables.py."""


def migrate(connection: sqlite3.Connection, path: Path, target: int, steps: Mapping[int, Step]) -> Path:
    """Bring the open store to version ``target`` and return where the copy of it as it was is.

    The append-only triggers are away while a step runs and back before its transaction ends.

    Raises:
        StoreUnreadable: A step failed or is not there; the store is as the last whole step left it.
    """
    (version,) = connection.execute("PRAGMA user_version").fetchone()
    copies = (beside(path, f"-version-{version}-{n}") for n in itertools.count(1))
    aside = next(copy for copy in copies if not copy.exists())
    copy_database(connection, aside)
    # Outside a transaction only: a step that builds a table anew must be able to drop the old one.
    connection.execute("PRAGMA foreign_keys = OFF")
    try:
        for at in range(version, target):
            _step(connection, at, steps)
    except (sqlite3.Error, LookupError, StoreUnreadable) as error:
        raise StoreUnreadable(
            f"{path} could not be brought to version {target} ({error}): put its copy {aside} "
            "in its place to go on with the earlier Stagebook."
        ) from error
    finally:
        connection.execute("PRAGMA foreign_keys = ON")
    return aside


def _step(connection: sqlite3.Connection, version: int, steps: Mapping[int, Step]) -> None:
    connection.execute("BEGIN IMMEDIATE")
    try:
        (now,) = connection.execute("PRAGMA user_version").fetchone()
        if now == version:  # otherwise another sitting was quicker
            for (name,) in connection.execute("SELECT name FROM sqlite_schema WHERE type = 'trigger'").fetchall():
                connection.execute(f'DROP TRIGGER "{name}"')
            steps[version](connection)
            here = {name for (name,) in connection.execute("SELECT name FROM sqlite_schema WHERE type = 'table'")}
            for sql in triggers(table for table in KEYS if table in here).values():
                connection.execute(sql)
            if connection.execute("PRAGMA foreign_key_check").fetchone():
                raise StoreUnreadable(f"the step from version {version} leaves rows without their owner")
            connection.execute(f"PRAGMA user_version = {version + 1}")
    except BaseException:
        if connection.in_transaction:
            connection.execute("ROLLBACK")
        raise
    connection.execute("COMMIT")
