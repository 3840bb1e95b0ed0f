"""Field-effect transistors against the square law worked out by hand, SciPy's Radau, and their own figures.

Square law: Shichman, Hodges, IEEE J. Solid-State Circuits SC-3 (1968) 285.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants, optimize
from scipy.integrate import solve_ivp

from stagebook.engine.errors import CircuitError
from stagebook.engine.kernel.linearised import linearised
from stagebook.engine.parts.mosfet import channel_of
from stagebook.engine.primitives.signals import Anchor, Row, crossing, integral, level, voltage

from .circuits import Json, Setup, capacitor, mosfet, resistor, setup, steps

LAW: Json = {"threshold": "2 V", "transconductance": "0.2 A/V2"}
EARLY: Json = {**LAW, "early_voltage": "40 V"}
AT_END = Anchor(1e-3)


def square_law(vgs: float, vds: float, early: float = math.inf, threshold: float = 2.0, k: float = 0.2) -> float:
    """The three regions as published, for v_DS of zero or more."""
    over = vgs - threshold
    if over <= 0.0:
        return 0.0
    inner = over * vds - 0.5 * vds * vds if vds < over else 0.5 * over * over
    return k * inner * (1.0 + vds / early)


def fed(gate: float, drain: float, law: Json, kind: str = "mosfet_n", **fields: object) -> Setup:
    """Gate and drain driven through 1 ohm each, the source on the return."""
    return setup(
        steps("G1", "g1", "0V", (0.0, 0.0), (1e-6, gate), (1.0, gate)),
        steps("G2", "d1", "0V", (0.0, 0.0), (1e-6, drain), (1.0, drain)),
        resistor("R1", "g1", "g", "1R"),
        resistor("R3", "g", "0V", "1M"),
        resistor("R2", "d1", "d", "1R"),
        mosfet("Q1", "d", "g", "0V", kind, law=law, **fields),
        supply=None,
        ends=1e-3,
    )


def drain_current(circuit: Setup) -> tuple[float, float]:
    """Drain current at the end, and the power there."""
    bench = circuit.circuit.benches["Q1"]
    assert bench.power is not None
    rows = level(bench.currents["drain"], AT_END), level(bench.power, AT_END)
    seen = circuit.run(*rows, relative=1e-6)
    return float(seen.value(rows[0])[0]), float(seen.value(rows[1])[0])


@pytest.mark.parametrize("law", [LAW, EARLY])
@pytest.mark.parametrize(("gate", "drain"), [(1.9, 5.0), (2.5, 5.0), (4.0, 0.3), (4.0, 5.0), (10.0, 0.2), (10.0, 3.0)])
def test_the_current_is_the_published_one_in_every_region(law: Json, gate: float, drain: float) -> None:
    early = 40.0 if "early_voltage" in law else math.inf
    gate *= 1e6 / (1e6 + 1.0)
    exact = optimize.brentq(lambda i: i - square_law(gate, drain - i, early), 0.0, drain, xtol=1e-13)
    current, power = drain_current(fed(gate * (1.0 + 1e-6), drain, law))
    assert current == pytest.approx(exact, rel=1e-5, abs=1e-9)
    assert power == pytest.approx(exact * (drain - exact), rel=1e-4, abs=1e-8)


@pytest.mark.parametrize(("gate", "drain"), [(4.0, 0.3), (4.0, 5.0), (10.0, 0.2)])
def test_a_p_channel_is_the_mirror_image_of_an_n_channel(gate: float, drain: float) -> None:
    there = drain_current(fed(gate, drain, EARLY))
    assert drain_current(fed(-gate, -drain, EARLY, "mosfet_p")) == pytest.approx((-there[0], there[1]), rel=1e-9)


def test_drain_and_source_are_alike() -> None:
    # The same channel with the drain below the source: gate against drain is what counts, the current turns round.
    forward, _ = drain_current(fed(4.0, 0.8, EARLY))
    back = setup(
        steps("G1", "g", "0V", (0.0, 0.0), (1e-6, 4.0), (1.0, 4.0)),
        steps("G2", "d1", "0V", (0.0, 0.0), (1e-6, 0.8), (1.0, 0.8)),
        resistor("R3", "g", "0V", "1M"),
        resistor("R2", "d1", "d", "1R"),
        mosfet("Q1", "0V", "g", "d", law=EARLY),
        supply=None,
        ends=1e-3,
    )
    # The first has its gate behind 1 ohm and 1M.
    assert -drain_current(back)[0] == pytest.approx(forward, rel=1e-5)


@given(st.lists(st.floats(-6.0, 6.0), min_size=3, max_size=3), st.sampled_from(["mosfet_n", "mosfet_p"]))
@settings(max_examples=60, deadline=None)
def test_conductances_are_the_derivatives_of_currents(volts: list[float], kind: str) -> None:
    made = BRIDGED[kind].circuit
    parameters = made.table(made.nominal())
    free = int(made.topology.size[1])
    x = np.zeros(int(made.topology.size[2]))
    x[:free] = volts
    here = linearised(made.topology, parameters, 0, x[None, :])
    assert abs(np.sum(here.current[0])) <= 1e-14 * np.sum(np.abs(here.current[0])) + 1e-30
    step = 1e-5
    for column in range(free):
        moved = np.repeat(x[None, :], 2, axis=0)
        moved[:, column] += [step, -step]
        sides = linearised(made.topology, np.repeat(parameters, 2, axis=0), 0, moved).current[:, :free]
        numeric = (sides[0] - sides[1]) / (2 * step)
        # Between regions the second derivative jumps by K: half a step of it may be missing.
        assert numeric == pytest.approx(here.conductance[0, :, column], abs=0.4 * step * 2 + 1e-9)


BRIDGED = {
    kind: setup(
        *(resistor(f"R{n}", net, "0V", "1k") for n, net in enumerate("dgs")),
        steps("G1", "in", "0V", (0.0, 0.0), (1.0, 0.0)),
        resistor("R9", "in", "0V", "1k"),
        mosfet("Q1", "d", "g", "s", kind, law=EARLY),
        supply=None,
        ends=1e-3,
    )
    for kind in ("mosfet_n", "mosfet_p")
}

GATE = [(0.0, 0.0), (1e-6, 0.0), (1.1e-6, 10.0), (60e-6, 10.0), (60.1e-6, 0.0), (150e-6, 0.0)]
FARADS = {"gate_source": 400e-12, "gate_drain": 100e-12, "drain_source": 150e-12}


def switch_rates(t: float, v: np.ndarray) -> np.ndarray:
    """Gate and drain of a switch with an inductor-free load: capacitances as a matrix, the published law as it is."""
    gate, drain = v
    times, values = np.array(GATE).T
    gs, gd, ds = FARADS.values()
    matrix = np.array([[gs + gd, -gd], [-gd, gd + ds]])
    carried = square_law(gate, drain, 40.0) if drain >= 0.0 else -square_law(gate - drain, -drain, 40.0)
    return np.linalg.solve(matrix, [(np.interp(t, times, values) - gate) / 10e3, (12.0 - drain) / 470.0 - carried])


@pytest.mark.parametrize(("relative", "share"), [(1e-3, 4e-3), (1e-4, 1e-3), (1e-5, 2e-4), (1e-6, 5e-5)])
def test_a_switch_with_its_charges_against_another_method(relative: float, share: float) -> None:
    watched = [(1, 6.0, -1), (0, 8.0, 1), (1, 6.0, 1), (1, 11.0, 1)]
    exact: list[list[float]] = [[] for _ in watched]
    events = []
    for index, at, direction in watched:
        event = lambda t, v, index=index, at=at: v[index] - at  # noqa: E731
        event.direction = direction
        events.append(event)
    state = np.array([0.0, 12.0])
    for begin, end in pairwise(t for t, _ in GATE):
        solved = solve_ivp(
            switch_rates, (begin, end), state, "Radau", events=events, rtol=1e-9, atol=1e-11, first_step=1e-11
        )
        for times, more in zip(exact, solved.t_events, strict=True):
            times.extend(more)
        state = solved.y[:, -1]
    assert [len(times) for times in exact] == [1, 1, 1, 1]
    law = EARLY | {f"{between}_capacitance": repr(farad) + " F" for between, farad in FARADS.items()}
    circuit = setup(
        steps("G1", "in", "0V", *GATE),
        resistor("R1", "in", "g", "10k"),
        resistor("R2", "supply", "d", "470R"),
        mosfet("Q1", "d", "g", "0V", law=law),
        supply="12 V",
        starts={"d": "12 V"},
        ends=150e-6,
    )
    rows = [crossing(voltage("dg"[1 - index]), at, rising=way > 0) for index, at, way in watched]
    seen = circuit.run(*rows, relative=relative)
    for row, (time,), edge in zip(rows, exact, (1e-6, 1e-6, 60e-6, 60e-6), strict=True):
        assert seen.value(row)[0] - edge == pytest.approx(time - edge, rel=share)


def test_what_a_current_leaves_in_a_capacitor_is_the_integral_of_it() -> None:
    # A gate ramp through the threshold: the charge that flowed off the capacitor is C dv.
    circuit = setup(
        steps("G1", "g", "0V", (0.0, 0.0), (1e-3, 4.0), (2e-3, 4.0)),
        resistor("R1", "g", "0V", "1k"),
        resistor("R2", "d", "0V", "10G"),
        capacitor("C1", "d", "0V", "200 nF"),
        mosfet("Q1", "d", "g", "0V", law=EARLY),
        supply=None,
        starts={"d": "10 V"},
        ends=0.6e-3,
    )
    row = integral(circuit.circuit.benches["Q1"].currents["drain"])
    seen = circuit.run(row, relative=1e-6)
    left = seen.final[0, circuit.circuit.index("d")]
    assert 200e-9 * (10.0 - left) == pytest.approx(seen.value(row)[0], rel=1e-4)
    # K/2 (1 + v/V_A) integral of (4000 t - 2)^2 from 0.5 ms: a linear equation of first order in ln(1 + v/V_A).
    over = 4.0 * 0.6 - 2.0
    fallen = 0.5 * 0.2 * over**3 / 3 / 4000.0 / 200e-9
    assert left == pytest.approx((40.0 + 10.0) * math.exp(-fallen / 40.0) - 40.0, abs=1e-3)


def test_the_body_diode_carries_what_flows_backwards() -> None:
    law = {**LAW, "body_saturation_current": "1e-12 A"}
    current, _ = drain_current(fed(0.0, -5.0, law))
    slope = constants.k * 298.15 / constants.e
    exact = optimize.brentq(lambda i: 5.0 - i - slope * math.log1p(i / 1e-12), 0.1, 5.0, xtol=1e-12)
    assert current == pytest.approx(-exact, rel=1e-5)


def of_class(gate: float, drain_ohms: float, supply: float, ambient: str = "25 C", joined: bool = False) -> Setup:
    fields = {"class": "small n-channel"}
    return setup(
        steps("G1", "g", "0V", (0.0, 0.0), (1e-6, gate), (1.0, gate)),
        resistor("R1", "g", "0V", "1M"),
        resistor("R2", "supply", "d", drain_ohms),
        mosfet("Q1", "d", "d" if joined else "g", "0V", **fields),
        supply=f"{supply} V",
        ambient=ambient,
        ends=1e-3,
    )


def test_a_class_gives_back_the_figures_it_is_made_of() -> None:
    # Class figures (from memory): 1.2 ohm at 10 V, threshold 0.8 / 1.6 / 2.5 V at 250 uA, gate joined to drain.
    on = of_class(10.0, 10e3, 100.0)
    assert on.final("d", relative=1e-6) / 10e-3 == pytest.approx(1.2, rel=2e-3)
    low = {("Q1", "threshold"): np.array([0.8, 1.6, 2.5]), ("Q1", "resistance_on"): np.array([0.8, 1.2, 2.0])}
    joined = of_class(0.0, (100.0 - 1.6) / 250e-6, 100.0, joined=True)
    seen = joined.run(changes=low, relative=1e-6)
    assert seen.final[:, joined.circuit.index("d")] == pytest.approx([0.8, 1.6, 2.5], abs=2e-3)
    assert on.run(changes=low, relative=1e-6).final[:, on.circuit.index("d")] == pytest.approx(
        np.array([0.8, 1.2, 2.0]) * 10e-3, rel=2e-3
    )


def test_temperature_lowers_the_threshold_and_raises_the_resistance() -> None:
    # -2 mV/K and T^-1.5 (Vadasz, Grove 1966; coefficients from memory): R(125 C)/R(25 C) = (398.15/298.15)^1.5
    # times (10 - V_T)/(10 - V_T + 0.2 V).
    level_25, _ = channel_of(np.array([1.6]), np.array([1.2]), 10.0)
    hot, cool = (of_class(10.0, 10e3, 100.0, ambient).final("d", relative=1e-6) for ambient in ("125 C", "25 C"))
    over = 10.0 - float(level_25[0])
    assert hot / cool == pytest.approx((398.15 / 298.15) ** 1.5 * over / (over + 0.2), rel=2e-3)


def test_capacitances_take_the_charge_of_the_datasheet() -> None:
    # A constant gate current of 1 mA, drain held by a resistor to the supply: Q_G 20 nC at 10 V and a drain that falls
    # by 48 V, of which the drain takes 8 nC (class figures, from memory).
    circuit = setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-9, -10e3), (1.0, -10e3)),
        resistor("R1", "in", "g", "10M"),
        resistor("R3", "g", "0V", "1G"),
        resistor("R2", "d", "0V", "48R"),
        mosfet("Q1", "d", "g", "s", "mosfet_p", **{"class": "p-channel switch"}),
        resistor("R4", "supply", "s", "1m"),
        supply="48 V",
        starts={"g": "48 V", "s": "48 V"},
        ends=40e-6,
    )
    row: Row = crossing(voltage("g"), 38.0, rising=False)
    seen = circuit.run(row, relative=1e-5)
    assert seen.value(row)[0] * 1e-3 == pytest.approx(20e-9, rel=0.01)


def test_a_gate_voltage_too_low_for_the_resistance_is_refused() -> None:
    data = {"threshold": {"min": "2 V", "typical": "3 V", "max": "4 V"}, "resistance_on": "0.1 ohm"}
    refused = setup(
        resistor("R1", "supply", "d", "1k"),
        resistor("R2", "supply", "g", "1k"),
        mosfet("Q1", "d", "g", "0V", data={**data, "resistance_on_gate": "3.5 V"}),
        ends=1e-3,
    )
    with pytest.raises(CircuitError, match=r"Q1, resistance_on: 3.5 V at the gate.*resistance_on_gate"):
        refused.circuit  # noqa: B018
