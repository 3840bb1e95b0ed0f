"""Opening the database file: settings, version, a copy to look at where nothing can be written, plain errors."""

from __future__ import annotations

import os
import shutil
import sqlite3
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryDirectory

from sqlalchemy import Engine, create_engine, event
from sqlalchemy.engine import Connection
from sqlalchemy.exc import DBAPIError
from sqlalchemy.pool import StaticPool
from sqlmodel import SQLModel

from .errors import StorageError, StoreBusy, StoreFull, StoreReadOnly, StoreTooNew, StoreUnreadable
from .place import beside, prepare
from .tables import APPLICATION, SCHEMA, triggers

PATIENCE = 5.0
"""Seconds to wait for another program's write to end."""


@dataclass(frozen=True, slots=True)
class Opened:
    """An open database: reads go through ``reading``, writes through ``writing``; ``copy`` is set if it is a copy.

    ``schema`` is the version of its tables, ``refusal`` what a write is refused with.
    """

    reading: Engine
    writing: Engine
    schema: int
    refusal: StoreReadOnly | None
    copy: TemporaryDirectory[str] | None

    def close(self) -> None:
        """Give the file back."""
        self.reading.dispose()
        if self.copy is not None:
            self.copy.cleanup()


def open_database(path: Path) -> Opened:
    """Open the store at ``path``, which is made if nothing is there yet and brought to this version if it is older.

    A store that cannot be written, or that a later version wrote, is opened read only; where even that needs a written
    file beside it, as SQLite's log does in a folder without write permission, or where its tables are older, a private
    copy of database and log is opened instead.

    Raises:
        StorageError: In one plain line, what is wrong with the file and what to do.
    """
    prepare(path)
    copy: TemporaryDirectory[str] | None = None
    refusal: StoreReadOnly | None = None
    with plain_errors(path):
        if os.access(path, os.W_OK) and os.access(path.parent, os.W_OK):
            connection = _writable(path)
        else:
            refusal = StoreReadOnly(
                f"{path} can be looked at and not written: give yourself write permission on it and its folder."
            )
            try:
                connection = _checked(path, path, "ro")
            except (sqlite3.Error, _Older):
                copy = copied(path)
                connection = _checked(Path(copy.name) / path.name, path, "rw")
                connection.execute("PRAGMA query_only = ON")
        (schema,) = connection.execute("PRAGMA user_version").fetchone()
    if schema > SCHEMA:
        refusal = StoreTooNew(
            f"{path} was written by a later Stagebook (tables of version {schema}, this one knows {SCHEMA}): "
            "it can be looked at and not written; update Stagebook to go on with it."
        )
    reading = _engine(connection)
    return Opened(reading, reading.execution_options(write=True), schema, refusal, copy)


class _Older(Exception):
    """The tables are of an earlier version, and cannot be brought forward where they lie."""


@contextmanager
def plain_errors(path: Path) -> Iterator[None]:
    """Turn what SQLite reports inside the block into one line that names the file and the remedy."""
    try:
        yield
    except DBAPIError as error:
        if not isinstance(error.orig, sqlite3.Error) or isinstance(error.orig, sqlite3.ProgrammingError):
            raise
        raise _plain(error.orig, path) from error
    except sqlite3.ProgrammingError:
        raise
    except sqlite3.Error as error:
        raise _plain(error, path) from error


def _plain(error: sqlite3.Error, path: Path) -> StorageError:
    code = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_ERROR) & 0xFF
    if code == sqlite3.SQLITE_NOTADB:
        return StoreUnreadable(f"{path} is not a Stagebook store: name another file with --store.")
    # What a damaged page holds may still be found where it belongs, and be no text any more.
    if code == sqlite3.SQLITE_CORRUPT or str(error).startswith("Could not decode to UTF-8"):
        return StoreUnreadable(
            f"{path} is damaged: put a backup in the place of it and {path.name}-wal, or save what "
            "can be read with `stagebook inspect --rescue FILE`."
        )
    if code in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED):
        return StoreBusy(f"Another program keeps {path} locked; nothing was written. Try again when it has ended.")
    if code == sqlite3.SQLITE_READONLY:
        return StoreReadOnly(f"{path} cannot be written: give yourself write permission on it and its folder.")
    if code == sqlite3.SQLITE_FULL:
        return StoreFull(f"The disk of {path} is full; the last change was not saved. Make room and try again.")
    if code in (sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_IOERR, sqlite3.SQLITE_PERM):
        return StoreUnreadable(
            f"{path} cannot be read or written ({error}): see whether the disk is full or failing, and the permissions."
        )
    return StoreUnreadable(
        f"{path} refused the request ({error}): run `stagebook inspect` to see whether it is damaged."
    )


def _writable(path: Path) -> sqlite3.Connection:
    connection = _checked(path, path, "rw")
    if _version(connection, path) > SCHEMA:
        connection.execute("PRAGMA query_only = ON")
        return connection
    for attempt in range(100):
        try:
            connection.execute("PRAGMA journal_mode = WAL").fetchall()
            break
        except sqlite3.OperationalError as error:
            # The busy timeout does not cover the change of journal mode, which a second opener may be making just now.
            if error.sqlite_errorcode & 0xFF != sqlite3.SQLITE_BUSY or attempt == 99:
                raise
            time.sleep(PATIENCE / 100)
    connection.execute("PRAGMA synchronous = FULL")
    connection.execute("PRAGMA fullfsync = ON")
    return connection


def _checked(file: Path, path: Path, mode: str) -> sqlite3.Connection:
    """A connection to ``file`` of this or a later version; messages name ``path``. Nothing foreign is written to."""
    uri = f"{file.absolute().as_uri()}?mode={mode}"
    connection = sqlite3.connect(uri, timeout=PATIENCE, isolation_level=None, uri=True)
    try:
        connection.execute("PRAGMA foreign_keys = ON")
        connection.execute("PRAGMA recursive_triggers = ON")
        connection.execute("PRAGMA trusted_schema = OFF")
        version = _version(connection, path)
        if version == 0 and mode == "ro":
            raise StoreReadOnly(f"{path} is empty and cannot be written: name another with --store.")
        if version == 0:
            _create(connection, path)
        elif version < SCHEMA and mode == "ro":
            raise _Older
        elif version < SCHEMA:
            from .migration import STEPS, migrate

            migrate(connection, file, SCHEMA, STEPS)
    except BaseException:
        connection.close()
        raise
    return connection


def _version(connection: sqlite3.Connection, path: Path) -> int:
    (version,) = connection.execute("PRAGMA user_version").fetchone()
    (application,) = connection.execute("PRAGMA application_id").fetchone()
    (tables,) = connection.execute("SELECT count(*) FROM sqlite_schema").fetchone()
    if (application, version) == (0, 0) and tables == 0:
        return 0
    if application != APPLICATION or version < 1:
        raise StoreUnreadable(f"{path} is a database of another program: name another file with --store.")
    return int(version)


def _create(connection: sqlite3.Connection, path: Path) -> None:
    engine = _engine(connection)
    with engine.execution_options(write=True).begin() as transaction:
        if _version(connection, path) == 0:  # another sitting may have been quicker
            SQLModel.metadata.create_all(transaction)
            for sql in triggers().values():
                transaction.exec_driver_sql(sql)
            transaction.exec_driver_sql(f"PRAGMA application_id = {APPLICATION}")
            transaction.exec_driver_sql(f"PRAGMA user_version = {SCHEMA}")


def copied(path: Path) -> TemporaryDirectory[str]:
    """A folder of its own with a copy of the database and its log, for their owner only. Raises OSError."""
    folder = TemporaryDirectory(prefix="stagebook-")
    for file in (path, beside(path, "-wal")):
        if file.exists():
            target = Path(folder.name) / file.name
            shutil.copyfile(file, target)
            target.chmod(0o600)
    return folder


def _engine(connection: sqlite3.Connection) -> Engine:
    engine = create_engine("sqlite://", creator=lambda: connection, poolclass=StaticPool)

    @event.listens_for(engine, "begin")
    def _begin(transaction: Connection) -> None:
        # Taking the write lock first means that what a write has read cannot change before it is committed.
        write = transaction.get_execution_options().get("write", False)
        transaction.exec_driver_sql("BEGIN IMMEDIATE" if write else "BEGIN")

    return engine
