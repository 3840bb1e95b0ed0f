"""A run that goes on from the end of another, as every trial does: nothing may move that did not move before."""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.circuit.timeline import Timeline
from stagebook.engine.primitives.signals import Anchor, crossing, level, maximum, minimum, voltage
from stagebook.engine.run import run

from .circuits import Setup, capacitor, resistor, setup, sine, steps, transistor, two

LAW = {
    "saturation_current": "1e-14 A",
    "forward_gain": 100,
    "forward_transit_time": "1 us",
    "base_emitter_capacitance": "50 pF",
    "base_collector_capacitance": "20 pF",
}


@pytest.mark.parametrize("ohms", ["10k", "50R", "0R5"])
def test_a_circuit_at_rest_stays_at_rest(ohms: str) -> None:
    # Also with tens of amperes, where junctions are limited before they come to their own voltage.
    circuit = setup(
        resistor("R1", "supply", "b", ohms),
        resistor("R2", "supply", "c", ohms),
        resistor("R3", "supply", "d", ohms),
        transistor("Q1", "c", "b", "0V", law=LAW),
        two("diode", "D1", "d", "0V", law={"saturation_current": "1e-14 A", "transit_time": "1 us"}),
        capacitor("C1", "b", "0V", "1 uF"),
        supply="9 V",
        ends=2e-3,
    )
    settled = circuit.run()
    lanes = circuit.lanes()
    line = Timeline(circuit.circuit, lanes)
    line.supply_stands()
    rows = {net: (minimum(voltage(net)), maximum(voltage(net))) for net in ("b", "c", "d")}
    after = run(
        circuit.circuit, lanes, line.program(1e-3), [r for pair in rows.values() for r in pair], start=settled.final
    )
    for net, (lowest, highest) in rows.items():
        before = settled.final[0, circuit.circuit.index(net)]
        assert after.value(lowest)[0] == pytest.approx(before, rel=1e-5, abs=1e-5)
        assert after.value(highest)[0] == pytest.approx(before, rel=1e-5, abs=1e-5)


def test_two_halves_are_the_whole() -> None:
    def timer(ends: float) -> Setup:
        return setup(
            resistor("R1", "supply", "t", "1M"),
            capacitor("C1", "t", "0V", "1 uF"),
            resistor("R2", "t", "b", "470k"),
            transistor("Q1", "c", "b", "0V", law=LAW),
            resistor("R3", "supply", "c", "10k"),
            supply="9 V",
            ends=ends,
            roles={"timing_capacitor": "C1"},
        )

    falls = crossing(voltage("c"), 4.5, rising=False)
    whole = timer(2.0)
    exact = whole.run(falls, relative=1e-5)
    assert exact.seen(falls)[0]
    half = 0.5 * float(exact.value(falls)[0])
    first = timer(half).run(relative=1e-5)
    lanes = whole.lanes()
    line = Timeline(whole.circuit, lanes)
    line.supply_stands()
    second = run(whole.circuit, lanes, line.program(2.0 - half), [falls], start=first.final, relative=1e-5)
    assert half + second.value(falls)[0] == pytest.approx(exact.value(falls)[0], rel=1e-4)
    assert second.final == pytest.approx(exact.final, abs=1e-3)


def test_the_first_level_is_that_of_the_start() -> None:
    circuit = setup(
        resistor("R1", "supply", "t", "1k"),
        capacitor("C1", "t", "0V", "1 uF"),
        supply="9 V",
        starts={"t": "2 V"},
        ends=1e-2,
    )
    at_once = level(voltage("t"), Anchor(0.0))
    assert circuit.run(at_once).value(at_once) == pytest.approx(np.array([2.0]), abs=1e-12)


@pytest.mark.parametrize("share", [0.2, 0.5, 0.9])
def test_generators_go_on_where_they_stood(share: float) -> None:
    circuit = setup(
        steps("G1", "a", "0V", (0.0, 0.0), (1e-3, 5.0), (6e-3, 5.0), (9e-3, -2.0)),
        sine("G2", "b", "0V", 1.0, 130.0, 0.5),
        resistor("R1", "a", "t", "1k"),
        resistor("R2", "b", "t", "1k"),
        capacitor("C1", "t", "0V", "1 uF"),
        supply=None,
        ends=12e-3,
    )
    lanes = circuit.lanes()
    at = share * circuit.ends
    line = circuit.timeline(lanes)
    first = run(circuit.circuit, lanes, line.program(at), [], relative=1e-5)
    later = Timeline.resumed(line, np.array([at]))
    second = run(circuit.circuit, lanes, later.program(circuit.ends - at), [], start=first.final, relative=1e-5)
    assert second.final == pytest.approx(circuit.run(relative=1e-5).final, abs=1e-4)


def test_a_state_kept_at_an_event_goes_on_before_it() -> None:
    # The last step before an event ends at it: what was kept there knows nothing of the event, nor may what follows.
    circuit = setup(
        two("contact", "S1", "supply", "t"),
        resistor("R1", "t", "0V", "1k"),
        steps("G1", "a", "0V", (0.0, 1.0), (20e-3, 1.0), (20e-3, 5.0)),
        resistor("R2", "a", "0V", "1k"),
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "20 ms", "event": "close", "part": "S1"},
        ],
        ends=50e-3,
    )
    begin = level(voltage("0V"), Anchor(19e-3))
    seen = circuit.run(keep=[begin])
    state, at = seen.state(begin)
    assert at == pytest.approx(np.array([20e-3]), rel=1e-9)
    line = Timeline.resumed(circuit.timeline(circuit.lanes()), at)
    lanes = circuit.lanes()
    closed, stepped = (level(voltage(net), Anchor(5e-3)) for net in ("t", "a"))
    later = run(circuit.circuit, lanes, line.program(10e-3), [closed, stepped], start=state)
    assert later.value(closed) == pytest.approx(np.array([0.0]), abs=1e-3)
    assert later.value(stepped) == pytest.approx(np.array([5.0]), abs=1e-3)


def test_a_state_kept_after_an_event_goes_on_after_it() -> None:
    circuit = setup(
        two("contact", "S1", "supply", "t"),
        resistor("R1", "t", "0V", "1k"),
        events=[
            {"at": "0 s", "event": "connect supply", "rise": "1 us"},
            {"at": "20 ms", "event": "close", "part": "S1"},
        ],
        ends=50e-3,
    )
    rises = crossing(voltage("t"), 1.0, rising=True)
    state, at = circuit.run(keep=[rises]).state(rises)
    lanes = circuit.lanes()
    line = Timeline.resumed(circuit.timeline(lanes), at)
    later = level(voltage("t"), Anchor(5e-3))
    seen = run(circuit.circuit, lanes, line.program(10e-3), [later], start=state)
    assert seen.value(later) == pytest.approx(np.array([6.0]), abs=1e-2)
