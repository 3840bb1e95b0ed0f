"""Whether a part has the pins, fields and data that its kind reads, and whether their texts can be read."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from difflib import get_close_matches
from typing import TYPE_CHECKING, Any

from ..design.datum import Datum, number
from ..errors import QuantityError
from ..units import unit_named
from .classes import CLASSES
from .kind import FLAG, TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.part import Part

_STRUCTURE = {"ref", "kind", "pins", "class_", "drawer", "data", "law"}
_NOT_READ = {"operated_by", "form", "follows", "waveform", "bounce", "class"}
_LIMITS = ("min", "typical", "max")


def unsuitable(part: Part, kind: Kind) -> Iterator[tuple[str, str]]:
    """Each field of a part that its kind cannot use, with what is wrong and what to write."""
    yield from _pins(part, kind)
    known = {**kind.data, **kind.fields}
    given = {name for name in part.model_fields_set - _STRUCTURE if getattr(part, name) is not None}
    for name in [name for name in type(part).model_fields if name in given]:
        yield from _entry(name, name, getattr(part, name), known, kind)
    for key, entry in part.data.items():
        yield from _entry(f"data.{key}", key, entry, known, kind)
    for key, entry in part.law.items():
        yield from _entry(f"law.{key}", key, entry, kind.law, kind)
    yield from _missing(part, kind)


def _pins(part: Part, kind: Kind) -> Iterator[tuple[str, str]]:
    if any(set(part.pins) == set(pins) for pins in kind.pins):
        return
    accepted = " or ".join(", ".join(pins) for pins in kind.pins)
    yield "pins", f"pins {', '.join(part.pins)} are not those of {_a(kind)}; write {accepted}"


def _entry(field: str, key: str, given: Any, known: Mapping[str, Entry], kind: Kind) -> Iterator[tuple[str, str]]:
    if key in known:
        yield from _readings(field, given, known[key])
        return
    near = get_close_matches(key, known, 1, 0.6)
    listed = ", ".join(known) or "none"
    yield (
        field,
        f"{_a(kind)} has no '{key}'; " + (f"write '{near[0]}'" if near else f"leave it out (it has {listed})"),
    )


def _readings(field: str, given: Any, entry: Entry) -> Iterator[tuple[str, str]]:
    """What cannot be read in an entry, and limits that are not in order."""
    key = field.rpartition(".")[2]
    if key in _NOT_READ or entry.unit == TEXT or isinstance(given, tuple) or given is None:
        return
    if isinstance(given, dict):
        for inner, single in given.items():
            yield from _readings(f"{field}.{inner}", single, entry)
        return
    if not isinstance(given, Datum | str | bool | int | float):
        for inner in given.model_fields_set:
            yield from _readings(f"{field}.{inner}", getattr(given, inner), entry)
        return
    if entry.unit == FLAG:
        if not isinstance(given, bool):
            yield field, f"{given!r} is neither yes nor no; write true or false"
        return
    try:
        if isinstance(given, Datum):
            limits = given.limits(entry.unit)
            values = [value for value in (limits.min, limits.typical, limits.max) if value is not None]
            if values != sorted(values):
                yield field, "the limits are not in order; write min, typical and max from low to high"
        else:
            number(given, entry.unit)
    except QuantityError as refusal:
        yield field, str(refusal)


def _missing(part: Part, kind: Kind) -> Iterator[tuple[str, str]]:
    """What the kind needs and the part does not give; a class stands for all data and the fields that it gives, and a
    law for its own needs."""
    of_class = CLASSES.get(kind.name, {}).get(part.class_ or "", {})
    needed = [
        name for name, entry in kind.fields.items() if entry.needed and _is_absent(part, name) and name not in of_class
    ]
    if part.class_ is None and not part.law:
        needed += [f"data.{key}" for key, entry in kind.data.items() if entry.needed and part.entry(key) is None]
    if part.law:
        needed += [f"law.{key}" for key, entry in kind.law.items() if entry.needed and key not in part.law]
    entries = {**kind.law, **kind.data, **kind.fields}
    for field in needed:
        key = field.rpartition(".")[2]
        yield field, f'\'{key}\' is missing; write "{key}": "{_example(entries[key])}"'


def _is_absent(part: Part, name: str) -> bool:
    return part.entry(name) is None and getattr(part, name, None) is None


def _a(kind: Kind) -> str:
    return f"{'an' if kind.name[0] in 'aeiou' or kind.name == 'npn' else 'a'} {kind.name}"


def _example(entry: Entry) -> str:
    return "..." if entry.unit in (TEXT, FLAG) else unit_named(entry.unit).example.split(" or ")[0].split(", ")[0]
