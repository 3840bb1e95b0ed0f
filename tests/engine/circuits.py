"""Small design documents for the tests of the engine, and the one way in which all of them are computed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from stagebook.engine.circuit.circuit import Circuit, build
from stagebook.engine.circuit.timeline import Timeline, timeline
from stagebook.engine.design.document import Design
from stagebook.engine.kernel.layout import Floats, Program
from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.primitives.signals import Row
from stagebook.engine.quantity import read
from stagebook.engine.run import Observed, run

Json = dict[str, Any]


def two(kind: str, ref: str, a: str, b: str, value: object = None, **fields: object) -> Json:
    """A part with two pins, named as its kind names them."""
    pins = {
        **dict.fromkeys(("diode", "zener", "led", "schottky", "clamp"), ("anode", "cathode")),
        "generator": ("plus", "minus"),
        "battery": ("plus", "minus"),
        "lead": ("from", "to"),
        "sounder": ("plus", "minus"),
        "piezo": ("plus", "minus"),
    }.get(kind, ("a", "b"))
    text = {} if value is None else {"value": value if isinstance(value, str) else repr(value)}
    return {"ref": ref, "kind": kind, "pins": dict(zip(pins, (a, b), strict=True)), **text, **fields}


def resistor(ref: str, a: str, b: str, ohms: str | float, **fields: object) -> Json:
    return two("resistor", ref, a, b, ohms, **fields)


def capacitor(ref: str, a: str, b: str, farads: str | float, **fields: object) -> Json:
    return two("capacitor", ref, a, b, farads if isinstance(farads, str) else f"{farads!r} F", **fields)


def transistor(ref: str, collector: str, base: str, emitter: str, kind: str = "npn", **fields: object) -> Json:
    return {
        "ref": ref,
        "kind": kind,
        "pins": {"collector": collector, "base": base, "emitter": emitter},
        **fields,
    }


def astable(first: int, load: str, bases: tuple[str, str], coupling: tuple[str, str]) -> list[Json]:
    """Two transistors that switch each other off in turn, numbered from ``first``: collector resistors, base resistors
    of b2 and b1, capacitors from c1 to b2 and from c2 to b1."""
    small = {"class": "small npn"}
    return [
        resistor(f"R{first}", "supply", "c1", load),
        resistor(f"R{first + 1}", "supply", "b2", bases[0]),
        resistor(f"R{first + 2}", "supply", "b1", bases[1]),
        resistor(f"R{first + 3}", "supply", "c2", load),
        capacitor(f"C{first}", "c1", "b2", coupling[0]),
        capacitor(f"C{first + 1}", "c2", "b1", coupling[1]),
        transistor(f"Q{first}", "c1", "b1", "0V", **small),
        transistor(f"Q{first + 1}", "c2", "b2", "0V", **small),
    ]


def mosfet(ref: str, drain: str, gate: str, source: str, kind: str = "mosfet_n", **fields: object) -> Json:
    return {"ref": ref, "kind": kind, "pins": {"drain": drain, "gate": gate, "source": source}, **fields}


def steps(ref: str, plus: str, minus: str, *points: tuple[float, float]) -> Json:
    """A generator that joins (seconds, volts) by straight lines."""
    return two("generator", ref, plus, minus, waveform={"steps": [[repr(t), repr(v)] for t, v in points]})


def sine(ref: str, plus: str, minus: str, amplitude: float, frequency: float, offset: float = 0.0) -> Json:
    wave = {"amplitude": f"{amplitude!r} V", "frequency": f"{frequency!r} Hz", "offset": f"{offset!r} V"}
    return two("generator", ref, plus, minus, waveform={"sine": wave})


@dataclass(frozen=True)
class Setup:
    """A design with what it takes to run its sequence."""

    design: Design

    @cached_property
    def circuit(self) -> Circuit:
        return build(self.design)

    @property
    def ends(self) -> float:
        return read(self.design.sequences["alarm"].ends, "s")

    def lanes(self, changes: Mapping[tuple[str, str], Floats | float] | None = None, count: int = 1) -> Lanes:
        """Lanes with some columns set: one lane for each number in an array."""
        changes = changes or {}
        count = max(count, *(np.size(v) for v in changes.values())) if changes else count
        return self.circuit.nominal(count).replaced(changes)

    def timeline(self, lanes: Lanes) -> Timeline:
        starts = self.design.starts_of("alarm")
        return timeline(self.circuit, lanes, self.design.sequences["alarm"], starts=starts is not None)

    def program(self, lanes: Lanes) -> Program:
        return self.timeline(lanes).program(self.ends)

    def start(self, lanes: Lanes) -> Floats | None:
        """Voltages at 0 s as the document gives them."""
        given = self.design.starts_of("alarm")
        if given is None:
            return None
        start = np.zeros((lanes.count, int(self.circuit.topology.size[2])))
        for net, volts in given.items():
            start[:, self.circuit.index(net)] = read(volts, "V")
        return start

    def run(
        self,
        *rows: Row,
        changes: Mapping[tuple[str, str], Floats | float] | None = None,
        count: int = 1,
        **options: Any,
    ) -> Observed:
        """Run the sequence; every lane must be solved."""
        lanes = self.lanes(changes, count)
        seen = run(self.circuit, lanes, self.program(lanes), rows, start=self.start(lanes), **options)
        failures = [words for words in map(seen.failure, range(lanes.count)) if words]
        assert failures == []
        return seen

    def final(self, net: str, **arguments: Any) -> float:
        """Voltage of a net at the end, in the first lane."""
        return float(self.run(**arguments).final[0, self.circuit.index(net)])


def setup(
    *parts: Json,
    ends: float,
    supply: str | Json | None = "6 V",
    ambient: str = "25 C",
    source: str = "0R",
    events: Sequence[Json] = (),
    starts: Mapping[str, str] | None = None,
    roles: Mapping[str, str] | None = None,
    leakage: str = "specified",
    strays: Sequence[tuple[str, str, str]] = (),
) -> Setup:
    """A design of one stage with one sequence; without events the supply comes up within 100 ns."""
    conditions: Json = {"ambient": ambient, "leakage": [leakage]}
    if supply is not None:
        conditions |= {"supply": supply, "source_resistance": source}
    document: Json = {
        "stagebook": 1,
        "name": "test",
        "conditions": conditions,
        "stages": [{"name": "all", "parts": list(parts), "roles": dict(roles or {})}],
        "strays": [{"between": [a, b], "value": value} for a, b, value in strays],
        "sequences": {"alarm": {"ends": f"{ends!r} s", "events": list(events)}},
    }
    if starts is not None:
        document["starts"] = dict(starts)
    return Setup(Design.load(document))
