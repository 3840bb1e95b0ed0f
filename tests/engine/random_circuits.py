"""Random small circuits for property tests: every net has a resistor towards the supply or the return.

Junctions hang on nets behind resistors: two of them straight across the supply would carry millions of amperes.
"""

from __future__ import annotations

from hypothesis import strategies as st

from .circuits import Json, Setup, capacitor, mosfet, resistor, setup, transistor, two

LAWS: tuple[Json, ...] = (
    {"saturation_current": "2e-14 A", "forward_gain": 200, "reverse_gain": 2, "early_voltage": "80 V"},
    {
        "saturation_current": "1e-14 A",
        "forward_gain": 50,
        "reverse_gain": 1,
        "base_emitter_capacitance": "10 pF",
        "base_collector_capacitance": "4 pF",
        "forward_transit_time": "1 ns",
        "reverse_transit_time": "20 ns",
        "base_emitter_breakdown": "6 V",
    },
    {
        "saturation_current": "1e-14 A",
        "forward_gain": 100,
        "knee_current": "1 mA",
        "recombination_current": "1e-12 A",
        "forward_transit_time": "2 ns",
    },
)
DIODES: tuple[Json, ...] = (
    {"saturation_current": "2e-9 A", "ideality": 1.8, "capacitance": "4 pF", "transit_time": "6 ns"},
    {"saturation_current": "1e-14 A", "breakdown_voltage": "5 V"},
)
CHANNELS: tuple[Json, ...] = (
    {"threshold": "0.3 V", "transconductance": "20 mA/V2", "early_voltage": "40 V"},
    {
        "threshold": "1.5 V",
        "transconductance": "5 mA/V2",
        "gate_source_capacitance": "50 pF",
        "gate_drain_capacitance": "10 pF",
        "body_saturation_current": "1e-12 A",
        "drain_source_capacitance": "20 pF",
    },
)


def decades(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(low, high).map(lambda e: float(f"{10.0**e:.3g}"))


@st.composite
def parts_of_a_circuit(draw: st.DrawFn) -> list[Json]:
    free = [f"n{k}" for k in range(draw(st.integers(1, 4)))]
    parts: list[Json] = [resistor("R99", "supply", "0V", "100k")]
    for k, net in enumerate(free):
        other = draw(st.sampled_from(["supply", "0V", *free[:k]]))
        parts.append(resistor(f"R{k}", net, other, draw(decades(2, 6))))
        if other not in ("supply", "0V"):
            parts.append(resistor(f"R{k + 10}", net, draw(st.sampled_from(["supply", "0V"])), draw(decades(2, 6))))
    nets = st.sampled_from(["supply", "0V", *free])
    for k in range(draw(st.integers(0, 6))):
        kind = draw(
            st.sampled_from(["resistor", "capacitor", "capacitor", "diode", "npn", "pnp", "mosfet_n", "mosfet_p"])
        )
        a, b, c = draw(nets), draw(nets), draw(nets)
        if a == b:
            continue
        if kind == "resistor":
            parts.append(resistor(f"R{k + 20}", a, b, draw(decades(2, 6))))
        elif kind == "capacitor":
            parts.append(capacitor(f"C{k}", a, b, draw(decades(-11, -5))))
        elif kind == "diode":
            if "supply" not in (a, b):
                parts.append(two("diode", f"D{k}", a, b, law=draw(st.sampled_from(DIODES))))
        elif "supply" not in (a, b, c) and kind.startswith("mosfet"):
            parts.append(mosfet(f"Q{k}", a, b, c, kind, law=draw(st.sampled_from(CHANNELS))))
        elif "supply" not in (a, b, c):
            parts.append(transistor(f"Q{k}", a, b, c, kind, law=draw(st.sampled_from(LAWS))))
    return parts + [resistor(f"R{k + 50}", net, "0V", "10M") for k, net in enumerate(free)]


@st.composite
def random_circuits(draw: st.DrawFn, ends: float = 5e-3) -> Setup:
    supply = draw(st.sampled_from(["3 V", "9 V", "12 V"]))
    rise = draw(st.sampled_from(["100 ns", "10 us", "2 ms"]))
    events = [{"at": "0 s", "event": "connect supply", "rise": rise}]
    return setup(*draw(parts_of_a_circuit()), supply=supply, events=events, ends=ends)
