"""Light-emitting and Schottky diodes and surge clamps give back the points they are made of."""

from __future__ import annotations

import math

import pytest
from scipy import constants

from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, level

from .circuits import Json, resistor, setup, two


def current_through(part: Json, volts: float, ambient: str = "25 C") -> float:
    """Current of D1 that stands across the supply."""
    circuit = setup(part, resistor("R1", "supply", "0V", "1k"), supply=f"{volts} V", ambient=ambient, ends=1e-3)
    row = level(circuit.circuit.benches["D1"].currents["anode"], Anchor(1e-3))
    return float(circuit.run(row, relative=1e-6).value(row)[0])


# The figures of the classes, from memory.
@pytest.mark.parametrize(
    ("kind", "name", "volts", "amperes"),
    [
        ("led", "red", 1.80, 1e-3),
        ("led", "red", 2.00, 10e-3),
        ("schottky", "1 A Schottky", 0.26, 10e-3),
        ("schottky", "1 A Schottky", 0.50, 1.0),
    ],
)
def test_a_class_meets_its_two_forward_points(kind: str, name: str, volts: float, amperes: float) -> None:
    part = two(kind, "D1", "supply", "0V", **{"class": name})
    # Their leakage, a hundredth of the lower point at the most, flows as well.
    assert current_through(part, volts) == pytest.approx(amperes, rel=0.01)


def test_a_schottky_diode_leaks_in_reverse() -> None:
    part = two("schottky", "D1", "0V", "supply", **{"class": "1 A Schottky"})
    saturation = 0.01 / math.exp((0.26 - 1.1e-3) / (1.108 * 0.02569))
    assert -current_through(part, 20.0) == pytest.approx(100e-6 + saturation, rel=0.01)


@pytest.mark.parametrize(
    ("kind", "key", "gap", "power"), [("schottky", "barrier", 0.7, 2.0), ("led", "band_gap", 2.15, 3.0)]
)
def test_temperature_moves_the_saturation_current_by_barrier_or_gap(
    kind: str, key: str, gap: float, power: float
) -> None:
    # I_S(T)/I_S(T0) = (T/T0)^(p/n) exp(E/(n V_T0) (1 - T0/T)): Richardson's law with p = 2 for a metal contact (Sze,
    # Physics of Semiconductor Devices, from memory), that of a junction with p = 3 otherwise.
    part = two(
        kind, "D1", "supply", "0V", data={"forward_low": "0.3 V", "forward_low_current": "1 mA", key: f"{gap} V"}
    )
    volts, ratio = 0.25, 323.15 / 298.15
    unit = constants.k * 298.15 / constants.e
    saturation = 1e-3 / math.expm1(0.3 / unit) * ratio**power * math.exp(gap / unit * (1.0 - 1.0 / ratio))
    exact = saturation * math.expm1(volts / (unit * ratio))
    assert current_through(part, volts, "50 C") == pytest.approx(exact, rel=1e-4)


@pytest.mark.parametrize(("volts", "amperes"), [(15.0, 5e-6), (24.0, 25.0)])
def test_a_clamp_meets_its_stand_off_and_clamping_points(volts: float, amperes: float) -> None:
    # 600 W within 1 ms at 1.6 times the stand-off voltage: class figures, from memory.
    part = two("clamp", "D1", "0V", "supply", "15 V", data={"forward_low": "0.7 V", "forward_low_current": "10 mA"})
    assert -current_through(part, volts) == pytest.approx(amperes, rel=1e-4)


def test_a_clamp_of_a_class_and_with_figures_of_its_own() -> None:
    named = two("clamp", "D1", "0V", "supply", **{"class": "24 V surge clamp"})
    assert -current_through(named, 38.4) == pytest.approx(600.0 / 38.4, rel=1e-4)
    data = {
        "forward_low": "0.7 V",
        "forward_low_current": "10 mA",
        "clamping_voltage": "22 V",
        "pulse_current": "30 A",
        "standoff_current": "1 uA",
    }
    own = two("clamp", "D1", "0V", "supply", "14 V", data=data)
    assert -current_through(own, 22.0) == pytest.approx(30.0, rel=1e-4)
    # Half-way between the points on the logarithmic scale.
    assert -current_through(own, 18.0) == pytest.approx(math.sqrt(30.0 * 1e-6), rel=1e-4)


def test_a_clamp_conducts_forward_as_a_diode() -> None:
    part = two("clamp", "D1", "supply", "0V", "15 V", data={"forward_low": "0.7 V", "forward_low_current": "10 mA"})
    assert current_through(part, 0.7) == pytest.approx(10e-3, rel=1e-4)


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"value": None}, "stand-off"),
        ({"value": "15 V", "data": {"clamping_voltage": "14 V"}}, "above the stand-off"),
        ({"value": "15 V", "data": {"pulse_current": "1 uA"}}, "above the stand-off current"),
    ],
)
def test_a_clamp_that_cannot_be_is_refused(fields: Json, words: str) -> None:
    data = {"forward_low": "0.7 V", "forward_low_current": "10 mA", **fields.pop("data", {})}
    with pytest.raises(CircuitError, match=words):
        current_through(two("clamp", "D1", "0V", "supply", data=data, **fields), 10.0)
