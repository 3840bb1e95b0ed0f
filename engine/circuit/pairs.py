"""Pairs of transistors that hold each other: bistables and astables, found by what is connected to what.

Two transistors of one polarity, each with a way from its collector to the base of the other: a part with two pins, or
two in a row with nothing else at the net between them, or none at all (Eccles, Jordan, The Radio Review 1 (1919) 143;
Abraham, Bloch, Annales de Physique 12 (1919) 237; from memory).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

from ..design.document import Design
from ..design.part import Part
from .circuit import Circuit

BLOCKING = ("capacitor",)  # what passes no direct current


@dataclass(frozen=True)
class Half:
    """One side of a pair: the transistor, how it is driven from the other's collector, and what else hangs on it.

    ``coupling`` are the parts towards its base, ``load`` those at its collector, ``bias`` those at its base that go to
    another net than its emitter's, ``bleed`` those that go there.
    """

    transistor: str
    collector: str
    base: str
    coupling: tuple[str, ...]
    load: tuple[str, ...]
    bias: tuple[str, ...]
    bleed: tuple[str, ...]


@dataclass(frozen=True)
class Pair:
    """Two halves; ``holds``: direct current passes both ways, so that it stays as it falls; else it swings."""

    first: Half
    second: Half
    holds: bool


def pairs(circuit: Circuit) -> Iterator[Pair]:
    """All pairs of a design whose couplings are both direct or both through capacitors."""
    design = circuit.design
    graph = _Graph(circuit)
    transistors = [part for part in design.parts if {"collector", "base", "emitter"} <= part.pins.keys()]
    for one, other in combinations(transistors, 2):
        if one.kind != other.kind:
            continue
        ways = [graph.ways(a.pins["collector"], b.pins["base"]) for a, b in ((other, one), (one, other))]
        if not all(ways):
            continue
        direct = [any(not any(p.kind in BLOCKING for p in way) for way in found) for found in ways]
        if direct[0] is direct[1]:
            first, second = (
                graph.half(design, part, tuple(p.ref for way in found for p in way))
                for part, found in zip((one, other), ways, strict=True)
            )
            yield Pair(first, second, direct[0])


class _Graph:
    """Parts with two pins between nets, where parts of 0R join them."""

    def __init__(self, circuit: Circuit) -> None:
        self._net = circuit.builder.net
        self._count: dict[str, int] = {}
        self._between: dict[str, list[tuple[Part, str]]] = {}
        for part in circuit.design.parts:
            ends = [self._net(net) for net in part.pins.values()]
            for end in ends:
                self._count[end] = self._count.get(end, 0) + 1
            if len(ends) == 2 and ends[0] != ends[1]:
                for near, far in (ends, ends[::-1]):
                    self._between.setdefault(near, []).append((part, far))

    def ways(self, start: str, end: str) -> list[tuple[Part, ...]]:
        """All short ways from one net to another."""
        start, end = self._net(start), self._net(end)
        if start == end:
            return [()]
        found: list[tuple[Part, ...]] = []
        for part, far in self._between.get(start, ()):
            if far == end:
                found.append((part,))
            elif self._count[far] == 2:
                found += [(part, last) for last, beyond in self._between[far] if last is not part and beyond == end]
        return found

    def half(self, design: Design, part: Part, coupling: tuple[str, ...]) -> Half:
        """What hangs on one transistor."""
        collector, base, emitter = (self._net(part.pins[pin]) for pin in ("collector", "base", "emitter"))
        at_base = [(p.ref, far) for p, far in self._between.get(base, ()) if p.ref not in coupling]
        return Half(
            part.ref,
            collector,
            base,
            coupling,
            tuple(p.ref for p, _ in self._between.get(collector, ()) if p.kind == "resistor"),
            tuple(ref for ref, far in at_base if far != emitter),
            tuple(ref for ref, far in at_base if far == emitter),
        )
