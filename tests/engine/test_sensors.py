"""Thermistors and light-dependent resistors follow ambient, or what events set. Expected: their published laws."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, crossing, level, voltage

from .circuits import Json, Setup, resistor, setup, two

NTC: Json = {"value": "10k", "data": {"beta": "3950 K"}}
LDR: Json = {"value": "10k", "data": {"gamma": 0.7}}


def kelvin(celsius: float) -> float:
    return celsius + 273.15


def ntc(celsius: float, beta: float = 3950.0) -> float:
    """R25 exp(B (1/T - 1/298.15)), 10 k at 25 C."""
    return 10e3 * math.exp(beta * (1.0 / kelvin(celsius) - 1.0 / 298.15))


def ldr(lux: float) -> float:
    """R10 (E/10)^-gamma."""
    return float(10e3 * (lux / 10.0) ** -0.7)


def volts_of(ohms: float) -> float:
    return 6.0 * ohms / (10e3 + ohms)


def sensing(
    kind: str, fields: Json, *events: Json, ends: float = 1e-3, ambient: str = "25 C", more: Json | None = None
) -> Setup:
    return setup(
        resistor("R1", "supply", "n", "10k"),
        two(kind, "B1", "n", "0V", **fields),
        *([] if more is None else [more, resistor("R2", "supply", "m", "10k")]),
        ambient=ambient,
        events=[{"at": "0 s", "event": "connect supply", "rise": "1 us"}, *events],
        ends=ends,
    )


def seen_at(circuit: Setup, times: Sequence[float], net: str = "n") -> list[float]:
    rows = [level(voltage(net), Anchor(t)) for t in times]
    seen = circuit.run(*rows)
    return [float(seen.value(row)[0]) for row in rows]


@pytest.mark.parametrize("celsius", [-20.0, 0.0, 25.0, 60.0, 85.0])
def test_a_thermistor_follows_ambient(celsius: float) -> None:
    circuit = sensing("thermistor", {**NTC, "follows": "ambient"}, ambient=f"{celsius} C")
    assert circuit.final("n", relative=1e-6) == pytest.approx(volts_of(ntc(celsius)), rel=1e-6)


def test_a_second_point_stands_for_beta() -> None:
    # Made of 10 k at 25 C and 1 k at 85 C; it must give back the second point.
    data = {"hot_resistance": "1k", "hot_temperature": "85 C"}
    circuit = sensing("thermistor", {"value": "10k", "data": data}, ambient="85 C")
    assert circuit.final("n", relative=1e-6) == pytest.approx(volts_of(1e3), rel=1e-6)


def test_beta_comes_from_a_class_or_as_a_law() -> None:
    named = sensing("thermistor", {"value": "10k", "class": "ntc"}, ambient="50 C")
    assert named.final("n", relative=1e-6) == pytest.approx(volts_of(ntc(50.0, 3950.0)), rel=1e-6)
    law = sensing("thermistor", {"value": "10k", "law": {"beta": "3400 K"}}, ambient="50 C")
    assert law.final("n", relative=1e-6) == pytest.approx(volts_of(ntc(50.0, 3400.0)), rel=1e-6)
    with pytest.raises(CircuitError, match="beta: missing"):
        sensing("thermistor", {"value": "10k"}).run()


def test_events_set_the_temperature_of_one_sensor() -> None:
    circuit = sensing("thermistor", NTC, {"at": "1 s", "event": "set", "part": "B1", "to": "60 C"}, ends=2.0)
    assert seen_at(circuit, [0.5, 1.5]) == pytest.approx([volts_of(10e3), volts_of(ntc(60.0))], rel=1e-5)


def test_all_sensors_that_follow_a_quantity_are_set_by_its_name() -> None:
    circuit = sensing(
        "thermistor",
        {**NTC, "follows": "water"},
        {"at": "1 s", "event": "ramp", "part": "water", "to": "85 C", "for": "6 s"},
        {"at": "8 s", "event": "set", "part": "B1", "to": "0 C"},
        ends=9.0,
        more=two("thermistor", "B2", "m", "0V", "10k", follows="water", data={"beta": "3400 K"}),
    )
    times = [0.5, 2.5, 4.0, 5.5, 7.5]
    celsius = np.interp(times, [1.0, 7.0], [25.0, 85.0])
    assert seen_at(circuit, times) == pytest.approx([volts_of(ntc(c)) for c in celsius], rel=2e-3)
    assert seen_at(circuit, times, "m") == pytest.approx([volts_of(ntc(c, 3400.0)) for c in celsius], rel=2e-3)
    # The designator sets one sensor alone.
    assert seen_at(circuit, [8.5]) == pytest.approx([volts_of(ntc(0.0))], rel=1e-5)
    assert seen_at(circuit, [8.5], "m") == pytest.approx([volts_of(ntc(85.0, 3400.0))], rel=1e-5)


@pytest.mark.parametrize(("light", "lux"), [({}, 10.0), ({"light": "300 lx"}, 300.0)])
def test_a_light_resistor_begins_at_its_light(light: Json, lux: float) -> None:
    circuit = sensing("light_resistor", {"value": "10k", "data": {"gamma": 0.7, **light}})
    assert circuit.final("n", relative=1e-6) == pytest.approx(volts_of(ldr(lux)), rel=1e-6)


def test_light_falls_over_decades_and_passes_a_level_when_it_should() -> None:
    # 1000 lx to 0.1 lx evenly within 10 s; 100k where (E/10)^-0.7 = 10, at E = 10 10^(-1/0.7).
    events = (
        {"at": "1 s", "event": "set", "part": "B1", "to": "1000 lx"},
        {"at": "2 s", "event": "ramp", "part": "B1", "to": "0.1 lx", "for": "10 s"},
    )
    circuit = sensing("light_resistor", LDR, *events, ends=13.0)
    row = crossing(voltage("n"), volts_of(100e3), True, start=Anchor(1.5))
    lux = 10.0 * 10.0 ** (-1.0 / 0.7)
    exact = 2.0 + 10.0 * (1000.0 - lux) / 999.9
    assert circuit.run(row).value(row)[0] == pytest.approx(exact, abs=2e-5)
    times = [1.5, 4.5, 7.0, 11.5, 12.5]
    levels = np.interp(times, [2.0, 12.0], [1000.0, 0.1])
    assert seen_at(circuit, times) == pytest.approx([volts_of(ldr(e)) for e in levels], rel=5e-3)


def test_in_the_dark_a_light_resistor_has_its_dark_resistance() -> None:
    events = ({"at": "1 ms", "event": "set", "part": "B1", "to": "1 mlx"},)
    circuit = sensing("light_resistor", {"value": "10k", "data": {"dark_resistance": "1M"}}, *events, ends=2e-3)
    exact = 1.0 / (1e-6 + 1.0 / ldr(1e-3))
    assert circuit.final("n", relative=1e-6) == pytest.approx(volts_of(exact), rel=1e-6)


@pytest.mark.parametrize(
    ("kind", "fields", "event", "words"),
    [
        ("thermistor", NTC, {"part": "B1", "to": "50 lx"}, "temperature"),
        ("thermistor", NTC, {"part": "B1", "to": "-300 C"}, "absolute zero"),
        ("thermistor", {**NTC, "follows": "ambient"}, {"part": "ambient", "to": "50 C"}, "condition"),
        ("light_resistor", LDR, {"part": "B1", "to": "0 lx"}, "cannot be"),
        ("light_resistor", {**LDR, "follows": "ambient"}, None, "ambient is a temperature"),
        ("light_resistor", LDR, {"part": "R1", "to": "1k"}, "R1 is a resistor, and has no level; write B1"),
    ],
)
def test_a_sensor_that_cannot_be_is_refused(kind: str, fields: Json, event: Json | None, words: str) -> None:
    events = [] if event is None else [{"at": "0.1 ms", "event": "set", **event}]
    with pytest.raises(CircuitError, match=words):
        sensing(kind, fields, *events).run()
