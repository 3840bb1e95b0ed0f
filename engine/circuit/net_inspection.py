"""Nets: every one leads to the return or the supply, no pin hangs in the air, no two ideal sources fight."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from ..design.document import Design
from ..design.part import Part
from ..errors import DesignError
from ..parts.kind import Kind

RETURN = "0V"
SUPPLY = "supply"
_SOURCES = ("generator", "battery")


def net_faults(design: Design, kinds: Mapping[str, Kind]) -> Iterator[str]:
    """What is wrong with the nets of a design whose parts suit their kinds, a line each."""
    nets = design.nets
    if RETURN not in nets:
        yield f"no pin is on {RETURN}; write '{RETURN}' as the net of the return"
        return
    if SUPPLY not in nets and not any(part.kind in _SOURCES for part in design.parts):
        yield f"no pin is on '{SUPPLY}'; write it as the net that the parts are fed from"
    if SUPPLY in nets and design.conditions.supply is None:
        yield 'field conditions.supply is missing; write "supply": {"min": "4 V", "nominal": "6 V", "max": "6.4 V"}'
    lonely = set(_lonely_nets(design))
    yield from (_lonely_words(design, net) for net in nets if net in lonely)
    yield from _floating(design, kinds, lonely)
    yield from _fighting_sources(design)


def _lonely_nets(design: Design) -> Iterator[str]:
    """Nets with a single pin; the supply and the return have their other end outside."""
    pins = [net for part in design.parts for net in part.pins.values()]
    yield from (net for net in design.nets if pins.count(net) == 1 and net not in (RETURN, SUPPLY))


def _lonely_words(design: Design, net: str) -> str:
    stage, part, pin = next(
        (stage.name, part.ref, pin)
        for stage in design.stages
        for part in stage.parts
        for pin, its in part.pins.items()
        if its == net
    )
    return (
        f"stage {stage}, part {part}, pin {pin}: nothing else is on net '{net}';"
        f" write the net it belongs to, or {RETURN} where it is not used"
    )


def _floating(design: Design, kinds: Mapping[str, Kind], lonely: set[str]) -> Iterator[str]:
    """Groups of nets without a path for direct current; a net with a single pin has its own words already."""
    islands = _Islands()
    islands.join(RETURN, SUPPLY)
    for part in design.parts:
        for one, other in kinds[part.kind].paths:
            if one in part.pins and other in part.pins:
                islands.join(part.pins[one], part.pins[other])
    groups: dict[str, list[str]] = {}
    for net in design.nets:
        groups.setdefault(islands.find(net), []).append(net)
    for root, nets in groups.items():
        if root == islands.find(RETURN) or lonely.intersection(nets):
            continue
        on = [f"{part.ref} {pin}" for part in design.parts for pin, net in part.pins.items() if net == nets[0]]
        others = f" with {', '.join(nets[1:4])}{' ...' if len(nets) > 4 else ''}" if len(nets) > 1 else ""
        yield (
            f"net {nets[0]}{others} ({', '.join(on[:4])}) has no path for direct current to {RETURN} or {SUPPLY};"
            f" write a part that conducts, such as a resistor from {nets[0]} to {RETURN}"
        )


def _fighting_sources(design: Design) -> Iterator[str]:
    """Ideal sources that close a loop of ideal sources and 0R parts: no current would be defined in it."""
    islands = _Islands()
    for part in design.parts:
        if part.kind == "resistor" and _is_zero(part, "value"):
            islands.join(*part.pins.values())
    sources: list[tuple[str, tuple[str, str]]] = []
    inside = design.conditions.levels("source_resistance")
    if SUPPLY in design.nets and (inside is None or inside.min == 0):
        sources.append(("the supply", (RETURN, SUPPLY)))
    for part in design.parts:
        if part.kind in _SOURCES and part.class_ is None and part.entry("loads") is None and _is_ideal(part):
            sources.append((f"part {part.ref}", (part.pins["plus"], part.pins["minus"])))
    before: list[str] = []
    for name, (one, other) in sources:
        if islands.find(one) == islands.find(other):
            against = f" in parallel with {', '.join(before)}" if before else " shorted"
            yield f"{name} is an ideal source{against}; write a resistor between them, or a resistance of the source"
        islands.join(one, other)
        before.append(name)


def _is_ideal(part: Part) -> bool:
    return part.entry("resistance") is None or _is_zero(part)


def _is_zero(part: Part, key: str = "resistance") -> bool:
    """Whether a resistance is given as nothing at all in every case."""
    try:
        limits = part.limits(key, "ohm")
    except DesignError:
        return False
    return limits is not None and all(value in (None, 0.0) for value in (limits.min, limits.typical, limits.max))


class _Islands:
    """Nets grouped by what joins them."""

    def __init__(self) -> None:
        self._above: dict[str, str] = {}

    def find(self, net: str) -> str:
        while net in self._above:
            net = self._above[net]
        return net

    def join(self, one: str, other: str) -> None:
        root, into = self.find(one), self.find(other)
        if root != into:
            self._above[root] = into
