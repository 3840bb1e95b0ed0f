"""A sequence as waves: what the supply, the generators and everything that events set do over time, lane by lane."""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from ..design.datum import number
from ..design.sequence import ConnectSupply, ContactEvent, DisconnectSupply, RampLevel, SetLevel
from ..errors import CircuitError
from ..kernel import layout
from ..kernel.layout import Floats, Program, ints
from ..primitives.builder import SUPPLY_NET, Law
from ..primitives.columns import SUPPLY, Lanes
from ..quantity import read
from .circuit import SUPPLY_SOURCE, SUPPLY_SWITCH, Circuit

if TYPE_CHECKING:
    from ..design.sequence import Event, Sequence

DEFAULT_RISE = 100e-9  # s, a supply that no event connects
HALF_JUMP = 0.5e-12  # s, half of the step with which the kernel takes in what an event does
RAMP_PIECES = 16  # a resistance that moves evenly is not a conductance that does: straight pieces
Number = Floats | float


class Wave:
    """A piecewise linear course: points of time and value, each one number for all lanes or one per lane."""

    def __init__(self, value: Number) -> None:
        self.times: list[Number] = [0.0]
        self.values: list[Number] = [value]

    def step(self, at: Number, value: Number) -> None:
        """Jump to a value."""
        self.cut(at)
        self.times += [at, at]
        self.values += [self.values[-1], value]

    def ramp(self, at: Number, during: Number, value: Number) -> None:
        """Move evenly to a value."""
        self.cut(at)
        self.times += [at, np.add(at, during)]
        self.values += [self.values[-1], value]

    def cut(self, at: Number) -> None:
        """Forget what was to happen after ``at``: the next event overrides a bounce or a ramp that is not over."""
        if not any(np.any(np.greater(time, at)) for time in self.times):
            return
        middles = np.reshape(np.asarray(at, dtype=float), (-1, 1))
        now = self.pieces(middles, middles)[0][:, 0]
        self.values = [np.where(np.greater(t, at), now, v) for t, v in zip(self.times, self.values, strict=True)]
        self.times = [np.minimum(t, at) for t in self.times]

    def later(self, at: Floats) -> Wave:
        """The same course with ``at`` (one instant per lane) as its t = 0."""
        middles = np.asarray(at, dtype=float)[:, None]
        now = self.pieces(middles, middles)[0][:, 0]
        wave = Wave(now)
        for time, value in zip(self.times, self.values, strict=True):
            wave.times.append(np.maximum(np.subtract(time, at), 0.0))
            wave.values.append(np.where(np.greater(time, at), value, now))
        return wave

    def pieces(self, starts: Floats, middles: Floats) -> tuple[Floats, Floats]:
        """Value at the start of each segment and slope within it; arrays are (lanes or 1, segments)."""
        times, values = _stacked(self.times), _stacked(self.values)
        # Times are mostly the same in all lanes: then one search serves them all.
        rows = max(times.shape[0], middles.shape[0])
        searched = zip(
            np.broadcast_to(times, (rows, times.shape[1])),
            np.broadcast_to(middles, (rows, middles.shape[1])),
            strict=True,
        )
        place = np.stack([np.searchsorted(t, m, side="right") - 1 for t, m in searched])
        rows = max(rows, values.shape[0])
        place = np.broadcast_to(place, (rows, place.shape[1]))
        times, values = (np.broadcast_to(a, (rows, a.shape[1])) for a in (times, values))
        after = np.minimum(place + 1, times.shape[1] - 1)
        t0, t1 = np.take_along_axis(times, place, 1), np.take_along_axis(times, after, 1)
        v0, v1 = np.take_along_axis(values, place, 1), np.take_along_axis(values, after, 1)
        span = np.where(t1 > t0, t1 - t0, 1.0)
        slope = np.where(t1 > t0, (v1 - v0) / span, 0.0)
        return v0 + slope * (np.broadcast_to(starts, place.shape) - t0), slope


def _stacked(points: list[Number]) -> Floats:
    """Points as (lanes or 1, points)."""
    rows = max(1, *(np.size(v) for v in points))
    return np.stack([np.broadcast_to(np.asarray(v, dtype=float), (rows,)) for v in points], axis=1)


class Timeline:
    """The waves of one sequence in the given lanes; trials call its methods with one number per lane."""

    def __init__(self, circuit: Circuit, lanes: Lanes) -> None:
        self.circuit = circuit
        self.lanes = lanes
        self.supply = Wave(0.0)
        self.sources = {name: Wave(0.0) for name in circuit.source_names}
        self.switches = {ref: Wave(self._set(ref, None)) for ref in circuit.builder.switches}
        self.sines = layout.zeros(lanes.count, len(circuit.source_names), 3)
        for name in (SUPPLY_SOURCE, SUPPLY_NET):
            if name in self.sources:
                self.sources[name] = self.supply
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH] = Wave(self._set(SUPPLY_SWITCH, "open"))
        self._level: Number = lanes[SUPPLY] if SUPPLY in lanes else 0.0  # noqa: SIM401
        self._generators()

    def _set(self, ref: str, state: str | None) -> Number:
        index, reading = self.circuit.builder.switches[ref]
        law: Law = self.circuit.builder.conductances[index][2] if state is None else reading(state)
        value = law(self.lanes)
        return value if np.ndim(value) else float(value)

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
    def resumed(cls, before: Timeline, at: Floats) -> Timeline:
        """A timeline that goes on, from its own t = 0, where another one stood at ``at`` (one instant per lane)."""
        line = cls(before.circuit, before.lanes)
        # A state is kept at the end of a step. Where an event ends the step, what it does has not happened yet.
        at = np.maximum(0.0, at - np.maximum(HALF_JUMP, 8.0 * np.spacing(np.abs(at))))
        middles = at[:, None]
        for wave, old in (
            (line.supply, before.supply),
            *((line.switches[ref], old) for ref, old in before.switches.items()),
        ):
            value, _ = old.pieces(middles, middles)
            wave.values[0] = np.broadcast_to(value[:, 0], (line.lanes.count,)).copy()
        for name, old in before.sources.items():
            if old is not before.supply:
                line.sources[name] = old.later(at)
        line.sines = before.sines.copy()
        line.sines[:, :, 2] += 2.0 * np.pi * before.sines[:, :, 1] * middles
        return line

    def supply_stands(self) -> None:
        """The supply has its value from t = 0 on."""
        self.supply.values[0] = self._level
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH].values[0] = self._set(SUPPLY_SWITCH, "closed")

    def connect_supply(self, at: Number, rise: Number) -> None:
        """The supply is connected at ``at`` and rises evenly within ``rise``."""
        if SUPPLY_SWITCH in self.switches:
            self.switches[SUPPLY_SWITCH].step(at, self._set(SUPPLY_SWITCH, "closed"))
        self.supply.ramp(at, rise, self._level)

    def disconnect_supply(self, at: Number) -> None:
        """The supply is taken away; its voltage no longer matters."""
        if SUPPLY_SWITCH not in self.switches:
            raise CircuitError(
                "conditions, source_resistance: a supply of 0R cannot be disconnected; write a resistance such as 0R1"
            )
        self.switches[SUPPLY_SWITCH].step(at, self._set(SUPPLY_SWITCH, "open"))
        self.supply.step(at, 0.0)

    def move_supply(self, at: Number, to: Number, edge: Number) -> None:
        """The supply moves to another voltage within ``edge``."""
        self.supply.ramp(at, edge, to)

    def set_part(self, ref: str, at: Number, state: str) -> None:
        """An event sets a contact or a resistance at once."""
        self.switches[ref].step(at, self._set(ref, state))

    def bounce(self, ref: str, at: float, state: str, during: float, times: int) -> None:
        """A contact goes to its new state with ``times`` interruptions spread evenly over ``during``."""
        other = "open" if state == "closed" else "closed"
        for k in range(times):
            self.set_part(ref, at + during * k / times, state)
            self.set_part(ref, at + during * (k + 0.5) / times, other)
        self.set_part(ref, at + during, state)

    def ramp_part(self, ref: str, at: float, during: float, state: str) -> None:
        """A resistance moves evenly to a value."""
        wave = self.switches[ref]
        wave.cut(at)
        begin, end = 1.0 / np.asarray(wave.values[-1]), 1.0 / np.asarray(self._set(ref, state))
        for k in range(RAMP_PIECES):
            share = (k + 1) / RAMP_PIECES
            wave.ramp(at + during * k / RAMP_PIECES, during / RAMP_PIECES, 1.0 / (begin + (end - begin) * share))

    def program(self, ends: Number, stops: Floats | None = None) -> Program:
        """The segments between all events up to ``ends``; ``stops`` are times that a step must hit without a jump."""
        waves = [*self.sources.values(), *self.switches.values()]
        distinct = {id(w): w for w in waves}.values()
        breaks: list[Number] = [t for w in distinct for t in w.times[1:]]
        times: list[Number] = [0.0, *breaks, *([] if stops is None else list(stops))]
        rows = max(np.size(t) for t in (*times, ends))
        limit = np.broadcast_to(np.asarray(ends, dtype=float), (rows,))
        table = np.stack(
            [np.minimum(np.broadcast_to(np.asarray(t, dtype=float), (rows,)), limit) for t in times], axis=1
        )
        table.sort(axis=1)
        table = np.concatenate([table, limit[:, None]], axis=1)
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
        hits = set() if stops is None else {float(t) for t in stops}
        jumps = {float(t) for b in breaks for t in np.ravel(b)}
        restart = [0 if float(t) in hits and float(t) not in jumps else 1 for t in starts[0]]
        return Program(
            length=np.broadcast_to(lengths, (count, segments)).copy(),
            restart=ints(restart),
            source=source,
            sine=self.sines,
            switched=ints(
                [
                    self.circuit.parameter(layout.CONDUCTANCE, self.circuit.builder.switches[ref][0])
                    for ref in self.switches
                ]
            ),
            switch=switch,
        )


def timeline(circuit: Circuit, lanes: Lanes, sequence: Sequence, starts: bool = False) -> Timeline:
    """The timeline of a document's sequence. ``starts``: initial voltages are given, the supply stands from t = 0."""
    line = Timeline(circuit, lanes)
    events = sorted(sequence.events, key=lambda event: read(event.at, "s"))
    if not any(event.event == "connect supply" for event in events):
        if starts:
            line.supply_stands()
        else:
            line.connect_supply(0.0, DEFAULT_RISE)
    for event in events:
        _apply(line, event)
    return line


def _apply(line: Timeline, event: Event) -> None:
    at = read(event.at, "s")
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
            line.set_part(event.part, at, str(event.to))
        case RampLevel():
            line.ramp_part(event.part, at, read(event.for_, "s"), str(event.to))
        case _:
            raise CircuitError(
                f"event '{event.event}' cannot be computed yet; write connect supply, close, open, set or ramp"
            )
