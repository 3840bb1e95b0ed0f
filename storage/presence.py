"""Whether another process still lives: a file that it keeps locked, and that the system unlocks however it ends.

The locks are those of flock, on POSIX systems; where there are none, nobody is known to be present, and the tokens of
sittings.py alone keep one sitting from writing over another.
"""

from __future__ import annotations

import os
import secrets
from contextlib import suppress
from glob import escape
from pathlib import Path

try:
    import fcntl
except ImportError:  # Windows
    _HAS_LOCKS = False
else:
    _HAS_LOCKS = True

_ATTEMPTS = 10


def lock(handle: int) -> bool:
    """Lock an open file for as long as it stays open here; False where another process has it or nothing locks."""
    if not _HAS_LOCKS:
        return False
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def is_locked(file: Path) -> bool:
    """Whether a living process keeps ``file`` locked."""
    if not _HAS_LOCKS:
        return False
    try:
        handle = os.open(file, os.O_RDONLY | os.O_NONBLOCK)  # a pipe of that name would keep us waiting
    except OSError:
        return False
    try:
        # Shared, so that two who ask at the same time do not take each other for the owner.
        fcntl.flock(handle, fcntl.LOCK_SH | fcntl.LOCK_NB)
    except BlockingIOError:
        return True
    except OSError:
        return False
    finally:
        os.close(handle)
    return False


def remove_abandoned(folder: Path, pattern: str) -> None:
    """Delete the files that dead processes left behind, with SQLite's files beside them; what cannot go stays."""
    if _HAS_LOCKS:
        with suppress(OSError):
            for file in folder.glob(pattern):
                if not is_locked(file):
                    for gone in (*folder.glob(f"{escape(file.name)}-*"), file):
                        gone.unlink(missing_ok=True)


class Presence:
    """A locked file beside a store while this object is not left. ``name`` tells others which one; "" if there is none.

    Args:
        store: The file of the store.
    """

    def __init__(self, store: Path) -> None:
        self.name = ""
        self._file: Path | None = None
        self._handle: int | None = None
        place = store.resolve()
        remove_abandoned(place.parent, f"{escape(place.name)}-sitting-*")
        with suppress(OSError):
            for _ in range(_ATTEMPTS):
                if self._take(place):
                    return

    def leave(self) -> None:
        """Delete the file and unlock it."""
        if self._handle is not None and self._file is not None:
            self._file.unlink(missing_ok=True)
            os.close(self._handle)
        self.name, self._file, self._handle = "", None, None

    def _take(self, store: Path) -> bool:
        name = secrets.token_hex(8)
        file = _file(store, name)
        handle = os.open(file, os.O_CREAT | os.O_EXCL | os.O_RDWR, 0o600)
        # Before it was locked, another process may have taken the file for an abandoned one.
        if lock(handle) and os.fstat(handle).st_nlink:
            self.name, self._file, self._handle = name, file, handle
            return True
        os.close(handle)
        file.unlink(missing_ok=True)
        return False


def is_present(store: Path, name: str) -> bool:
    """Whether the process whose presence at ``store`` has this name still lives."""
    # The name comes out of a file that anybody may have made: it leads nowhere else.
    return name.isalnum() and is_locked(_file(store.resolve(), name))


def _file(store: Path, name: str) -> Path:
    return store.parent / f"{store.name}-sitting-{name}"
