"""Two small switching circuits written down by hand and solved by SciPy's Radau at a tight tolerance.

Nothing of the engine is in the hand-written side: Kirchhoff's law as M(v) v' = -I(t, v) with the junction laws of the
textbooks (Shockley 1949; Ebers, Moll 1954; depletion charge with a linear capacitance beyond half the built-in
potential). Timed intervals agree to 8e-4 at the engine's own tolerance, better at tighter ones.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from itertools import pairwise

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from stagebook.engine.primitives.signals import Anchor, Row, crossing, level, voltage

from .circuits import Setup, capacitor, resistor, setup, steps, transistor, two

VT = 0.025692579121493725  # kT/q at 25 C
Rates = Callable[[float, np.ndarray], np.ndarray]
# Share by which timed intervals may differ at a relative tolerance of the engine; 1e-3 is its own.
ACCURACY = [(1e-3, 8e-4), (1e-4, 2e-4), (1e-5, 5e-5)]


def crossings(
    rates: Rates, start: Sequence[float], corners: Sequence[float], watched: Sequence[tuple[int, float, int]]
) -> list[list[float]]:
    """Times at which an unknown (index) passes a level upwards (+1) or downwards (-1); corners restart the method."""
    found: list[list[float]] = [[] for _ in watched]
    state = np.array(start, dtype=float)
    events = []
    for index, at, direction in watched:
        event = lambda t, v, index=index, at=at: v[index] - at  # noqa: E731
        event.direction = direction
        events.append(event)
    for begin, end in pairwise(corners):
        solved = solve_ivp(rates, (begin, end), state, "Radau", events=events, rtol=1e-9, atol=1e-11, first_step=1e-11)
        assert solved.success
        for times, more in zip(found, solved.t_events, strict=True):
            times.extend(float(t) for t in more)
        state = solved.y[:, -1]
    return found


def piecewise(points: Sequence[tuple[float, float]]) -> Callable[[float], float]:
    times, values = (np.array(column) for column in zip(*points, strict=True))
    return lambda t: float(np.interp(t, times, values))


def depletion(v: float, c0: float, grading: float, potential: float = 0.75) -> float:
    """Capacitance of a depletion layer."""
    half = 0.5 * potential
    if v <= half:
        return float(c0 * (1.0 - v / potential) ** -grading)
    return float(c0 * 2.0**grading * (1.0 + grading * (v - half) / half))


DIODE_SATURATION, DIODE_IDEALITY, DIODE_FARADS, DIODE_TRANSIT = 2e-9, 1.8, 4e-12, 6e-9
PULSE = [(0.0, 0.0), (1e-6, 5.0), (3e-3, 5.0), (3.001e-3, 0.0), (20e-3, 0.0)]


def test_a_diode_charges_a_capacitor_and_lets_it_discharge() -> None:
    source = piecewise(PULSE)
    slope = DIODE_IDEALITY * VT

    def rates(t: float, v: np.ndarray) -> np.ndarray:
        a, b = v
        across = a - b
        boosted = DIODE_SATURATION * math.exp(across / slope)
        current = boosted - DIODE_SATURATION
        farads = depletion(across, DIODE_FARADS, 0.5) + DIODE_TRANSIT * boosted / slope
        matrix = np.array([[farads + 20e-12, -farads], [-farads, farads + 1e-6]])
        return np.linalg.solve(matrix, [(source(t) - a) / 1e3 - current, current - b / 4.7e3])

    watched = [(1, 2.0, 1), (1, 3.0, 1), (1, 2.0, -1), (1, 1.0, -1)]
    exact = crossings(rates, (0.0, 0.0), [t for t, _ in PULSE], watched)
    circuit = setup(
        steps("G1", "in", "0V", *PULSE),
        resistor("R1", "in", "a", "1k"),
        capacitor("C2", "a", "0V", "20 pF"),
        two(
            "diode",
            "D1",
            "a",
            "b",
            law={
                "saturation_current": DIODE_SATURATION,
                "ideality": DIODE_IDEALITY,
                "capacitance": DIODE_FARADS,
                "transit_time": DIODE_TRANSIT,
            },
        ),
        capacitor("C1", "b", "0V", "1 uF"),
        resistor("R2", "b", "0V", "4k7"),
        supply=None,
        ends=20e-3,
        roles={"timing_capacitor": "C1"},
    )
    rows = [crossing(voltage("b"), at, rising=way > 0) for _, at, way in watched]
    assert [len(times) for times in exact] == [1, 1, 1, 1]
    for relative, share in ACCURACY:
        seen = circuit.run(*rows, relative=relative)
        for row, (time,), edge in zip(rows, exact, (1e-6, 1e-6, 3.001e-3, 3.001e-3), strict=True):
            assert seen.value(row)[0] - edge == pytest.approx(time - edge, rel=share)


SATURATION, FORWARD, REVERSE = 2e-14, 150.0, 4.0
TAU_FORWARD, TAU_REVERSE, C_EMITTER, C_COLLECTOR = 1e-9, 60e-9, 12e-12, 6e-12
DRIVE = [(0.0, 0.0), (1e-6, 0.0), (1.1e-6, 5.0), (200e-6, 5.0), (200.1e-6, 0.0), (500e-6, 0.0)]


def switch_rates(t: float, v: np.ndarray) -> np.ndarray:
    """Input filter (net t), base and collector of a transistor switch with stored charge."""
    filtered, base, collector = v
    reversed_ = base - collector
    ef, er = math.exp(base / VT), math.exp(reversed_ / VT)
    forward, backward = SATURATION * (ef - 1.0), SATURATION * (er - 1.0)
    into_collector = forward - backward - backward / REVERSE
    into_base = forward / FORWARD + backward / REVERSE
    be = depletion(base, C_EMITTER, 0.5) + TAU_FORWARD * SATURATION * ef / VT
    bc = depletion(reversed_, C_COLLECTOR, 0.5) + TAU_REVERSE * SATURATION * er / VT
    matrix = np.array([[4.7e-9, 0.0, 0.0], [0.0, be + bc, -bc], [0.0, -bc, bc + 220e-12]])
    return np.linalg.solve(
        matrix,
        [
            (piecewise(DRIVE)(t) - filtered) / 2.2e3 - (filtered - base) / 10e3,
            (filtered - base) / 10e3 - base / 47e3 - into_base,
            (9.0 - collector) / 2.2e3 - into_collector,
        ],
    )


@pytest.fixture(scope="module")
def transistor_switch() -> Setup:
    law = {
        "saturation_current": SATURATION,
        "forward_gain": FORWARD,
        "reverse_gain": REVERSE,
        "base_emitter_capacitance": C_EMITTER,
        "base_collector_capacitance": C_COLLECTOR,
        "forward_transit_time": TAU_FORWARD,
        "reverse_transit_time": TAU_REVERSE,
    }
    return setup(
        steps("G1", "in", "0V", *DRIVE),
        resistor("R1", "in", "t", "2k2"),
        capacitor("C1", "t", "0V", "4n7"),
        resistor("R2", "t", "b", "10k"),
        resistor("R3", "b", "0V", "47k"),
        transistor("Q1", "c", "b", "0V", law=law),
        resistor("R4", "supply", "c", "2k2"),
        capacitor("C2", "c", "0V", "220 pF"),
        supply="9 V",
        starts={"c": "9 V"},
        ends=500e-6,
        roles={"timing_capacitor": "C1"},
    )


def test_a_transistor_switch_with_stored_charge(transistor_switch: Setup) -> None:
    watched = [(2, 4.5, -1), (2, 0.5, -1), (2, 0.5, 1), (2, 4.5, 1), (2, 8.0, 1), (1, 0.4, 1)]
    exact = crossings(switch_rates, (0.0, 0.0, 9.0), [t for t, _ in DRIVE], watched)
    assert [len(times) for times in exact] == [1] * len(watched)
    nets = ("t", "b", "c")
    rows: list[Row] = [crossing(voltage(nets[k]), at, rising=way > 0) for k, at, way in watched]
    for relative, share in ACCURACY:
        seen = transistor_switch.run(*rows, relative=relative)
        for row, (time,) in zip(rows, exact, strict=True):
            edge = 1.1e-6 if time < 200e-6 else 200.1e-6
            assert seen.value(row)[0] - edge == pytest.approx(time - edge, rel=share)


def test_voltages_on_the_way_converge_to_those_of_the_other_method(transistor_switch: Setup) -> None:
    times = np.array([5e-6, 8e-6, 20e-6, 100e-6, 210e-6, 216e-6, 230e-6])
    state, at, exact = np.array([0.0, 0.0, 9.0]), 0.0, []
    for time in sorted({*times, *(t for t, _ in DRIVE[1:-1])}):
        state = solve_ivp(switch_rates, (at, time), state, "Radau", rtol=1e-9, atol=1e-11, first_step=1e-11).y[:, -1]
        at = time
        if time in times:
            exact.append(state)
    rows = [[level(voltage(net), Anchor(float(t))) for net in ("t", "b", "c")] for t in times]
    # At 216 us the collector rises by some volts a microsecond: the largest errors are those of time.
    for relative, largest in ((1e-3, 1.5e-2), (1e-4, 3e-3), (1e-5, 6e-4), (1e-6, 1.3e-4)):
        seen = transistor_switch.run(*[row for three in rows for row in three], relative=relative)
        found = np.array([[seen.value(row)[0] for row in three] for three in rows])
        assert np.max(np.abs(found - np.array(exact))) < largest
