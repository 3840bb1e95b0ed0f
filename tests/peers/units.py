"""Three units of the kind the program is for, with laws instead of datasheet figures so that peers can take them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from stagebook.engine.primitives.signals import Row, crossing, voltage

from ..engine.circuits import Json, Setup, capacitor, resistor, setup, steps, transistor, two
from .network import Watch

NPN: Json = {
    "saturation_current": 2e-14,
    "forward_gain": 250,
    "reverse_gain": 3,
    "early_voltage": 80,
    "base_emitter_capacitance": 12e-12,
    "base_collector_capacitance": 5e-12,
    "forward_transit_time": 0.8e-9,
    "reverse_transit_time": 20e-9,
}
PNP: Json = {**NPN, "saturation_current": 1.5e-14, "forward_gain": 200}
DIODE: Json = {"saturation_current": 2e-9, "ideality": 1.8, "capacitance": 4e-12, "transit_time": 6e-9}


@dataclass(frozen=True)
class Unit:
    """A unit with what is timed: from one crossing to another, each the n-th of its kind."""

    setup: Setup
    begin: tuple[Watch, int]
    end: tuple[Watch, int]

    @property
    def document(self) -> dict[str, Any]:
        return self.setup.design.dump()

    @property
    def watches(self) -> list[Watch]:
        return [self.begin[0], self.end[0]]

    @property
    def rows(self) -> list[Row]:
        return [
            crossing(voltage(net), level, rising=way > 0, nth=nth) for (net, level, way), nth in (self.begin, self.end)
        ]

    def interval(self, found: list[list[float]]) -> float:
        """The timed interval from the crossings that a peer found."""
        return found[1][self.end[1] - 1] - found[0][self.begin[1] - 1]


def latch_parts(mark: str = "") -> list[Json]:
    """A latch alarm: filter, complementary latch, timer that throws it, driver; nets but the supply end in ``mark``."""
    names = "in t1 t2 kick feed nb pb nc on tc plate on2 ref fire db out low"
    n = {name: name + mark for name in names.split()}
    return [
        steps(f"G1{mark}", n["in"], "0V", (0, 0), (5, 0), (5.0000001, 5), (5.02, 5), (5.0200001, 0)),
        resistor(f"R1{mark}", n["in"], n["t1"], "4k7"),
        capacitor(f"C1{mark}", n["t1"], "0V", "10n"),
        resistor(f"R2{mark}", n["t1"], n["t2"], "4k7"),
        capacitor(f"C2{mark}", n["t2"], "0V", "2n2"),
        capacitor(f"C3{mark}", n["t2"], n["kick"], "10n"),
        resistor(f"R3{mark}", n["kick"], "0V", "100k"),
        two("diode", f"D1{mark}", n["kick"], n["nb"], law=DIODE),
        resistor(f"R4{mark}", "supply", n["feed"], "10R"),
        capacitor(f"C4{mark}", n["feed"], "0V", "47u"),
        transistor(f"Q1{mark}", n["on"], n["pb"], n["feed"], "pnp", law=PNP),
        transistor(f"Q2{mark}", n["nc"], n["nb"], "0V", law=NPN),
        resistor(f"R5{mark}", n["on"], n["nb"], "100k"),
        resistor(f"R6{mark}", n["nb"], "0V", "220k"),
        resistor(f"R7{mark}", n["nc"], n["pb"], "10k"),
        resistor(f"R8{mark}", n["feed"], n["pb"], "100k"),
        capacitor(f"C5{mark}", n["nb"], "0V", "1n"),
        capacitor(f"C6{mark}", n["feed"], n["pb"], "1n"),
        resistor(f"R9{mark}", n["on"], n["tc"], "820k"),
        resistor(f"R10{mark}", n["tc"], n["plate"], "2R2"),
        capacitor(f"C7{mark}", n["plate"], "0V", "100u"),
        two("diode", f"D2{mark}", n["tc"], n["on"], law=DIODE),
        two("diode", f"D3{mark}", n["on"], n["on2"], law=DIODE),
        resistor(f"R11{mark}", n["on2"], n["ref"], "220k"),
        resistor(f"R12{mark}", n["ref"], "0V", "220k"),
        transistor(f"Q3{mark}", n["fire"], n["ref"], n["tc"], "pnp", law=PNP),
        resistor(f"R13{mark}", n["fire"], "0V", "1M"),
        transistor(f"Q4{mark}", n["nb"], n["fire"], "0V", law=NPN),
        resistor(f"R14{mark}", n["on"], n["db"], "10k"),
        resistor(f"R15{mark}", n["db"], "0V", "47k"),
        transistor(f"Q5{mark}", n["low"], n["db"], "0V", law=NPN),
        resistor(f"R16{mark}", "supply", n["out"], "1R"),
        capacitor(f"C8{mark}", n["out"], "0V", "100n"),
        resistor(f"R17{mark}", n["out"], n["low"], "330R"),
    ]


CONNECT: Json = {"at": "0 s", "event": "connect supply", "rise": "100 ns"}


def latch_alarm(ends: float = 110.0) -> Unit:
    """17 nets, 5 transistors, 3 diodes, edges of 100 ns: fired at 5 s, the timer lets the load go a minute later."""
    parts = [*latch_parts(), capacitor("C9", "supply", "0V", "100n")]
    made = setup(
        *parts,
        supply="6 V",
        source="2R",
        events=[CONNECT],
        ends=ends,
        roles={"timing_capacitor": "C7", "latch_pnp": "Q1"},
    )
    return Unit(made, (("low", 3.0, -1), 1), (("low", 3.0, 1), 2))


def flasher() -> Unit:
    """An astable of unequal halves that drives a lamp diode, over five periods from the second on."""
    made = setup(
        resistor("R1", "supply", "c1", "1k"),
        resistor("R2", "supply", "b1", "68k"),
        resistor("R3", "supply", "b2", "47k"),
        resistor("R4", "supply", "c2", "1k"),
        capacitor("C1", "c1", "b2", "10u"),
        capacitor("C2", "c2", "b1", "10u"),
        transistor("Q1", "c1", "b1", "0V", law=NPN),
        transistor("Q2", "c2", "b2", "0V", law=NPN),
        resistor("R5", "c2", "db", "10k"),
        transistor("Q3", "low", "db", "0V", law=NPN),
        resistor("R6", "supply", "lamp", "330R"),
        two("diode", "D1", "lamp", "low", law={"saturation_current": 1e-16, "ideality": 2, "capacitance": 20e-12}),
        capacitor("C3", "supply", "0V", "100n"),
        supply="5 V",
        source="2R",
        events=[CONNECT],
        ends=8.0,
        roles={"timing_capacitor_1": "C1", "timing_capacitor_2": "C2"},
    )
    return Unit(made, (("c1", 2.5, 1), 2), (("c1", 2.5, 1), 7))


def relay_timer() -> Unit:
    """A pulse charges C1; Q1, Q2 hold the relay until it has run down; its contact feeds the lamp that is timed."""
    made = setup(
        steps("G1", "in", "0V", (0, 0), (1, 0), (1.0000001, 8), (1.2, 8), (1.2000001, 0)),
        two("diode", "D1", "in", "push", law=DIODE),
        resistor("R1", "push", "tc", "100R"),
        capacitor("C1", "tc", "0V", "220u"),
        resistor("R2", "tc", "0V", "100k"),
        resistor("R3", "tc", "b1", "47k"),
        transistor("Q1", "c1", "b1", "0V", law=NPN),
        resistor("R4", "supply", "pb", "10k"),
        resistor("R5", "pb", "c1", "4k7"),
        transistor("Q2", "coil", "pb", "supply", "pnp", law=PNP),
        two("coil", "K1", "coil", "0V", inductance="1 H", resistance="400R", pick_up="8.4 V", drop_out="2.4 V"),
        two("diode", "D2", "0V", "coil", law=DIODE),
        two(
            "contact",
            "S1",
            "supply",
            "lamp",
            operated_by="K1",
            data={"resistance": "100 mohm", "insulation": "1G"},
        ),
        resistor("R6", "lamp", "0V", "1k"),
        capacitor("C2", "lamp", "0V", "1n"),
        capacitor("C3", "supply", "0V", "100n"),
        supply="12 V",
        source="2R",
        events=[CONNECT],
        ends=100.0,
        roles={"timing_capacitor": "C1"},
    )
    return Unit(made, (("lamp", 6.0, 1), 1), (("lamp", 6.0, -1), 1))
