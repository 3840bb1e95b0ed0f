"""Files that commands and screens write: whole or not at all, and never over what must be kept."""

from __future__ import annotations

import os
import re
import shutil
from pathlib import Path

from .shown import visible


class FileRefused(Exception):
    """A file that cannot be written, in one line that says which, why, and what to name instead."""


_DATABASE = b"SQLite format 3\0"
LONGEST_NAME = 100
"""Bytes of a file name that is made of a design's; file systems take 255."""
_DEVICE = re.compile("(con|prn|aux|nul|com[0-9]|lpt[0-9])", re.IGNORECASE)


def check_target(path: str, source: str | None = None) -> None:
    """Refuse a file that cannot be written, is a database or is ``source``, which the command reads.

    For commands that compute for a while: nobody waits for what cannot be kept then.
    """
    try:
        named = Path(path)
        if not path or path.endswith(os.sep) or named.is_dir():
            raise IsADirectoryError(0, "it is a folder" if path else "it has no name")
        if _is_device(named):
            return
        target = named.resolve()
        if not target.parent.is_dir():
            raise FileNotFoundError(0, f"there is no folder {target.parent}")
        if not os.access(target if target.exists() else target.parent, os.W_OK):
            raise PermissionError(0, "no permission to write")
        if target.exists():
            _check_replaceable(path, target, source)
    except (OSError, ValueError, RuntimeError) as error:
        raise _refusal(path, error) from error


def write_file(path: str, content: bytes, source: str | None = None) -> None:
    """Put ``content`` into a file, whole or not at all. Refusals name the file, see :func:`check_target`."""
    check_target(path, source)
    try:
        if _is_device(Path(path)):
            Path(path).write_bytes(content)
        else:
            _replace(Path(path).resolve(), content)
    except OSError as error:
        raise _refusal(path, error) from error


def file_name(name: str, ending: str) -> str:
    """A file name made of a design's name: it has no folder in it, is hidden nowhere, and means no device anywhere.

    All but letters, digits, spaces, ``-`` and ``_`` becomes ``_``. The names of devices are those that Windows keeps
    for itself ("Naming Files, Paths, and Namespaces", Microsoft Learn).
    """
    plain = "".join(c if c.isalpha() or c.isdecimal() or c in "-_ " else "_" for c in name).strip(" ")
    while len(plain.encode()) > LONGEST_NAME:
        plain = plain[:-1]
    return f"{'_' if not plain or plain.startswith('-') or _DEVICE.fullmatch(plain) else ''}{plain}{ending}"


def cell(text: str) -> str:
    """A text as a cell of a CSV file: visible, and with a ``'`` before what a spreadsheet would run as a formula.

    The characters are those of OWASP, "CSV Injection".
    """
    shown = visible(text)
    return f"'{shown}" if text.lstrip()[:1] in ("=", "+", "-", "@", "\uff1d", "\uff0b", "\uff0d", "\uff20") else shown


def _is_device(named: Path) -> bool:
    """Whether this is a device or a pipe, which no renamed file can replace."""
    return named.exists() and not named.is_file()


def _check_replaceable(path: str, target: Path, source: str | None) -> None:
    with target.open("rb") as file:
        if file.read(len(_DATABASE)) == _DATABASE:
            raise FileRefused(f"{path} is a database and stays as it is; name another file to write to")
    if source is not None and Path(source).exists() and target.samefile(source):
        raise FileRefused(f"{path} is the design that is read; name another file to write to")


def _replace(target: Path, content: bytes) -> None:
    half = target.with_name(f".stagebook-{os.getpid()}")
    with half.open("xb") as file:
        try:
            file.write(content)
            file.close()
            if target.exists():
                shutil.copymode(target, half)
            half.replace(target)
        except BaseException:
            half.unlink(missing_ok=True)
            raise


def _refusal(path: str, error: Exception) -> FileRefused:
    reason = getattr(error, "strerror", None) or str(error)
    return FileRefused(f"{path!r} cannot be written ({reason}); name a file in a folder of yours")
