"""The complementary latch: with which current it holds and with which it lets go.

Held while alpha1 + alpha2 >= 1, that is B1 B2 >= 1 (Ebers, Proc. IRE 40 (1952) 1361; Moll, Tanenbaum, Goldey, Holonyak,
Proc. IRE 44 (1956) 1174; from memory). With a resistor across the second base the exact active-mode solution is

    I = I_B1 (B1 + 1),  I_B1 = I_C2,  B1 I_B1 = I_C2 / B2 + V_BE2 / R,  V_BE2 = V_T ln(I_C2 / I_S + 1)
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import constants, optimize

from stagebook.engine.parts.physics import gain_factor, saturation_factor

from .circuits import Json, Setup, resistor, setup, transistor, two

KELVIN = 300.0
CELSIUS = 26.85
VT = constants.k * KELVIN / constants.e
SATURATION = 1e-14  # A at 300 K
FEED = 1000.0  # V: a resistor at it is a current source for all that a latch does


def law(gain: float) -> Json:
    """Gain and saturation current are those at 300 K: the document gives them at 25 C."""
    return {
        "saturation_current": SATURATION / float(saturation_factor(CELSIUS)),
        "forward_gain": gain / float(gain_factor(CELSIUS)),
        "reverse_gain": 1,
        "base_emitter_capacitance": "10 pF",
        "base_collector_capacitance": "10 pF",
    }


def latch(first: float, second: float, ohms: float) -> Setup:
    """Q1 pnp and Q2 npn, ``ohms`` at the base of Q2; S1 fires it at 1 ms and opens again at 2 ms."""
    return setup(
        resistor("R1", "supply", "top", "1M"),
        transistor("Q1", "gate", "mid", "top", "pnp", law=law(first)),
        transistor("Q2", "mid", "gate", "0V", law=law(second)),
        resistor("R2", "gate", "0V", ohms),
        two("contact", "S1", "fire", "gate", data={"insulation": "1000G"}),
        resistor("R3", "top", "fire", "1k"),
        supply=f"{FEED} V",
        ambient=f"{CELSIUS} C",
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "1 ms", "event": "close", "part": "S1"},
            {"at": "2 ms", "event": "open", "part": "S1"},
        ],
        ends=20e-3,
    )


def holds(circuit: Setup, currents: np.ndarray) -> np.ndarray:
    """Whether the latch still conducts long after it was fired, for each feed current in A."""
    seen = circuit.run(changes={("R1", "value"): (FEED - 0.7) / currents})
    top = seen.final[:, circuit.circuit.index("top")]
    assert np.all((top < 1.5) | (top > 50.0))
    return top < 1.5


def holding_current(first: float, second: float, ohms: float) -> float:
    """The active-mode solution."""

    def excess(collector: float) -> float:
        drop = VT * math.log(collector / SATURATION + 1.0)
        return first * collector - collector / second - drop / ohms

    return (first + 1.0) * optimize.brentq(excess, 1e-7, 1e-1, xtol=1e-16)


def test_the_worked_holding_current() -> None:
    # B 50 and 100, I_S 1e-14 A, 300 K, 1k at the second base only: 0.5485 mA.
    assert holding_current(50.0, 100.0, 1e3) == pytest.approx(0.5485e-3, abs=0.5e-7)


@pytest.mark.parametrize(("first", "second", "ohms"), [(50.0, 100.0, 1e3), (5.0, 20.0, 4.7e3), (1.5, 200.0, 22e3)])
def test_the_latch_lets_go_at_its_holding_current(first: float, second: float, ohms: float) -> None:
    exact = holding_current(first, second, ohms)
    shares = np.array([1.10, 1.02, 1.005, 1.001, 0.999, 0.995, 0.98, 0.90])
    held = holds(latch(first, second, ohms), exact * shares)
    assert held.tolist() == [True, True, True, True, False, False, False, False]


@pytest.mark.parametrize(
    ("first", "second", "held"), [(0.9, 1.3, True), (0.9, 1.0, False), (0.1, 12.0, True), (0.1, 8.0, False)]
)
def test_without_resistors_the_product_of_the_gains_decides(first: float, second: float, held: bool) -> None:
    # 1G at the base is nothing beside a milliampere.
    assert holds(latch(first, second, 1e9), np.array([1e-3])).tolist() == [held]


def test_voltage_across_the_held_latch_is_that_of_the_saturated_pair() -> None:
    # Well above the holding current both are saturated: one junction and one V_CE(sat) in series, about 0.8 V.
    circuit = latch(50.0, 100.0, 1e3)
    seen = circuit.run(changes={("R1", "value"): (FEED - 0.7) / 20e-3})
    top, mid, gate = (float(seen.final[0, circuit.circuit.index(net)]) for net in ("top", "mid", "gate"))
    assert 0.02 < mid < 0.2
    assert 0.6 < gate < 0.8
    assert 0.6 < top - mid < 0.8
