"""A consistent copy of a store while it is in use, made whole or not at all."""

from __future__ import annotations

import os
import sqlite3
from contextlib import closing
from glob import escape
from pathlib import Path
from tempfile import mkstemp

from sqlmodel import Session

from .errors import StorageError
from .place import beside, sync_folder
from .presence import lock, remove_abandoned
from .tables import APPLICATION


def back_up(session: Session, store: Path, target: Path) -> None:
    """Copy the store that ``session`` reads to ``target``, over an earlier copy but over nothing else.

    Raises:
        StorageError: ``target`` cannot be written, is the store itself, or is a file of another kind; or the store is
            damaged.
    """
    check_target(store, target)
    connection = session.connection().connection.driver_connection
    if not isinstance(connection, sqlite3.Connection):
        raise TypeError("the store is not on SQLite's own driver")
    copy_database(connection, target, only_whole=True)


def check_target(store: Path, target: Path) -> None:
    """Refuse a place for a copy where something other than an earlier copy lies.

    Raises:
        StorageError: ``target`` is the store itself, a file of another kind, or cannot be looked at.
    """
    try:
        if not target.exists():
            return
        if target.is_file() and store.exists() and target.samefile(store):
            raise StorageError(f"{target} is the store itself: name another place for the copy.")
        if not target.is_file() or not _is_store(target):
            raise StorageError(f"{target} is there and is no copy of a store: name another place for the copy.")
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise StorageError(f"The copy {target} cannot be written ({reason}): name another place for it.") from error


def _is_store(file: Path) -> bool:
    """Whether the header of a database (SQLite file format, section 1.3) has the ``application_id`` of a store."""
    with file.open("rb") as data:
        return data.read(72)[68:] == APPLICATION.to_bytes(4, "big")


def _check_whole(copy: sqlite3.Connection, target: Path) -> None:
    """Refuse to put the copy of a damaged store where a good one may lie."""
    try:
        damage = [line for (line,) in copy.execute("PRAGMA quick_check(1)") if line != "ok"]
    except sqlite3.DatabaseError as error:
        damage = [str(error)]
    if damage:
        raise StorageError(
            f"The store is damaged and is not copied to {target}, where a good copy may lie: `stagebook inspect` names "
            "what is wrong, and with --rescue FILE it saves what can be read."
        )


def copy_database(source: sqlite3.Connection, target: Path, *, only_whole: bool = False) -> None:
    """Copy the database of ``source`` to ``target`` (mode 0600): temporary name, fsync, rename.

    Raises:
        StorageError: ``target`` cannot be written or, with ``only_whole``, the database is damaged; what was there
            before stands.
    """
    temporary: Path | None = None
    try:
        remove_abandoned(target.parent, f".{escape(target.name)}-*.part")
        handle, name = mkstemp(prefix=f".{target.name}-", suffix=".part", dir=target.parent)
        temporary = Path(name)
        lock(handle)  # for as long as the handle is open nobody takes the file for an abandoned one
        with closing(sqlite3.connect(temporary, isolation_level=None)) as copy:
            source.backup(copy)
            if only_whole:
                _check_whole(copy, target)
            # One file that can be read from a medium without write permission: no log beside it.
            copy.execute("PRAGMA journal_mode = DELETE").fetchall()
        os.fsync(handle)
        os.replace(temporary, target)
        sync_folder(target.parent)
    except (OSError, ValueError, sqlite3.OperationalError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise StorageError(f"The copy {target} cannot be written ({reason}): name another place for it.") from error
    finally:
        if temporary is not None:
            for ending in ("", "-wal", "-shm", "-journal"):
                beside(temporary, ending).unlink(missing_ok=True)
            os.close(handle)
