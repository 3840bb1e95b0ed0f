"""Differences between two JSON documents as patches: the operations add, remove and replace of RFC 6902."""

from __future__ import annotations

import copy
from typing import Any

Json = Any
Patch = list[dict[str, Any]]


def difference(before: Json, after: Json) -> Patch:
    """The operations that turn ``before`` into ``after``; empty when they are the same.

    Lists are compared by position after the common head and tail are set aside, so taking one part out of a stage is
    one operation.
    """
    patch: Patch = []
    _compare(before, after, "", patch)
    return patch


def patched(document: Json, patch: Patch) -> Json:
    """A new document: ``document`` after all operations of ``patch``.

    Raises:
        ValueError: An operation does not fit the document.
    """
    whole = {"": copy.deepcopy(document)}
    for operation in patch:
        try:
            _apply(whole, operation)
        except (LookupError, TypeError, ValueError, AttributeError) as error:
            raise ValueError(f"the operation {operation!r} does not fit the document") from error
    return whole[""]


def _apply(whole: dict[str, Json], operation: dict[str, Any]) -> None:
    *way, last = [key.replace("~1", "/").replace("~0", "~") for key in operation["path"].split("/")]
    place: Json = whole
    for key in way:
        place = place[_index(key, len(place) - 1)] if isinstance(place, list) else place[key]
    kind = operation["op"]
    if isinstance(place, list):
        at = _index(last, len(place) - (kind != "add"))
        if kind == "add":
            place.insert(at, copy.deepcopy(operation["value"]))
        elif kind == "replace":
            place[at] = copy.deepcopy(operation["value"])
        else:
            del place[at]
    elif kind == "add" or last in place:
        if kind == "remove":
            del place[last]
        else:
            place[last] = copy.deepcopy(operation["value"])
    else:
        raise KeyError(last)


def _index(key: str, highest: int) -> int:
    if not key.isdecimal() or int(key) > highest:
        raise IndexError(key)
    return int(key)


def _compare(before: Json, after: Json, path: str, patch: Patch) -> None:
    if isinstance(before, dict) and isinstance(after, dict):
        for key in before:
            if key not in after:
                patch.append({"op": "remove", "path": _below(path, key)})
        for key, value in after.items():
            if key not in before:
                patch.append({"op": "add", "path": _below(path, key), "value": value})
            else:
                _compare(before[key], value, _below(path, key), patch)
    elif isinstance(before, list) and isinstance(after, list):
        _compare_lists(before, after, path, patch)
    elif not _same(before, after):
        patch.append({"op": "replace", "path": path, "value": after})


def _compare_lists(before: list[Json], after: list[Json], path: str, patch: Patch) -> None:
    shorter = min(len(before), len(after))
    head = 0
    while head < shorter and _same(before[head], after[head]):
        head += 1
    tail = 0
    while tail < shorter - head and _same(before[-1 - tail], after[-1 - tail]):
        tail += 1
    old, new = len(before) - tail, len(after) - tail
    for at in range(head, min(old, new)):
        _compare(before[at], after[at], f"{path}/{at}", patch)
    for at in range(old - 1, new - 1, -1):
        patch.append({"op": "remove", "path": f"{path}/{at}"})
    for at in range(old, new):
        patch.append({"op": "add", "path": f"{path}/{at}", "value": after[at]})


def _below(path: str, key: str) -> str:
    return f"{path}/{key.replace('~', '~0').replace('/', '~1')}"


def _same(one: Json, other: Json) -> bool:
    """Written alike: Python holds 1, 1.0 and true for one value, and 0.0 and -0.0; a document does not."""
    if type(one) is not type(other):
        return False
    if isinstance(one, dict):
        return one.keys() == other.keys() and all(_same(value, other[key]) for key, value in one.items())
    if isinstance(one, list):
        return len(one) == len(other) and all(map(_same, one, other))
    return repr(one) == repr(other)
