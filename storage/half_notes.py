"""Notes that are still being written: one file a design beside the store, until a revision has what stands in it.

Nothing here touches the database, so that it may be called from any thread. A copy of the store does not have them.
"""

from __future__ import annotations

import errno
import json
import os
from collections.abc import Mapping
from dataclasses import fields
from glob import escape
from hashlib import sha256
from pathlib import Path
from tempfile import mkstemp

from .errors import StoreFull, StoreReadOnly
from .place import beside, sync_folder
from .presence import lock, remove_abandoned
from .values import Note

MOST_BYTES = 1_000_000
"""Of a file that is read: several times the longest note."""
_PLACES = frozenset(field.name for field in fields(Note))


def half_note(store: Path, design: str) -> dict[str, str]:
    """What was written for the next revision of a design, by place of the note; nothing where no file tells."""
    try:
        with _file(store, design).open("rb") as file:
            found = json.loads(file.read(MOST_BYTES))
    except (OSError, ValueError, RecursionError):
        return {}
    if not isinstance(found, dict) or found.get("design") != design or not isinstance(found.get("note"), dict):
        return {}
    return {place: text for place, text in found["note"].items() if place in _PLACES and isinstance(text, str)}


def keep_half_note(store: Path, design: str, written: Mapping[str, str]) -> None:
    """Keep what is written so far on the disk, for its owner only; nothing written leaves no file.

    Raises:
        StoreFull, StoreReadOnly: It cannot be kept; what was kept before stands.
    """
    file = _file(store, design)
    temporary: Path | None = None
    handle = -1
    try:
        if not any(written.values()):
            file.unlink(missing_ok=True)
            return
        remove_abandoned(file.parent, f".{escape(file.name)}-*.part")
        handle, name = mkstemp(prefix=f".{file.name}-", suffix=".part", dir=file.parent)
        temporary = Path(name)
        lock(handle)  # for as long as the handle is open nobody takes the file for an abandoned one
        with open(handle, "w", encoding="utf-8", errors="replace", closefd=False) as out:
            json.dump({"design": design, "note": dict(written)}, out)
        os.fsync(handle)
        os.replace(temporary, file)
        temporary = None
        sync_folder(file.parent)
    except OSError as error:
        full = error.errno in {errno.ENOSPC, getattr(errno, "EDQUOT", errno.ENOSPC)}
        remedy = "make room" if full else f"give yourself write permission on {file.parent}"
        words = f"A note that is being written cannot be kept ({error.strerror or error}): {remedy}."
        raise (StoreFull if full else StoreReadOnly)(words) from error
    finally:
        if temporary is not None:
            temporary.unlink(missing_ok=True)
        if handle >= 0:
            os.close(handle)


def _file(store: Path, design: str) -> Path:
    # No name of a design becomes part of a path.
    return beside(store.resolve(), f"-note-{sha256(design.encode(errors='replace')).hexdigest()[:16]}")
