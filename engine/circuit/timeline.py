"""A sequence as waves: what the supply, the generators and everything that events set do over time, lane by lane."""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from ..design.datum import number
from ..design.sequence import (
    ConnectSupply,
    ContactEvent,
    Dip,
    DisconnectSupply,
    Inject,
    RampLevel,
    ReverseSupply,
    SetLevel,
    Surge,
)
from ..errors import CircuitError
from ..kernel import layout
from ..kernel.layout import Floats, Program, ints
from ..primitives.builder import SUPPLY_NET, Law, Settable
from ..primitives.columns import SUPPLY, Lanes
from ..quantity import read
from .circuit import SUPPLY_RISE, SUPPLY_SOURCE, SUPPLY_SWITCH, Circuit
from .injection import SIEMENS, injector
from .wave import Number, Wave, ramp_shares, stacked

if TYPE_CHECKING:
    from ..design.sequence import Event, Sequence

DEFAULT_RISE = 100e-9  # s, a supply that no event connects
HALF_JUMP = 0.5e-12  # s, half of the step with which the kernel takes in what an event does
ROUNDING = 8.0  # last digits by which the instants of one event may differ
DEFAULT_EDGE = 1e-6  # s, of a dip or a surge


class Timeline:
    """The waves of one sequence in the given lanes; trials call its methods with one number per lane."""

    def __init__(self, circuit: Circuit, lanes: Lanes) -> None:
        self.circuit = circuit
        self.lanes = lanes
        self.supply = Wave(0.0)
        self.sources = {name: Wave(0.0) for name in circuit.source_names}
        self.switches = {ref: Wave(self._set(ref, None)) for ref in circuit.builder.switches}
        self.quantities: dict[str, Wave] = {}
        for ref, settable in circuit.builder.settables.items():
            self.quantities[ref] = Wave(settable.start(lanes))
            self.switches[ref] = Wave(settable.written(lanes, self.quantities[ref].values[0]))
        self.sines = layout.zeros(lanes.count, len(circuit.source_names), 3)
        for name in (SUPPLY_SOURCE, SUPPLY_NET):
            if name in self.sources:
                self.sources[name] = self.supply
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH] = Wave(self._set(SUPPLY_SWITCH, "open"))
        self._level: Number = lanes[SUPPLY] if SUPPLY in lanes else 0.0  # noqa: SIM401
        # What the supply stands at between its events, None while it is away; whether the rail may hold a charge.
        self._standing: Number | None = None
        self._charged = False
        self._generators()
        for source, volts in circuit.builder.batteries.items():
            self.sources[source].ramp(0.0, DEFAULT_RISE, volts(lanes))

    def _set(self, ref: str, state: str | None) -> Number:
        index, reading = self.circuit.builder.switches[ref]
        law: Law = self.circuit.builder.conductances[index][2] if state is None else reading(state)
        value = law(self.lanes)
        return value if np.ndim(value) else float(value)

    def _parameter(self, ref: str) -> int:
        """The parameter that events set of a switch or a settable part."""
        settable = self.circuit.builder.settables.get(ref)
        if settable is None:
            return self.circuit.parameter(layout.CONDUCTANCE, self.circuit.builder.switches[ref][0])
        return self.circuit.parameter(settable.family, settable.index) + settable.place

    def _generators(self) -> None:
        for ref, source in self.circuit.builder.generators.items():
            waveform = self.circuit.design.part(ref).waveform
            assert waveform is not None
            if waveform.sine is not None:
                sine = waveform.sine
                self.sources[source] = Wave(0.0 if sine.offset is None else number(sine.offset, "V"))
                self.sines[:, self.circuit.source_names.index(source)] = (
                    number(sine.amplitude, "V"),
                    number(sine.frequency, "Hz"),
                    0.0 if sine.phase is None else number(sine.phase, ""),
                )
                continue
            points = [(number(t, "s"), number(v, "V")) for t, v in waveform.steps or ()]
            wave = Wave(points[0][1])
            for (t0, _), (t1, v1) in pairwise(points):
                wave.ramp(t0, t1 - t0, v1)
            self.sources[source] = wave

    @classmethod
    def resumed(cls, before: Timeline, at: Floats, onward: bool = False) -> Timeline:
        """A timeline that goes on, from its own t = 0, where another one stood at ``at`` (one instant per lane).

        Nothing happens on it any more but what generators do; ``onward``: what was still to come does come.
        """
        line = cls(before.circuit, before.lanes)
        # A state is kept at the end of a step. Where an event ends the step, what it does has not happened yet.
        at = np.maximum(0.0, at - np.maximum(HALF_JUMP, 8.0 * np.spacing(np.abs(at))))
        middles = at[:, None]
        for wave, old in (
            (line.supply, before.supply),
            *((line.switches[ref], old) for ref, old in before.switches.items()),
            *((line.quantities[ref], old) for ref, old in before.quantities.items()),
        ):
            if onward:
                rest = old.later(at)
                wave.times, wave.values = rest.times, rest.values
                continue
            value, _ = old.pieces(middles, middles)
            wave.values[0] = np.broadcast_to(value[:, 0], (line.lanes.count,)).copy()
        line._standing, line._charged = line.supply.values[0], True
        for name, old in before.sources.items():
            if old is not before.supply:
                line.sources[name] = old.later(at)
        line.sines = before.sines.copy()
        line.sines[:, :, 2] += 2.0 * np.pi * before.sines[:, :, 1] * middles
        return line

    def supply_stands(self) -> None:
        """The supply and batteries have their values from t = 0 on."""
        self.supply.values[0] = self._standing = self._level
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH].values[0] = self._set(SUPPLY_SWITCH, "closed")
        self.batteries_stand()

    def batteries_stand(self) -> None:
        """Batteries have their voltage from t = 0 on, and nets that start with a charge may keep it on the rail."""
        self._charged = True
        for source, volts in self.circuit.builder.batteries.items():
            self.sources[source] = Wave(volts(self.lanes))

    def connect_supply(self, at: Number, rise: Number) -> None:
        """The supply is connected at ``at`` and rises evenly within ``rise``.

        A rail that was charged before keeps its charge: until the rise is over it is joined only once the supply has
        come to its voltage.
        """
        joined = at
        if SUPPLY_RISE in self.switches and self._charged and self._standing is None:
            joined = np.add(at, rise)
            self.switches[SUPPLY_RISE].step(at, self._set(SUPPLY_RISE, "closed"))
            self.switches[SUPPLY_RISE].step(joined, self._set(SUPPLY_RISE, "open"))
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH].step(joined, self._set(SUPPLY_SWITCH, "closed"))
        self.supply.ramp(at, rise, self._level)
        self._standing, self._charged = self._level, True

    def disconnect_supply(self, at: Number) -> None:
        """The supply is taken away; its voltage no longer matters."""
        if SUPPLY_SWITCH not in self.switches:
            raise CircuitError(
                "conditions, source_resistance: a supply of 0R cannot be disconnected; write a resistance such as 0R1"
            )
        for name in (SUPPLY_SWITCH, SUPPLY_RISE):
            if name in self.switches:
                self.switches[name].step(at, self._set(name, "open"))
        self.supply.step(at, 0.0)
        self._standing = None

    def reverse_supply(self, at: Number) -> None:
        """The supply is connected the wrong way round at ``at``, at once; what charge the rail holds it takes."""
        if SUPPLY_RISE in self.switches:
            self.switches[SUPPLY_RISE].step(at, self._set(SUPPLY_RISE, "open"))
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH].step(at, self._set(SUPPLY_SWITCH, "closed"))
        self._standing, self._charged = np.negative(self._level), True
        self.supply.ramp(at, DEFAULT_RISE, self._standing)

    def move_supply(self, at: Number, to: Number, edge: Number) -> None:
        """The supply moves to another voltage within ``edge``."""
        self.supply.ramp(at, edge, to)

    def move_batteries(self, at: Number, parts: Number, edge: Number) -> None:
        """Every battery falls to its voltage divided by ``parts`` within ``edge``."""
        for source, volts in self.circuit.builder.batteries.items():
            self.sources[source].ramp(at, edge, np.divide(volts(self.lanes), parts))

    def excursion(
        self, at: Number, to: Number, during: Number, edge: Number = DEFAULT_EDGE, impedance: Number | None = None
    ) -> None:
        """A dip or a surge: the supply goes to ``to`` within ``edge`` and begins to come back ``during`` after ``at``.

        All the while it stands behind ``impedance`` instead of its source resistance, where one is given.
        """
        if self._standing is None:
            raise CircuitError("the supply is not connected then; write 'connect supply' at an earlier time")
        if np.any(np.greater(edge, during)):
            raise CircuitError(
                f"the edge of {np.max(edge):g} s is longer than the {np.min(during):g} s it lasts; "
                "write a shorter 'edge' or a longer 'for'"
            )
        over = np.add(at, during)
        self.supply.ramp(at, edge, to)
        self.supply.ramp(over, edge, self._standing)
        if impedance is None:
            return
        if SUPPLY_SWITCH not in self.switches:
            raise CircuitError(
                "a supply of 0R takes no impedance; write a source_resistance such as 0R1 under 'conditions'"
            )
        self.switches[SUPPLY_SWITCH].step(at, np.divide(1.0, impedance))
        self.switches[SUPPLY_SWITCH].step(np.add(over, edge), self._set(SUPPLY_SWITCH, "closed"))

    def inject(self, at: Number, net: str, charge: Number, width: Number) -> None:
        """A current of ``charge`` / ``width`` flows into a net for ``width``; it replaces one that is not over yet."""
        place = self.circuit.builder.net(net)
        if injector(place) not in self.sources:
            return  # a net that is a source itself takes any charge
        wave = self.sources[injector(place)]
        wave.step(at, np.divide(charge, np.multiply(width, SIEMENS)))
        wave.step(np.add(at, width), 0.0)

    def set_part(self, ref: str, at: Number, state: str) -> None:
        """An event opens or closes a contact at once."""
        self.switches[ref].step(at, self._set(ref, state))

    def bounce(self, ref: str, at: Number, state: str, during: Number, times: int) -> None:
        """A contact goes to its new state with ``times`` interruptions spread evenly over ``during``."""
        other = "open" if state == "closed" else "closed"
        for k in range(times):
            self.set_part(ref, at + during * k / times, state)
            self.set_part(ref, at + during * (k + 0.5) / times, other)
        self.set_part(ref, at + during, state)

    def set_level(self, name: str, at: Number, to: str | float) -> None:
        """A part, or every part that follows ``name``, is set at once in its own quantity; a generator in volts.

        A sine keeps swinging, about the new level.
        """
        if name in self.circuit.builder.generators:
            self.sources[self.circuit.builder.generators[name]].step(at, number(to, "V"))
            return
        for ref, settable in self._named(name):
            value = settable.reading(to)
            self.quantities[ref].step(at, value)
            self.switches[ref].step(at, settable.written(self.lanes, value))

    def ramp_level(self, name: str, at: Number, during: float, to: str | float) -> None:
        """As :meth:`set_level`, reached evenly within ``during``."""
        if name in self.circuit.builder.generators:
            self.sources[self.circuit.builder.generators[name]].ramp(at, during, number(to, "V"))
            return
        for ref, settable in self._named(name):
            quantity, wave = self.quantities[ref], self.switches[ref]
            quantity.ramp(at, during, settable.reading(to))
            begin, end = quantity.values[-2:]
            wave.cut(at)

            def siemens(
                share: float, settable: Settable = settable, begin: Number = begin, end: Number = end
            ) -> Number:
                return settable.written(self.lanes, np.asarray(begin + (np.asarray(end) - begin) * share))

            past = 0.0
            for share in ramp_shares(siemens):
                wave.ramp(at + during * past, during * (share - past), siemens(share))
                past = float(share)

    def _named(self, name: str) -> list[tuple[str, Settable]]:
        """The parts that an event of this name sets."""
        known = self.circuit.builder.settables
        found = [(ref, settable) for ref, settable in known.items() if name in (ref, settable.follows)]
        if not found:
            offered = ", ".join(dict.fromkeys([*known, *self.circuit.builder.generators]))
            raise CircuitError(
                f"part {name} has no level that events set; write {'one of ' + offered if offered else 'another part'}"
            )
        return found

    def program(self, ends: Number, stops: Floats | None = None) -> Program:
        """The segments between all events up to ``ends``; ``stops`` are times that a step must hit without a jump."""
        waves = [*self.sources.values(), *self.switches.values()]
        distinct = {id(w): w for w in waves}.values()
        breaks: list[Number] = [t for w in distinct for t in w.times[1:]]
        times: list[Number] = [0.0, *breaks, *([] if stops is None else list(stops))]
        table = stacked([*times, ends])
        limit = table[:, -1]
        table = np.minimum(table[:, :-1], limit[:, None])
        table.sort(axis=1)
        table = np.concatenate([table, limit[:, None]], axis=1)
        # Instants that differ by rounding only are one: between them there is no time for a step.
        close = np.diff(table, axis=1) <= ROUNDING * np.spacing(table[:, 1:])
        for k in np.flatnonzero(close.any(axis=0))[::-1]:
            table[:, k] = np.where(close[:, k], table[:, k + 1], table[:, k])
        fresh = np.concatenate([[True], np.any(np.diff(table, axis=1) > 0.0, axis=0)])
        table = table[:, fresh]
        starts, lengths = table[:, :-1], np.diff(table, axis=1)
        middles = starts + 0.5 * lengths
        count, segments = self.lanes.count, starts.shape[1]
        source = layout.zeros(count, segments, len(self.sources), 2)
        for k, wave in enumerate(self.sources.values()):
            source[:, :, k, 0], source[:, :, k, 1] = wave.pieces(starts, middles)
        switch = layout.zeros(count, segments, len(self.switches), 2)
        for k, wave in enumerate(self.switches.values()):
            switch[:, :, k, 0], switch[:, :, k, 1] = wave.pieces(starts, middles)
        restart = np.ones(segments, dtype=np.int64)
        if stops is not None:
            jumps = np.concatenate([np.zeros(1), *(np.ravel(b) for b in breaks)])
            restart[_among(starts[0], np.asarray(stops)) & ~_among(starts[0], jumps)] = 0
        return Program(
            length=np.broadcast_to(lengths, (count, segments)).copy(),
            restart=ints(restart),
            source=source,
            sine=self.sines,
            switched=ints([self._parameter(ref) for ref in self.switches]),
            switch=switch,
        )


def _among(times: Floats, known: Floats) -> NDArray[np.bool_]:
    """Which of the times are, but for rounding, among the known ones."""
    ordered = np.sort(known)
    if not ordered.size:
        return np.zeros(times.size, dtype=bool)
    place = np.clip(np.searchsorted(ordered, times), 1, max(ordered.size - 1, 1))
    sides = np.stack([ordered[place - 1], ordered[np.minimum(place, ordered.size - 1)]])
    return np.asarray(np.any(np.abs(sides - times) <= 2.0 * ROUNDING * np.spacing(times), axis=0))


def timeline(circuit: Circuit, lanes: Lanes, sequence: Sequence, starts: bool = False) -> Timeline:
    """The timeline of a document's sequence. ``starts``: initial voltages are given, the supply stands from t = 0."""
    line = Timeline(circuit, lanes)
    if starts:
        line.batteries_stand()
    events = sorted(sequence.events, key=lambda event: read(event.at, "s"))
    if not any(event.event == "connect supply" for event in events):
        if starts:
            line.supply_stands()
        else:
            line.connect_supply(0.0, DEFAULT_RISE)
    for event in events:
        apply(line, event)
    return line


def apply(line: Timeline, event: Event, later: Number = 0.0) -> None:
    """An event of a document happens on a timeline, ``later`` by so many seconds than it says (one for each lane)."""
    at = np.add(read(event.at, "s"), later)
    match event:
        case ConnectSupply():
            line.connect_supply(at, DEFAULT_RISE if event.rise is None else read(event.rise, "s"))
        case DisconnectSupply():
            line.disconnect_supply(at)
        case ContactEvent():
            state = "closed" if event.event == "close" else "open"
            if event.bounce is not None:
                line.bounce(event.part, at, state, read(event.bounce.for_, "s"), event.bounce.times)
            else:
                line.set_part(event.part, at, state)
        case SetLevel():
            line.set_level(event.part, at, event.to)
        case RampLevel():
            line.ramp_level(event.part, at, read(event.for_, "s"), event.to)
        case Dip() | Surge():
            edge = DEFAULT_EDGE if event.edge is None else read(event.edge, "s")
            impedance = _impedance(event)
            try:
                line.excursion(at, read(event.to, "V"), read(event.for_, "s"), edge, impedance)
            except CircuitError as refusal:
                raise CircuitError(f"event {event.event} at {event.at}: {refusal}") from refusal
        case Inject():
            line.inject(at, event.net, read(event.charge, "C"), read(event.width, "s"))
        case ReverseSupply():
            line.reverse_supply(at)


def _impedance(event: Dip | Surge) -> float | None:
    """What a surge comes through in ohm, None where it comes through the source resistance."""
    if isinstance(event, Dip) or event.impedance is None:
        return None
    ohms = read(event.impedance, "ohm")
    if ohms <= 0.0:
        raise CircuitError(f"event surge at {event.at}, impedance: {event.impedance} cannot be; write it like '0R5'")
    return ohms
