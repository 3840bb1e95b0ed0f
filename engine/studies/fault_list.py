"""Which single faults a design can have: every part open and short, leads cut and shorted, contacts stuck, cells weak.

A fault is a cut in the way to one pin, a bridge between two nets, or columns at values of their own. Which faults a
part can have follows from its pins alone, so that a new part kind has its faults without a line here.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

from ..design.document import Design
from ..design.part import Part
from ..parts import kinds
from ..primitives.builder import RETURN, SUPPLY_NET

SUPPLY_PART = "supply"
NEVER_FAIL = ("generator",)  # stands for the world outside of the unit
WEAK_CHARGE, WEAK_AGE = 0.1, 1.0  # of a battery: a tenth of its charge is left, at the end of its life
WEAK_VOLTAGE, WEAK_RESISTANCE = 0.9, 4.0  # of the lowest supply and the largest source resistance, from memory
OPEN_WORDS = {"contact": "stuck open", "lead": "cut"}
SHORT_WORDS = {"contact": "stuck closed"}


@dataclass(frozen=True, slots=True)
class Fault:
    """One fault of one part. ``cut`` is a pin of the part, ``bridged`` two nets, ``weak`` cells that are run down."""

    stage: str
    part: str
    words: str
    cut: str | None = None
    bridged: tuple[str, str] | None = None
    weak: bool = False


def faults_of(design: Design) -> tuple[Fault, ...]:
    """All faults of a design in the order of its parts, those of the supply at the end."""
    found = [fault for stage in design.stages for part in stage.parts for fault in _of_part(stage.name, part)]
    if design.conditions.supply is not None:
        first = design.stages[0].name if design.stages else ""
        found.append(Fault(first, SUPPLY_PART, "weak cells", weak=True))
    return tuple(found)


def _of_part(stage: str, part: Part) -> Iterator[Fault]:
    if part.kind in NEVER_FAIL:
        return
    pins = _pins(part)
    if len(pins) == 2:
        yield Fault(stage, part.ref, OPEN_WORDS.get(part.kind, "open"), cut=pins[0])
    else:
        yield from (Fault(stage, part.ref, f"{pin} open", cut=pin) for pin in pins)
    if part.kind == "lead":
        yield from _lead_shorts(stage, part)
    else:
        for one, other in combinations(pins, 2):
            words = SHORT_WORDS.get(part.kind, "short") if len(pins) == 2 else f"{one} to {other} short"
            if part.pins[one] != part.pins[other]:
                yield Fault(stage, part.ref, words, bridged=(part.pins[one], part.pins[other]))
    if part.kind == "battery":
        yield Fault(stage, part.ref, "weak cells", weak=True)


def _pins(part: Part) -> tuple[str, ...]:
    """The pins in the order of the kind, whatever order the document has them in."""
    kind = kinds().get(part.kind)
    known = () if kind is None else kind.pins
    return next((pins for pins in known if set(pins) == set(part.pins)), tuple(part.pins))


def _lead_shorts(stage: str, part: Part) -> Iterator[Fault]:
    """A lead has no two ends to be shorted: its far end touches the return or the supply, where it is not on them."""
    for net in (RETURN, SUPPLY_NET):
        if net not in part.pins.values():
            yield Fault(stage, part.ref, f"shorted to {net}", bridged=(part.pins["to"], net))
