"""From a design document to a circuit: nets and unknowns, elimination order, and the tables of lanes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING
from weakref import WeakKeyDictionary

import numpy as np

from ..errors import CircuitError
from ..kernel import layout
from ..kernel.elimination import Pattern
from ..kernel.layout import Floats, Topology, ints, places
from ..parts import kinds
from ..primitives.builder import (
    RETURN,
    SUPPLY_NET,
    Bench,
    Builder,
    Guard,
    Law,
    Operated,
    constant,
)
from ..primitives.columns import AMBIENT, LEAKAGE_STATE, SOURCE_RESISTANCE, SUPPLY, Column, Group, Lanes
from ..primitives.lane_table import LanePlan, lane_plan
from ..quantity import read
from .injection import add_injectors, injected
from .inspection import inspect

if TYPE_CHECKING:
    from ..design.document import Design

SUPPLY_SOURCE = "supply source"
SUPPLY_SWITCH = "supply"
SUPPLY_RISE = "supply rise"
RISE_NET = "supply/rise"
LEAST_SOURCE_RESISTANCE = 1e-3  # ohm, where a source resistance of 0R is only one end of its range
# What joins a rising supply to a charged rail once it has come to the rail's voltage, until the rise is over.
RISE_GUARD = "supply meets the rail"
RISE_CLOSED = 1e4  # S, before the source resistance
MET, PARTED = 1e-3, -1e-3  # V of the source above the rail


@dataclass(frozen=True)
class Circuit:
    """A design made ready to run. Net names are those of the document; ``source_names`` order the sources."""

    design: Design
    columns: tuple[Column, ...]
    topology: Topology
    nets: dict[str, int]
    source_names: tuple[str, ...]
    benches: dict[str, Bench]
    builder: Builder

    def index(self, net: str) -> int:
        """Place of a net in the vector of unknowns. Raises CircuitError for a name that the design does not have."""
        try:
            return self.nets[self.builder.net(net)]
        except KeyError:
            hidden = {SUPPLY_SOURCE, *self.builder.injectors, *self.builder.hidden}
            known = ", ".join(sorted(n for n in self.nets if n not in hidden))
            raise CircuitError(f"net '{net}' is not in the design; write one of {known}") from None

    def nominal(self, count: int = 1) -> Lanes:
        """Lanes of the nominal design."""
        return Lanes.nominal(self.columns, count)

    def unknown_name(self, index: int) -> str:
        """The net (or branch) that an index of the vector of unknowns stands for."""
        names = {place: name for name, place in self.nets.items()}
        return names.get(index, "a branch current")

    def element(self, family: int, index: int) -> int:
        """Place of a primitive in ``topology.element``."""
        return int(self.topology.group[family]) + index

    def parameter(self, family: int, index: int) -> int:
        """Place of a primitive's first parameter in a row of the lane table."""
        return int(self.topology.element[self.element(family, index), layout.E_PARAMETER])

    def table(self, lanes: Lanes) -> Floats:
        """Law parameters of all primitives, (lanes, parameters), not to be written to: runs of the same lanes share it
        for as long as there are any.
        """
        made = self._tables.get(lanes)
        if made is None:
            made = self._tables[lanes] = self._plan.table(lanes)
            made.flags.writeable = False
        return made

    @cached_property
    def _tables(self) -> WeakKeyDictionary[Lanes, Floats]:
        return WeakKeyDictionary()

    @cached_property
    def _plan(self) -> LanePlan:
        return lane_plan(self.builder)


def build(design: Design, inject: Sequence[str] = ()) -> Circuit:
    """Make the circuit of a design. Raises CircuitError, in words, where it cannot be computed as it is drawn.

    ``inject`` are nets that charge can be put into, beside those for which the design asks that itself.
    """
    inspect(design)
    levels = design.conditions.levels("supply")
    builder = Builder(0.0 if levels is None else levels.nominal, _joined(design))
    _add_conditions(design, builder)
    catalogue = kinds()
    for part in design.parts:
        catalogue[part.kind].expand(part, builder)
    for stray in design.strays:
        builder.capacitance(*stray.between, constant(read(stray.value, "F")))
    driven = [source for source in builder.generators.values() if source in builder.nets]
    driven += add_injectors(builder, (*injected(design), *inject))
    known = [*([SUPPLY_SOURCE] if SUPPLY_SOURCE in builder.nets else []), *driven, RETURN]
    if len(set(known)) < len(known):
        raise CircuitError("two ideal sources drive one net; put a resistor between them")
    if SUPPLY_SOURCE not in builder.nets and levels is not None and SUPPLY_NET in builder.nets:
        known.insert(0, SUPPLY_NET)
    free = [net for net in builder.nets if net not in known]
    nets = {name: n for n, name in enumerate(free)}
    currents = len(free) + len(builder.branches)
    nets.update({name: currents + n for n, name in enumerate(builder.temperatures)})
    n_free = currents + len(builder.temperatures)
    nets.update({name: n_free + n for n, name in enumerate(known)})
    sources = (*known, *(source for *_, source in builder.branches if source is not None))
    for operated in builder.operated:
        if operated.state not in builder.guards:
            raise CircuitError(f"a contact is operated by '{operated.state}', which the design does not have")
    first = n_free + len(known)
    nets.update({state: first + n for n, state in enumerate(builder.guards)})
    topology = _topology(builder, nets, len(free), n_free, first + len(builder.guards), sources)
    return Circuit(design, tuple(builder.columns), topology, nets, sources, builder.benches, builder)


def _joined(design: Design) -> dict[str, str]:
    """Nets joined by resistors of 0R, as a map from a net to the one that stands for it."""
    alias: dict[str, str] = {}

    def root(net: str) -> str:
        while net in alias:
            net = alias[net]
        return net

    for part in design.parts:
        if part.kind == "resistor" and part.value is not None:
            found = part.limits("value", "ohm")
            if found is not None and found.typical == 0.0:
                a, b = (root(net) for net in part.pins.values())
                if a != b:
                    keep, drop = (b, a) if b in (RETURN, SUPPLY_NET) else (a, b)
                    alias[drop] = keep
    return alias


def _add_conditions(design: Design, builder: Builder) -> None:
    conditions = design.conditions
    ambient = conditions.levels("ambient")
    low, nominal, high = (25.0, 25.0, 25.0) if ambient is None else (ambient.min, ambient.nominal, ambient.max)
    builder.column(*AMBIENT, nominal, low, high, Group.CONDITION)
    states = [0.0 if state == "conditioned" else 1.0 for state in conditions.leakage_states]
    builder.column(*LEAKAGE_STATE, min(states), min(states), max(states), Group.LEAKAGE)
    supply = conditions.levels("supply")
    if supply is None:
        return
    builder.column(*SUPPLY, supply.nominal, supply.min, supply.max, Group.CONDITION)
    source = conditions.levels("source_resistance")
    builder.net(SUPPLY_NET)
    if source is None or source.max == 0.0:
        return
    key = builder.column(*SOURCE_RESISTANCE, source.nominal, source.min, source.max, Group.CONDITION)

    def closed(lanes: Lanes) -> Floats:
        return np.asarray(1.0 / np.maximum(lanes[key], LEAST_SOURCE_RESISTANCE))

    def reading(state: str) -> Law:
        return constant(1e-12) if state == "open" else closed

    builder.switch(SUPPLY_SWITCH, SUPPLY_SOURCE, SUPPLY_NET, closed, reading)
    if _meets_charge(design):
        # A supply that rises onto a charged rail must not drain it: it is joined only while it stands above it.
        joint = builder.conductance(SUPPLY_SOURCE, RISE_NET, constant(1e-12))
        none = constant(0.0)
        watched = SUPPLY_SOURCE, SUPPLY_NET
        builder.hidden |= {RISE_GUARD, RISE_NET}
        builder.guards[RISE_GUARD] = Guard(
            RISE_GUARD, watched, None, constant(MET), constant(PARTED), none, none, either_sign=False
        )
        ends = constant(RISE_CLOSED), constant(1e-12)
        builder.operated.append(Operated(joint.index, RISE_GUARD, True, *ends, none))
        builder.switch(SUPPLY_RISE, RISE_NET, SUPPLY_NET, constant(1e-12), reading)


def _meets_charge(design: Design) -> bool:
    """Whether some sequence connects the supply when the rail may hold a charge: again, or where starts are given."""
    for name, sequence in design.sequences.items():
        connections = sum(event.event == "connect supply" for event in sequence.events)
        if connections > (1 if design.starts_of(name) is None else 0):
            return True
        if connections and any(event.event == "reverse supply" for event in sequence.events):
            return True
    return False


def _watched(guard: Guard, nets: dict[str, int], n_nets: int, return_net: int) -> tuple[int, int]:
    """The two unknowns whose difference a guard watches; of a current the second is 0V."""
    if guard.branch is not None:
        return n_nets + guard.branch, return_net
    return nets[guard.nets[0]], nets[guard.nets[1]]


def _topology(
    builder: Builder, nets: dict[str, int], n_nets: int, n_free: int, n_all: int, sources: tuple[str, ...]
) -> Topology:
    return_net = nets[RETURN]
    conductances: list[tuple[int, ...]] = [(nets[a], nets[b]) for a, b, _ in builder.conductances]
    capacitances: list[tuple[int, ...]] = [(nets[a], nets[b]) for a, b, _ in builder.capacitances]
    branches: list[tuple[int, ...]] = [(nets[a], nets[b], n_nets + k) for k, (a, b, *_) in enumerate(builder.branches)]
    junctions: list[tuple[int, ...]] = [(nets[a], nets[b]) for a, b, _ in builder.junctions]
    transports: list[tuple[int, ...]] = [(nets[c], nets[b], nets[e]) for c, b, e, *_ in builder.transports]
    channels: list[tuple[int, ...]] = [(nets[d], nets[g], nets[s]) for d, g, s, *_ in builder.channels]
    warms: list[tuple[int, ...]] = [(nets[a], nets[t], nets[b]) for a, t, b, _ in builder.warms]
    states = {state: n for n, state in enumerate(builder.guards)}
    guards: list[tuple[int, ...]] = [
        (*_watched(guard, nets, n_nets, return_net), nets[state]) for state, guard in builder.guards.items()
    ]
    contacts: list[tuple[int, ...]] = [(states[each.state], int(each.make)) for each in builder.operated]
    pattern = Pattern(n_free)
    for nets_of_one in (*conductances, *capacitances, *junctions, *transports, *channels, *warms):
        pattern.couple(nets_of_one)
    for a, b, row in branches:
        pattern.couple((a, row))
        pattern.couple((b, row))
    plan = pattern.plan([(row, (a, b)) for a, b, row in branches])
    slot = plan.slot
    extra = [0 if source is None else sources.index(source) + 1 for *_, source in builder.branches]
    polarity = [int(sign > 0) for *_, sign, _ in builder.transports]
    channel_sign = [int(sign > 0) for *_, sign, _ in builder.channels]

    rows: list[list[int]] = []
    group = [0]
    parameter = 0
    families: tuple[list[tuple[int, ...]], ...] = (
        conductances,
        capacitances,
        branches,
        junctions,
        transports,
        channels,
        warms,
        guards,
        contacts,
    )
    either = [int(guard.either_sign) for guard in builder.guards.values()]
    own = {layout.BRANCH: extra, layout.TRANSPORT: polarity, layout.CHANNEL: channel_sign, layout.GUARD: either}
    for family, members in enumerate(families):
        for k, at in enumerate(members):
            if family == layout.BRANCH:
                a, b, row = at
                slots = [slot(row, a), slot(row, b), slot(row, row), slot(a, row), slot(b, row)]
            elif family == layout.GUARD:
                slots = []
            elif family == layout.CONTACT:
                moved = builder.operated[k]
                slots = [rows[group[moved.family] + moved.conductance][layout.E_PARAMETER]]
            else:
                slots = [slot(i, j) for i in at for j in at]
            head = [*at, *[0] * (3 - len(at)), own[family][k] if family in own else 0, parameter]
            rows.append([*head, *slots, *[0] * (layout.ELEMENT_WIDTH - len(head) - len(slots))])
            parameter += layout.PARAMETERS[family]
        group.append(len(rows))
    return Topology(
        size=ints([n_nets, n_free, n_all, plan.entries, len(guards)]),
        element=places(rows, len(rows), layout.ELEMENT_WIDTH),
        group=places(group),
        **plan.lists(),
    )
