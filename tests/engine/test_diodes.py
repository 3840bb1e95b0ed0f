"""Diodes and zener diodes at rest and under charge, against the Lambert W function, SciPy and their own figures."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import constants, integrate, optimize
from scipy.special import lambertw

from stagebook.engine.primitives.signals import Anchor, level, voltage

from .circuits import Json, Setup, capacitor, resistor, setup, steps, two


def kelvin(celsius: float) -> float:
    return constants.convert_temperature(celsius, "Celsius", "Kelvin")


def thermal_voltage(celsius: float) -> float:
    return constants.k * kelvin(celsius) / constants.e  # SI 2019


def forward(ohms: float, supply: float, ambient: str = "25 C", **fields: object) -> Setup:
    return setup(
        resistor("R1", "supply", "d", ohms),
        two("diode", "D1", "d", "0V", **fields),
        supply=f"{supply} V",
        ambient=ambient,
        ends=1e-3,
    )


def by_lambert(ohms: float, volts: float, saturation: float, slope: float) -> float:
    """i = (n V_T / R) W((I_S R / n V_T) exp((V + I_S R) / n V_T)) - I_S (Corless et al., Adv. Comput. Math. 5 (1996)
    329; Banwell, Jayakumar, Electronics Letters 36 (2000) 291)."""
    inner = saturation * ohms / slope * math.exp((volts + saturation * ohms) / slope)
    return slope / ohms * float(lambertw(inner).real) - saturation


@pytest.mark.parametrize("ohms", [100.0, 4.7e3, 1e6])
@pytest.mark.parametrize("volts", [0.3, 1.0, 9.0])
@pytest.mark.parametrize(("saturation", "ideality"), [(1e-14, 1.0), (2e-9, 1.8), (1e-6, 1.05)])
def test_a_diode_behind_a_resistor_takes_the_current_of_the_lambert_function(
    ohms: float, volts: float, saturation: float, ideality: float
) -> None:
    law = {"saturation_current": saturation, "ideality": ideality}
    circuit = forward(ohms, volts, law=law)
    current = (volts - circuit.final("d", relative=1e-6)) / ohms
    exact = by_lambert(ohms, volts, saturation, ideality * thermal_voltage(25.0))
    assert current == pytest.approx(exact, rel=1e-4, abs=1e-6 * volts / ohms)


@pytest.mark.parametrize("celsius", [-25.0, 0.0, 50.0, 85.0])
@pytest.mark.parametrize("ideality", [1.0, 1.8])
def test_temperature_moves_the_saturation_current_by_the_band_gap(celsius: float, ideality: float) -> None:
    # I_S(T) = I_S(T0) (T/T0)^(eta/n) exp(V_G0/(n V_T0) (1 - T0/T)), eta 3, V_G0 1.206 V, T0 25 C (Tsividis, IEEE J.
    # Solid-State Circuits 15 (1980) 1076, from memory).
    ratio = kelvin(celsius) / kelvin(25.0)
    moved = ratio ** (3.0 / ideality) * math.exp(1.206 / (ideality * thermal_voltage(25.0)) * (1.0 - 1.0 / ratio))
    law = {"saturation_current": 1e-12, "ideality": ideality}
    circuit = forward(1e3, 3.0, f"{celsius} C", law=law)
    current = (3.0 - circuit.final("d", relative=1e-6)) / 1e3
    exact = by_lambert(1e3, 3.0, 1e-12 * moved, ideality * thermal_voltage(celsius))
    assert current == pytest.approx(exact, rel=1e-5)


def current_through(part: Json, volts: float, ambient: str = "25 C") -> float:
    """Current of a part that stands across the supply."""
    circuit = setup(part, resistor("R1", "supply", "0V", "1k"), supply=f"{volts} V", ambient=ambient, ends=1e-3)
    row = level(circuit.circuit.benches["D1"].currents["anode"], Anchor(1e-3))
    return float(circuit.run(row).value(row)[0])


@pytest.mark.parametrize(("volts", "milliamperes"), [(0.60, 1.0), (0.72, 10.0)])
def test_two_forward_points_are_met(volts: float, milliamperes: float) -> None:
    data = {
        "forward_low": "0.60 V",
        "forward_low_current": "1 mA",
        "forward_high": "0.72 V",
        "forward_high_current": "10 mA",
    }
    assert current_through(two("diode", "D1", "supply", "0V", data=data), volts) == pytest.approx(
        1e-3 * milliamperes, rel=1e-4
    )


@pytest.mark.parametrize(("ambient", "nanoamperes"), [("25 C", 20.0), ("45 C", 80.0), ("5 C", 5.0)])
def test_reverse_leakage_doubles_every_ten_kelvin(ambient: str, nanoamperes: float) -> None:
    # Common practice, no source: doubling per 10 K; nearly constant beyond a few tenths of a volt.
    data = {"forward_low": "0.60 V", "forward_low_current": "1 mA", "reverse_current": "20 nA"}
    part = two("diode", "D1", "0V", "supply", data=data)
    assert -current_through(part, 20.0, ambient) == pytest.approx(1e-9 * nanoamperes, rel=1e-3)


def test_series_resistance_adds_to_the_junction() -> None:
    law = {"saturation_current": 1e-14, "series_resistance": "2R"}
    circuit = forward(8.0, 5.0, law=law)
    current = (5.0 - circuit.final("d", relative=1e-6)) / 8.0
    assert current == pytest.approx(by_lambert(10.0, 5.0, 1e-14, thermal_voltage(25.0)), rel=1e-5)


def zener_volts(milliamperes: float) -> float:
    """Voltage of a 5.1 V zener, 5 mA, 10 ohm, that carries a current out of a high voltage."""
    data = {"forward_low": "0.7 V", "forward_low_current": "1 mA", "test_current": "5 mA", "slope_resistance": "10R"}
    ohms = (1000.0 - 5.1) / (1e-3 * milliamperes)
    circuit = setup(
        resistor("R1", "supply", "z", ohms),
        two("zener", "D1", "0V", "z", "5.1 V", data=data),
        supply="1000 V",
        ends=1e-3,
    )
    return circuit.final("z", relative=1e-6)


def test_a_zener_has_its_voltage_at_the_test_current_and_its_slope_resistance_there() -> None:
    assert zener_volts(5.0) == pytest.approx(5.1, abs=1e-4)
    assert (zener_volts(5.05) - zener_volts(4.95)) / 0.1e-3 == pytest.approx(10.0, rel=0.01)
    # Exponential breakdown: 50 mV an e-fold (10 ohm at 5 mA).
    assert zener_volts(0.5) == pytest.approx(5.1 - 0.05 * math.log(10.0), abs=5e-4)


def test_a_zener_conducts_forward_as_a_diode() -> None:
    circuit = setup(
        resistor("R1", "supply", "z", "1k"),
        two("zener", "D1", "z", "0V", "5.1 V", data={"forward_low": "0.7 V", "forward_low_current": "5.3 mA"}),
        supply="6 V",
        ends=1e-3,
    )
    assert circuit.final("z") == pytest.approx(0.7, abs=1e-3)


def test_junction_charge_shares_with_a_capacitor() -> None:
    # A step of 5 V through 22 pF onto a reverse-biased junction: 22 pF (5 - v) = integral of C0 (1 + v/0.75)^-0.5.
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-6, 5.0), (1.0, 5.0)),
        capacitor("C1", "in", "d", "22 pF"),
        two("diode", "D1", "0V", "d", law={"saturation_current": "1e-16 A", "capacitance": "10 pF"}),
        resistor("R1", "d", "0V", "10G"),
        supply=None,
        ends=2e-6,
    )

    def excess(v: float) -> float:
        return 22e-12 * (5.0 - v) - integrate.quad(lambda u: 10e-12 / math.sqrt(1.0 + u / 0.75), 0.0, v)[0]

    exact = optimize.brentq(excess, 0.0, 5.0)
    assert circuit.final("d", relative=1e-5) == pytest.approx(exact, rel=1e-3)


def test_stored_charge_keeps_a_diode_conducting_after_reversal() -> None:
    # Charge control: tau dQ/dt = -Q - tau I_R, storage time tau ln(1 + I_F/I_R) (Kingston, Proc. IRE 42 (1954) 829).
    tau, forward_current, reverse_current = 5e-6, 10e-3, 4e-3
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-7, 100.0), (1e-4, 100.0), (1.0001e-4, -40.0), (1.0, -40.0)),
        resistor("R1", "in", "d", "10k"),
        two("diode", "D1", "d", "0V", law={"saturation_current": "1e-14 A", "transit_time": f"{tau} s"}),
        supply=None,
        ends=1.5e-4,
    )
    rows = [level(voltage("d"), Anchor(1e-4 + t)) for t in np.linspace(1e-6, 3e-5, 600)]
    seen = circuit.run(*rows)
    volts = np.array([seen.value(row)[0] for row in rows])
    stored = 1e-6 + 3e-5 / 600 * int(np.argmax(volts < 0.0))
    assert stored == pytest.approx(tau * math.log(1.0 + forward_current / reverse_current), rel=0.02)
