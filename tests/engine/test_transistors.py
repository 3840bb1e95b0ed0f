"""Bipolar transistors at rest and under charge, against Ebers and Moll, Tsividis, and their own figures."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import constants, optimize

from stagebook.engine.parts.transistor_figures import reverse_gain_from
from stagebook.engine.primitives.signals import Anchor, level

from .circuits import Setup, resistor, setup, steps, transistor

ROOM = constants.convert_temperature(25.0, "Celsius", "Kelvin")
WARM_VOLTAGE = constants.k * 300.0 / constants.e  # thermal voltage at 300 K
LAW = {
    "saturation_current": "1e-14 A",
    "forward_gain": 100,
    "reverse_gain": 1,
    "thermal_voltage": f"{WARM_VOLTAGE!r} V",
}
AT_END = Anchor(1e-3)


def driven(base: float, collector: float, law: dict[str, object], kind: str = "npn", **fields: object) -> Setup:
    """Base and collector each fed from 100 V by a resistor of the given size."""
    far, near = ("supply", "0V") if kind.endswith("npn") else ("0V", "supply")
    return setup(
        resistor("R1", far, "b", base),
        resistor("R2", far, "c", collector),
        transistor("Q1", "c", "b", near, kind, law=law, **fields),
        supply="100 V",
        ends=1e-3,
    )


def currents(circuit: Setup) -> tuple[float, float]:
    bench = circuit.circuit.benches["Q1"]
    rows = [level(bench.currents[pin], AT_END) for pin in ("collector", "base")]
    seen = circuit.run(*rows, relative=1e-6)
    return float(seen.value(rows[0])[0]), float(seen.value(rows[1])[0])


# V_CE = V_T ln[(1 + (b + 1)/B_R) / (1 - b/B_F)] (Ebers, Moll, Proc. IRE 42 (1954) 1761, from memory) for B_F 100,
# B_R 1, 300 K; millivolts worked by hand.
SATURATED = [(1, 28.7), (5, 51.6), (10, 67.0), (20, 85.7), (50, 120.1)]


@pytest.mark.parametrize(("forced", "millivolts"), SATURATED)
def test_saturation_voltage_at_a_forced_gain(forced: int, millivolts: float) -> None:
    circuit = driven(1e5 * forced, 1e5, LAW)
    volts = circuit.final("c", relative=1e-6)
    ic, ib = currents(circuit)
    b = ic / ib
    assert b == pytest.approx(forced, rel=0.01)
    exact = WARM_VOLTAGE * math.log((1 + (b + 1) / 1.0) / (1 - b / 100.0))
    assert volts == pytest.approx(exact, abs=2e-6)
    assert 1e3 * volts == pytest.approx(millivolts, abs=0.5)


@pytest.mark.parametrize("forced", [1.0, 10.0, 40.0])
def test_the_reverse_gain_gives_back_the_saturation_voltage_it_was_made_of(forced: float) -> None:
    reverse = reverse_gain_from(0.08, forced, 100.0)
    vt = constants.k * ROOM / constants.e
    assert vt * math.log((1 + (forced + 1) / reverse) / (1 - forced / 100.0)) == pytest.approx(0.08, rel=1e-9)


def test_a_pnp_is_the_mirror_image_of_an_npn() -> None:
    npn, pnp = driven(1e6, 1e4, LAW), driven(1e6, 1e4, LAW, "pnp")
    for net in ("b", "c"):
        assert 100.0 - pnp.final(net) == pytest.approx(npn.final(net), rel=1e-9, abs=1e-9)
    assert currents(pnp) == pytest.approx([-i for i in currents(npn)], rel=1e-6)


def base_emitter_volts(celsius: np.ndarray) -> np.ndarray:
    """V_BE at 1 mA and each temperature; 0.65 V at 300 K by choice of the saturation current."""
    t0 = 300.0
    # Saturation current at 300 K, brought to the reference temperature of the laws, 25 C, by the published law.
    at_warm = 1e-3 / math.expm1(0.65 / WARM_VOLTAGE)
    ratio = ROOM / t0
    at_room = at_warm * ratio**3 * math.exp(1.206 / WARM_VOLTAGE * (1.0 - 1.0 / ratio))
    circuit = setup(
        resistor("R1", "supply", "b", "1M"),
        transistor("Q1", "b", "b", "0V", law={"saturation_current": at_room, "forward_gain": 1e9}),
        supply="1000 V",
        ends=1e-3,
    )
    seen = circuit.run(changes={("conditions", "ambient"): celsius}, relative=1e-6)
    return seen.final[:, circuit.circuit.index("b")]


def test_base_emitter_voltage_falls_by_the_published_slope() -> None:
    # Tsividis, IEEE J. Solid-State Circuits 15 (1980) 1076 (from memory): slope at 300 K for 0.65 V, V_G0 1.206 V,
    # eta 3 at constant current: -(V_G0 - V_BE + eta kT/q)/T = -2.112 mV/K.
    low, high = base_emitter_volts(np.array([26.85 - 0.5, 26.85 + 0.5]))
    assert 1e3 * (high - low) == pytest.approx(-2.112, abs=0.002)


def test_base_emitter_voltage_over_temperature_is_the_published_curve() -> None:
    celsius = np.array([-40.0, 0.0, 26.85, 60.0, 110.0])
    t = celsius + 273.15
    vt = constants.k * t / constants.e
    exact = 1.206 * (1 - t / 300.0) + t / 300.0 * 0.65 - 3.0 * vt * np.log(t / 300.0)
    # The feed is a resistor at 1000 V: (1000 - V_BE) / 1M instead of 1 mA.
    exact += vt * np.log((1000.0 - exact) / 1000.0)
    assert base_emitter_volts(celsius) == pytest.approx(exact, abs=2e-5)


def test_gain_and_its_rise_with_temperature() -> None:
    # +0.5 %/K, common practice (from memory).
    law = {"saturation_current": "1e-14 A", "forward_gain": 120}
    for ambient, gain in (("25 C", 120.0), ("65 C", 144.0), ("-15 C", 96.0)):
        circuit = setup(
            resistor("R1", "supply", "b", "10M"),
            resistor("R2", "supply", "c", "10k"),
            transistor("Q1", "c", "b", "0V", law=law),
            supply="100 V",
            ambient=ambient,
            ends=1e-3,
        )
        ic, ib = currents(circuit)
        assert ic / ib == pytest.approx(gain, rel=1e-5)


def test_the_early_effect_raises_collector_current_by_collector_base_voltage() -> None:
    # I_C ~ 1 + V_CB / V_A (Early, Proc. IRE 40 (1952) 1401).
    law = {**LAW, "early_voltage": "80 V"}
    circuit = driven(10e6, 10e3, law)
    ic, ib = currents(circuit)
    across = circuit.final("c", relative=1e-6) - circuit.final("b", relative=1e-6)
    assert across > 50.0
    assert ic / ib == pytest.approx(100.0 * (1.0 + across / 80.0), rel=1e-5)


def test_a_reversed_base_emitter_junction_clamps_at_its_breakdown() -> None:
    # Exponential breakdown: 10 uA at the stated voltage, 50 mV an e-fold (from memory).
    law = {**LAW, "base_emitter_breakdown": "8 V"}
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-5, -15.0), (1.0, -15.0)),
        resistor("R1", "in", "b", "10k"),
        resistor("R2", "supply", "c", "10k"),
        transistor("Q1", "c", "b", "0V", law=law),
        supply="9 V",
        ends=1e-3,
    )
    volts = circuit.final("b", relative=1e-6)
    exact = optimize.brentq(lambda v: (15.0 + v) / 10e3 - 10e-6 * math.exp((-v - 8.0) / 0.05), -9.0, -7.0)
    assert volts == pytest.approx(exact, abs=1e-4)
    assert circuit.final("c") == pytest.approx(9.0, abs=1e-3)  # breakdown of the emitter leaves the collector alone


def test_collector_current_rises_as_the_base_fills_with_charge() -> None:
    # Charge control: i_C = B I_B (1 - exp(-t / (B tau_F))) (Beaufoy, Sparkes, A.T.E. Journal 13 (1957) 310).
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-9, 1000.0), (1.0, 1000.0)),
        resistor("R1", "in", "b", "100M"),
        resistor("R2", "supply", "c", "10R"),
        transistor("Q1", "c", "b", "0V", law={**LAW, "forward_transit_time": "2 ns"}),
        supply="10 V",
        ends=1e-6,
    )
    times = np.array([50e-9, 100e-9, 200e-9, 400e-9, 900e-9])
    bench = circuit.circuit.benches["Q1"]
    rows = [level(bench.currents["collector"], Anchor(t)) for t in times]
    seen = circuit.run(*rows, relative=1e-5)
    collector = np.array([seen.value(row)[0] for row in rows])
    base = (1000.0 - 0.65) / 100e6
    # The current starts half of the rise time late.
    assert collector == pytest.approx(100 * base * -np.expm1(-(times - 0.5e-9) / (100 * 2e-9)), rel=1e-3)


def test_a_class_gives_back_the_figures_it_is_made_of() -> None:
    # Class figures of a small transistor (from memory): V_BE 0.64 V at 2 mA, gain 300, V_CE(sat) 0.1 V at 10/0.5 mA.
    fields = {"class": "small npn"}
    active = setup(
        transistor("Q1", "b", "b", "0V", **fields),
        resistor("R1", "supply", "b", f"{(1000 - 0.64) / (2e-3 * (1 + 1 / 300))}"),
        supply="1000 V",
        ends=1e-3,
    )
    assert active.final("b", relative=1e-6) == pytest.approx(0.64, abs=1e-4)
    ic, ib = currents(active)
    assert ic / ib == pytest.approx(300.0, rel=1e-4)
    saturated = setup(
        resistor("R1", "supply", "b", "200k"),
        resistor("R2", "supply", "c", "10k"),
        transistor("Q1", "c", "b", "0V", **fields),
        supply="100 V",
        ends=1e-3,
    )
    assert saturated.final("c") == pytest.approx(0.1, abs=5e-3)  # the Early effect is not in the formula


@pytest.mark.parametrize(("ambient", "factor"), [("25 C", 1.0), ("54.8 C", 4.0)])
def test_collector_leakage_of_a_class(ambient: str, factor: float) -> None:
    # Class figure (from memory): 1 nA at 25 C, doubling every 14.9 K; base and emitter joined.
    circuit = setup(
        resistor("R1", "supply", "c", "1k"),
        transistor("Q1", "c", "0V", "0V", **{"class": "small npn"}),
        supply="9 V",
        ambient=ambient,
        ends=1e-3,
    )
    assert currents(circuit)[0] == pytest.approx(1e-9 * factor, rel=5e-3)  # and the collector junction's own


def test_the_gains_of_a_darlington_multiply() -> None:
    # I_C / I_B = B^2 + 2 B in the active region.
    circuit = driven(1e9, 1e4, LAW, "darlington_npn")
    ic, ib = currents(circuit)
    assert ic / ib == pytest.approx(100.0**2 + 2 * 100.0, rel=1e-4)
    assert circuit.final("b") == pytest.approx(
        WARM_VOLTAGE * (math.log(ic * 100 / 101 / 1e-14) + math.log(ic / 102 / 1e-14)), rel=5e-3
    )


def test_voltages_are_those_of_a_hand_solved_bias() -> None:
    # Emitter resistor bias solved by SciPy's brentq on the same law.
    circuit = setup(
        resistor("R1", "supply", "b", "100k"),
        resistor("R2", "b", "0V", "47k"),
        resistor("R3", "supply", "c", "4k7"),
        resistor("R4", "e", "0V", "2k2"),
        transistor("Q1", "c", "b", "e", law=LAW),
        supply="9 V",
        ends=1e-3,
    )

    def excess(vbe: float) -> float:
        ic = 1e-14 * math.expm1(vbe / WARM_VOLTAGE)
        vb = vbe + 2.2e3 * ic * 1.01
        return (9.0 - vb) / 100e3 - vb / 47e3 - ic / 100.0

    vbe = optimize.brentq(excess, 0.3, 0.8, xtol=1e-13)
    ic = 1e-14 * math.expm1(vbe / WARM_VOLTAGE)
    seen = circuit.run(relative=1e-6)
    assert seen.final[0, circuit.circuit.index("c")] == pytest.approx(9.0 - 4.7e3 * ic, abs=2e-5)
    assert seen.final[0, circuit.circuit.index("e")] == pytest.approx(2.2e3 * ic * 1.01, abs=2e-5)


def test_power_is_what_flows_times_what_stands_across() -> None:
    circuit = driven(1e6, 2e4, LAW)
    row = level(circuit.circuit.benches["Q1"].power, AT_END)
    power = circuit.run(row, relative=1e-6).value(row)[0]
    ic, ib = currents(circuit)
    vc, vb = (circuit.run(relative=1e-6).final[0, circuit.circuit.index(net)] for net in ("c", "b"))
    assert power == pytest.approx(ic * vc + ib * vb, rel=1e-9)
