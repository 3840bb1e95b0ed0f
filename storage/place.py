"""Where the store lies, and files that only their owner can read."""

from __future__ import annotations

import os
from pathlib import Path

from platformdirs import user_data_path

from .errors import StoreUnreadable

HEADER = 100
"""Bytes at the head of every database (SQLite file format, section 1.3)."""


def default_path() -> Path:
    """The database file that STAGEBOOK_STORE names, otherwise the one in the user's data folder."""
    named = os.environ.get("STAGEBOOK_STORE")
    return at_home(named) if named else user_data_path("stagebook") / "stagebook.sqlite3"


def at_home(path: Path | str) -> Path:
    """The path with ``~`` and ``~user`` replaced by their home; as it is where there is no such user."""
    try:
        return Path(path).expanduser()
    except RuntimeError:
        return Path(path)


def is_missing(path: Path) -> bool:
    """Whether there is nothing of this name. What may not be looked at may be there: whoever opens it says why not."""
    try:
        path.stat()
    except (FileNotFoundError, NotADirectoryError, ValueError):
        return True
    except OSError:
        return False
    return False


def beside(path: Path, ending: str) -> Path:
    """The file next to ``path`` whose name has ``ending`` added, as SQLite names its log."""
    return path.parent / f"{path.name}{ending}"


def prepare(path: Path) -> None:
    """Make sure that a file for the store is there: a new one is empty, mode 0600, in a folder of mode 0700.

    Raises:
        StoreUnreadable: There is no way to a file at ``path``, or only the log of a lost database is there.
    """
    log = beside(path, "-wal")
    try:
        path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
        size = path.stat().st_size if path.exists() else 0
        if path.exists() and not path.is_file():
            raise StoreUnreadable(f"{path} is not a file: name a file for the store with --store.")
        if size == 0 and log.exists() and log.stat().st_size > 0:
            # SQLite would take the empty database for a new one and delete the log with what was saved last.
            raise StoreUnreadable(
                f"{log} is there without its database: put {path.name} back beside it, or move {log.name} away."
            )
        if 0 < size < HEADER:  # SQLite takes a file of one byte for a new database
            raise StoreUnreadable(f"{path} is not a Stagebook store: name another file with --store.")
        os.close(os.open(path, os.O_CREAT | os.O_RDONLY, 0o600))
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise StoreUnreadable(f"{path} cannot be opened ({reason}): name another file with --store.") from error


def sync_folder(folder: Path) -> None:
    """Bring a new or renamed entry of ``folder`` safely to the disk, where the system allows that."""
    if os.name == "posix":
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
