"""What a kind says of an edited part before the edit is kept, and which values are none that a part is made for."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from difflib import get_close_matches
from typing import TYPE_CHECKING

from ..errors import QuantityError
from ..quantity import read, write
from .classes import CLASSES
from .kind import Kind
from .suitability import unsuitable

if TYPE_CHECKING:
    from ..design.part import Part

_MADE = {"ohm": (1e-3, 100e9), "F": (0.1e-12, 1.0), "H": (1e-9, 100.0)}
"""What resistors, capacitors and inductors can be bought with (from memory)."""


def objections(before: Part, after: Part, known: Mapping[str, Kind]) -> Iterator[tuple[str, str]]:
    """Each field that the kind of ``after`` cannot use and ``before`` did not have like that, with what to write."""
    kind = known.get(after.kind)
    if kind is None:
        return
    earlier = set(unsuitable(before, kind)) if before.kind == after.kind else set()
    for field, words in unsuitable(after, kind):
        if (field, words) in earlier:
            continue
        if field == "value" and "value" not in kind.fields:
            words = f"a part of kind {kind.name} has no value; Esc, then e, writes its class and other fields"
        yield field, words
    if after.value != before.value and _below_zero(after, kind):
        yield "value", f"{after.value} is below zero; write a positive value"
    if (before.kind, before.class_) != (after.kind, after.class_):
        yield from (("class", words) for words in _unknown_class(after, known))


def _below_zero(part: Part, kind: Kind) -> bool:
    entry = kind.fields.get("value")
    if part.value is None or entry is None or entry.unit not in _MADE:
        return False
    try:
        return read(part.value, entry.unit) < 0.0
    except QuantityError:
        return False


def _unknown_class(part: Part, known: Mapping[str, Kind]) -> Iterator[str]:
    """That the class is none of the kind, and which one may be meant."""
    name, own = part.class_, CLASSES.get(part.kind)
    if name is None or not own or name in own:
        return
    said = f"'{name}' is no class of kind {part.kind}"
    near = _near(name, own)
    if near is not None:
        yield f"{said}; write '{near}'"
        return
    for other, classes in CLASSES.items():
        found = _near(name, classes) if other in same_pins(part, known) else None
        if found is not None:
            yield f"{said}; '{found}' is one of kind {other}, which e changes under kind"
            return
    yield f"{said}; write {' or '.join(repr(each) for each in own)}"


def _near(name: str, classes: Mapping[str, object]) -> str | None:
    """The class that a text seems to mean: one that it is a part of, else one that is written nearly so."""
    wanted = name.casefold()
    lower = {each.casefold(): each for each in classes}
    inside = [each for small, each in lower.items() if wanted and (wanted in small or small in wanted)]
    close = get_close_matches(wanted, lower, 1, 0.6)
    return inside[0] if len(inside) == 1 else lower[close[0]] if close else None


def same_pins(part: Part, known: Mapping[str, Kind]) -> tuple[str, ...]:
    """The other kinds that a part with these pins could be of."""
    return tuple(
        name
        for name, kind in known.items()
        if name != part.kind and any(set(pins) == set(part.pins) for pins in kind.pins)
    )


def only_class(kind: str) -> str | None:
    """The class of a kind that has one only."""
    classes = tuple(CLASSES.get(kind, ()))
    return classes[0] if len(classes) == 1 else None


def unusual_value(part: Part, known: Mapping[str, Kind]) -> str:
    """What is to be said of a value that can be read and that no such part is made with; '' for the others."""
    kind = known.get(part.kind)
    entry = None if kind is None else kind.fields.get("value")
    if part.value is None or entry is None or entry.unit not in _MADE:
        return ""
    try:
        value = read(part.value, entry.unit)
    except QuantityError:
        return ""
    low, high = _MADE[entry.unit]
    if low <= value <= high:
        return ""
    if value == 0.0:
        return "that is 0 ohm: a link" if entry.unit == "ohm" else f"that is 0 {entry.unit}"
    made = f"{write(low, entry.unit)} .. {write(high, entry.unit)}"
    return f"that is {value:g} {entry.unit}, and a {part.kind} is made with {made}: is it meant?"
