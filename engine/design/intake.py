"""Taking a document in: from text or bytes to plain values, within bounds of size and nesting."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any, Final, NoReturn

from ..errors import DesignError

MOST_BYTES: Final = 1_000_000
MOST_VALUES: Final = 100_000
DEEPEST: Final = 12


def take_in(source: str | bytes | Mapping[str, Any]) -> dict[str, Any]:
    """The document as a dict of plain JSON values. Raises DesignError in one line for anything else."""
    values = source if isinstance(source, Mapping) else _parsed(source)
    if not isinstance(values, Mapping):
        raise DesignError('the document is not an object; write {"stagebook": 1, "name": ...}')
    _bounded(values)
    return dict(values)


def _parsed(source: str | bytes) -> Any:
    size = len(source) if isinstance(source, bytes) else len(source.encode("utf-8", "replace"))
    if size > MOST_BYTES:
        raise DesignError(f"the document has {size} bytes; write one of at most {MOST_BYTES}")
    if isinstance(source, bytes):
        try:
            source = source.decode("utf-8-sig")
        except UnicodeDecodeError as fault:
            raise DesignError(f"the document is not UTF-8 text at byte {fault.start}; save it as UTF-8") from None
    try:
        return json.loads(source, object_pairs_hook=_once, parse_constant=_refused, parse_int=_whole)
    except json.JSONDecodeError as fault:
        where = f"line {fault.lineno}, column {fault.colno}"
        raise DesignError(f"the document is not JSON at {where} ({fault.msg}); correct it there") from None
    except RecursionError:
        raise DesignError(f"the document is nested too deep; write at most {DEEPEST} levels") from None


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for key, value in pairs:
        if key in found:
            raise DesignError(f"the field {key[:40]!a} stands twice in one object; leave one of the two out")
        found[key] = value
    return found


def _refused(word: str) -> NoReturn:
    raise DesignError(f"{word} is not a value; write a finite number or a text such as '6 V'")


def _whole(digits: str) -> int:
    if len(digits) > 40:
        raise DesignError(f"the number {digits[:12]}... has {len(digits)} digits; write one of at most 40")
    return int(digits)


def _bounded(document: Mapping[str, Any]) -> None:
    """Refuse what is nested too deep or holds too many values, before anything walks through it recursively."""
    level: list[Any] = [document]
    count = 0
    for _ in range(DEEPEST):
        inner: list[Any] = []
        for value in level:
            if isinstance(value, Mapping):
                inner.extend(value.values())
            elif isinstance(value, list | tuple):
                inner.extend(value)
        count += len(inner)
        if count > MOST_VALUES:
            raise DesignError(f"the document holds more than {MOST_VALUES} values; write a smaller one")
        if not inner:
            return
        level = inner
    raise DesignError(f"the document is nested too deep; write at most {DEEPEST} levels")
