"""Batteries: voltage by charge state, resistance fresh, aged and cold. Expected values by Ohm's law."""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, level, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, two

CURVE = [["0 %", "6 V"], ["40 %", "8 V"], ["100 %", "9.5 V"]]


def loaded(ohms: float = 20.0, ambient: str = "25 C", **fields: object) -> Setup:
    return setup(
        two("battery", "G1", "top", "0V", **fields),
        resistor("R1", "top", "0V", ohms),
        supply=None,
        ambient=ambient,
        ends=1e-3,
    )


@pytest.mark.parametrize(("state", "volts"), [("100 %", 9.5), ("70 %", 8.75), ("40 %", 8.0), ("10 %", 6.5), (0, 6.0)])
def test_voltage_follows_the_charge_state(state: object, volts: float) -> None:
    circuit = loaded(voltage=CURVE, resistance="2R", data={"charge_state": state})
    assert circuit.final("top", relative=1e-6) == pytest.approx(volts * 20.0 / 22.0, rel=1e-6)
    row = level(circuit.circuit.benches["G1"].currents["plus"], Anchor(1e-3))
    assert -circuit.run(row).value(row)[0] == pytest.approx(volts / 22.0, rel=1e-4)


def test_lanes_have_charge_states_of_their_own() -> None:
    data = {"charge_state": {"min": "0 %", "typical": "40 %", "max": "100 %"}}
    circuit = loaded(voltage=CURVE, resistance="2R", data=data)
    seen = circuit.run(changes={("G1", "charge_state"): np.array([0.0, 0.4, 1.0])})
    exact = np.array([6.0, 8.0, 9.5]) * 20.0 / 22.0
    assert seen.final[:, circuit.circuit.index("top")] == pytest.approx(exact, rel=1e-6)


def test_resistance_of_two_loads_gives_back_both() -> None:
    # 9.1 V at 10 mA and 8.65 V at 100 mA: 5 ohm, 9.15 V without load.
    loads = [["10 mA", "9.1 V"], ["100 mA", "8.65 V"]]
    for ohms, volts in ((9.1 / 0.01, 9.1), (8.65 / 0.1, 8.65)):
        circuit = loaded(ohms, voltage="9.15 V", data={"loads": loads})
        assert circuit.final("top", relative=1e-6) == pytest.approx(volts, rel=1e-6)


@pytest.mark.parametrize(
    ("ambient", "age", "ohms"),
    [("25 C", 0, 2.0), ("25 C", "100 %", 10.0), ("-20 C", 0, 6.0), ("50 C", 0, 2.0), ("25 C", "50 %", 20.0**0.5)],
)
def test_resistance_grows_with_age_and_cold(ambient: str, age: object, ohms: float) -> None:
    # Met at the figures, a power law between them: common practice, no source.
    data = {"aged_resistance": "10R", "cold_resistance": "6R", "age": age}
    circuit = loaded(ambient=ambient, voltage="9 V", resistance="2R", data=data)
    assert circuit.final("top", relative=1e-6) == pytest.approx(9.0 * 20.0 / (20.0 + ohms), rel=1e-6)


def test_a_class_brings_curve_and_resistance() -> None:
    # 9 V block: 9.5 V full, 2 ohm fresh; class figures, from memory.
    circuit = loaded(**{"class": "9 V block"})
    assert circuit.final("top", relative=1e-6) == pytest.approx(9.5 * 20.0 / 22.0, rel=1e-6)


def test_a_battery_between_two_nets_and_without_resistance() -> None:
    circuit = setup(
        two("battery", "G1", "top", "low", voltage="9 V"),
        resistor("R1", "top", "0V", "2k"),
        resistor("R2", "low", "0V", "1k"),
        supply=None,
        ends=1e-3,
    )
    assert [circuit.final(net, relative=1e-6) for net in ("top", "low")] == pytest.approx([6.0, -3.0], rel=1e-6)


def test_with_starts_a_battery_stands_from_the_beginning() -> None:
    parts = (
        two("battery", "G1", "top", "0V", voltage="9 V", resistance="1k"),
        capacitor("C1", "top", "0V", "1 uF"),
        resistor("R1", "top", "0V", "100M"),
    )
    circuit = setup(*parts, supply=None, starts={"top": "9 V"}, ends=1e-3)
    row = level(voltage("top"), Anchor(1e-8))
    assert circuit.run(row).value(row)[0] == pytest.approx(9.0, abs=1e-3)


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({}, "voltage: missing"),
        ({"class": "D cell"}, "no class of kind battery"),
        ({"voltage": [["0 %", "6 V", "1"]]}, "two numbers"),
        ({"voltage": [["0 %", "6 V"], ["0 %", "7 V"]]}, "one place"),
        ({"voltage": [["0 %", "6 A"], ["50 %", "7 V"]]}, "voltage"),
        ({"voltage": "9 V", "data": {"charge_state": "120 %"}}, "between 0 %"),
        ({"voltage": "9 V", "data": {"loads": [["10 mA", "9 V"], ["100 mA", "9.2 V"]]}}, "lower voltage"),
    ],
)
def test_a_battery_that_cannot_be_is_refused(fields: Json, words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        loaded(**fields).run()
