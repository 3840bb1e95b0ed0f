"""Inductors and leads against closed forms."""

from __future__ import annotations

import math

import pytest

from stagebook.engine.primitives.signals import Anchor, crossing, level, maximum, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, steps, two


def inductor(ref: str, a: str, b: str, henry: str, ohms: str | None = None, **fields: object) -> Json:
    resistance = {} if ohms is None else {"resistance": ohms}
    return two("inductor", ref, a, b, inductance=henry, **resistance, **fields)


def test_current_rises_with_l_over_r() -> None:
    # i = V/R (1 - exp(-t R/L)), R of winding and resistor together; the supply is up within 100 ns.
    circuit = setup(
        inductor("L1", "supply", "n", "0.1 H", "30R"), resistor("R1", "n", "0V", "70R"), ambient="20 C", ends=5e-3
    )
    rows = [level(circuit.circuit.benches["L1"].currents["a"], Anchor(t)) for t in (0.5e-3, 1e-3, 3e-3)]
    seen = circuit.run(*rows, relative=1e-5)
    exact = [0.06 * (1.0 - math.exp(-t / 1e-3)) for t in (0.5e-3, 1e-3, 3e-3)]
    assert [seen.value(row)[0] for row in rows] == pytest.approx(exact, rel=1e-3)


@pytest.mark.parametrize("celsius", [-20.0, 20.0, 70.0])
def test_the_winding_follows_the_law_of_copper(celsius: float) -> None:
    # R20 (234.5 + T)/254.5, common form for annealed copper.
    circuit = setup(
        inductor("L1", "supply", "n", "1 mH", "100R"),
        resistor("R1", "n", "0V", "100R"),
        ambient=f"{celsius} C",
        ends=10e-3,
    )
    exact = 6.0 * 100.0 / (100.0 + 100.0 * (234.5 + celsius) / 254.5)
    assert circuit.final("n") == pytest.approx(exact, rel=1e-5)


def test_an_inductor_and_a_capacitor_ring() -> None:
    # Step into R, L in series with C: v = V (1 - exp(-a t) (cos w t + a/w sin w t)), a = R/2L, w^2 = 1/LC - a^2.
    ohms, henry, farads = 20.0, 10e-3, 1e-6
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-9, 1.0), (1.0, 1.0)),
        inductor("L1", "in", "m", f"{henry!r} H"),
        resistor("R1", "m", "n", ohms),
        capacitor("C1", "n", "0V", farads),
        supply=None,
        ends=2e-3,
    )
    damping = ohms / (2.0 * henry)
    swing = math.sqrt(1.0 / (henry * farads) - damping**2)
    peak = maximum(voltage("n"))
    seen = circuit.run(peak, relative=1e-6)
    assert seen.value(peak)[0] == pytest.approx(1.0 + math.exp(-damping * math.pi / swing), abs=1e-3)
    assert seen.time(peak)[0] == pytest.approx(math.pi / swing, rel=5e-3)
    # A damped method loses amplitude: looser than the first peak.
    t = 1.7e-3
    course = math.exp(-damping * t) * (math.cos(swing * t) + damping / swing * math.sin(swing * t))
    at = level(voltage("n"), Anchor(t))
    assert circuit.run(at, relative=1e-6).value(at)[0] == pytest.approx(1.0 - course, abs=5e-3)


def test_winding_capacitance_rings_with_the_inductance() -> None:
    circuit = setup(
        resistor("R1", "supply", "n", "1M"),
        inductor("L1", "n", "0V", "1 mH", capacitance="1 nF"),
        ends=20e-6,
    )
    rows = [crossing(voltage("n"), 0.0, True, start=Anchor(1e-6), nth=n) for n in (1, 2)]
    seen = circuit.run(*rows, relative=1e-6)
    assert seen.value(rows[1])[0] - seen.value(rows[0])[0] == pytest.approx(2e-6 * math.pi, rel=2e-3)


@pytest.mark.parametrize(("clamp", "milliseconds"), [(0.7, 5.70), (24.7, 1.05)])
def test_drop_out_time_of_a_coil_with_a_clamp(clamp: float, milliseconds: float) -> None:
    # (L/R) ln((I R + V_k)/(I_do R + V_k)); 12 V, 400 ohm, 1.2 H to 10 %: published values of 5.70 ms and 1.05 ms.
    # The clamp is a steep junction: 20 mV an e-fold, its 0.7 V or 24.7 V at the full 30 mA.
    slope = 20e-3
    law = {
        "saturation_current": f"{0.03 * math.exp(-0.7 / slope)!r} A",
        "ideality": slope / 0.0252611,  # kT/q at 20 C in V
    }
    lift = [] if clamp == 0.7 else [steps("G1", "up", "supply", (0.0, clamp - 0.7), (1.0, clamp - 0.7))]
    circuit = setup(
        inductor("L1", "supply", "low", "1.2 H", "400R"),
        two("diode", "D1", "low", "up" if lift else "supply", law=law),
        *lift,
        two("contact", "S1", "low", "0V", form="make", data={"resistance": "1 mohm", "insulation": "1000G"}),
        supply="12 V",
        ambient="20 C",
        events=[
            {"at": "0 s", "event": "connect supply"},
            {"at": "1 ms", "event": "close", "part": "S1"},
            {"at": "100 ms", "event": "open", "part": "S1"},
        ],
        ends=0.13,
    )
    out = crossing(circuit.circuit.benches["L1"].currents["a"], 3e-3, False, start=Anchor(0.1))
    seconds = float(circuit.run(out, relative=1e-5).value(out)[0]) - 0.1
    exact = 1.2 / 400.0 * math.log((12.0 + clamp) / (1.2 + clamp))
    assert seconds == pytest.approx(exact, rel=0.01)
    assert 1e3 * seconds == pytest.approx(milliseconds, abs=0.06)


def lead(*events: Json, load: str = "100R", ends: float = 1e-3, **fields: object) -> Setup:
    return setup(
        two("lead", "W1", "supply", "far", length="50 m", **{"resistance": "40 mohm/m", **fields}),
        resistor("R1", "far", "0V", load),
        events=[{"at": "0 s", "event": "connect supply"}, *events],
        ends=ends,
    )


def test_a_lead_has_the_resistance_of_its_length() -> None:
    assert lead().final("far") == pytest.approx(6.0 * 100.0 / 102.0, rel=1e-6)


def test_a_lead_leaks_half_at_each_end() -> None:
    circuit = lead(load="1M", insulation="1M", resistance="200 ohm/m")
    far = 1.0 / (1e-6 + 0.5e-6)
    assert circuit.final("far", relative=1e-6) == pytest.approx(6.0 * far / (far + 10e3), rel=1e-6)


def test_a_lead_charges_its_far_half_through_its_resistance() -> None:
    # 50 m of 100 pF/m: half of 5 nF at the far end, behind 10k with 10k to 0V: tau 2.5 nF * 5k.
    circuit = lead(load="10k", resistance="200 ohm/m", capacitance="100 pF/m")
    row = crossing(voltage("far"), 1.5, True)
    assert circuit.run(row).value(row)[0] == pytest.approx(12.5e-6 * math.log(2.0), rel=0.01)


def test_current_in_a_lead_rises_with_its_inductance() -> None:
    circuit = lead(load="8R", inductance="1 uH/m", ends=50e-6)
    row = level(circuit.circuit.benches["W1"].currents["from"], Anchor(5.1e-6))
    exact = 0.6 * (1.0 - math.exp(-5.05e-6 / 5e-6))
    assert circuit.run(row, relative=1e-5).value(row)[0] == pytest.approx(exact, rel=2e-3)


def test_a_lead_is_cut_by_an_event() -> None:
    circuit = lead({"at": "0.5 ms", "event": "set", "part": "W1", "to": "1G"}, inductance="1 uH/m")
    assert circuit.final("far") == pytest.approx(6.0 * 100.0 / 1e9, abs=1e-5)
