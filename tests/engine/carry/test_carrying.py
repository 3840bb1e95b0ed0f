"""Lanes that are carried forward through an oscillation, against the same lanes stepped all the way, and against a
closed form. The tolerances are the project's own: an interval within 5e-4, a charge within 1e-3."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine import run as running
from stagebook.engine.kernel import layout
from stagebook.engine.primitives.signals import (
    Anchor,
    Row,
    crossing,
    integral,
    lagged,
    level,
    maximum,
    minimum,
    voltage,
)
from stagebook.engine.run import Observed, run

from ..circuits import Setup, capacitor, resistor, setup, sine, transistor, two

SMALL = {"class": "small npn"}


def astable(hertz: float, name: str = "", rail: str = "supply") -> list[dict[str, object]]:
    """Two transistors that take turns, about so often a second: T = 2 ln 2 R C, a textbook's rule."""
    ohms = 220e3
    farads = 1.0 / (2.0 * math.log(2.0) * ohms * hertz)
    a, b, ba, bb = (f"{net}{name}" for net in ("ca", "cb", "ba", "bb"))
    return [
        resistor(f"R1{name}", rail, a, 2.2e3),
        resistor(f"R2{name}", rail, b, 2.2e3),
        resistor(f"R3{name}", rail, ba, ohms),
        resistor(f"R4{name}", rail, bb, 1.05 * ohms),
        capacitor(f"C1{name}", a, bb, farads),
        capacitor(f"C2{name}", b, ba, farads),
        transistor(f"Q1{name}", a, ba, "0V", **SMALL),
        transistor(f"Q2{name}", b, bb, "0V", **SMALL),
    ]


def timer(seconds: float) -> list[dict[str, object]]:
    """A capacitor that charges with this time constant, and a trigger that tells when it has come half way."""
    farads = 100e-6
    return [
        resistor("R15", "supply", "t", seconds / farads),
        capacitor("C13", "t", "0V", farads),
        resistor("R16", "t", "b3", 3e6),
        transistor("Q13", "c3", "b3", "e3", **SMALL),
        resistor("R17", "supply", "c3", 100e3),
        resistor("R18", "c3", "b4", 47e3),
        resistor("R19", "b4", "0V", 150e3),
        transistor("Q14", "out", "b4", "e3", **SMALL),
        resistor("R20", "supply", "out", 22e3),
        resistor("R21", "e3", "0V", 10e3),
    ]


def beside(hertz: float, seconds: float, ends: float) -> Setup:
    return setup(*astable(hertz), *timer(seconds), supply="9 V", ends=ends, roles={"timing_capacitor": "C13"})


def plainly(circuit: Setup, rows: list[Row], monkeypatch: pytest.MonkeyPatch, count: int = 1) -> Observed:
    """The same with every step taken."""
    with monkeypatch.context() as change:
        change.setattr(running, "LINGERS", running.NEVER)
        change.setattr(running, "MOST_STEPS", 10**8)
        change.setattr(running, "MOST_SECONDS", 1e4)
        return circuit.run(*rows, count=count)


def bits(seen: Observed) -> list[bytes]:
    named = ("value", "time", "status", "ended", "ended_at", "work", "final")
    return [getattr(seen.results, name).tobytes() for name in named]


def test_a_timer_beside_a_flasher_as_if_every_step_were_taken(monkeypatch: pytest.MonkeyPatch) -> None:
    """A timer fires amid some 800 periods; all kinds of rows are as they are when nothing is left out."""
    made = beside(50.0, 10.0, 16.0)
    bench = made.circuit.benches["Q1"]
    fires = crossing(voltage("out"), 6.0, True)
    rows = {
        "fires": fires,
        "back": crossing(voltage("t"), 4.5, True, Anchor(0.0, fires)),
        "counted": crossing(voltage("ca"), 4.0, True, nth=500),
        "charge": integral(bench.currents["collector"]),
        "after": integral(bench.currents["collector"], Anchor(0.1, fires), Anchor(3.0, fires)),
        "slow": lagged(bench.power, 5.0),
        "quick": lagged(bench.power, 0.004),
        "highest": maximum(voltage("t")),
        "lowest": minimum(voltage("ba")),
        "level": level(voltage("t"), Anchor(13.7)),
    }
    seen, plain = made.run(*rows.values()), plainly(made, list(rows.values()), monkeypatch)
    assert seen.carried.periods[0] > 350
    assert seen.carried.taken_back[0] >= 1  # strides that went beyond the instant at which it fires
    assert seen.carried.hertz[0] == pytest.approx(50.0, rel=0.1)
    assert seen.results.work[0, 0] < 0.6 * plain.results.work[0, 0]
    period = 1.0 / seen.carried.hertz[0]
    allowed = dict.fromkeys(rows, 1e-3) | {"fires": 5e-4, "back": 5e-4, "highest": 3e-4, "level": 3e-4}
    for name, row in rows.items():
        error = abs(seen.value(row)[0] - plain.value(row)[0])
        assert error <= allowed[name] * abs(plain.value(row)[0]) + (0.5 * period if name == "counted" else 0.0), name
    assert np.array_equal(seen.results.status, plain.results.status)


def test_a_capacitor_beside_a_tone_by_its_closed_form() -> None:
    """v = V (1 - exp(-t / R C)) and its integral, beside 6,000 swings of a generator through a divider."""
    made = setup(
        sine("G1", "in", "0V", 2.0, 10.0),
        resistor("R2", "in", "mid", 1e3),
        resistor("R3", "mid", "0V", 1e3),
        resistor("R1", "supply", "t", "1M"),
        capacitor("C1", "t", "0V", "100 uF"),
        supply="10 V",
        ends=600.0,
        roles={"timing_capacitor": "C1"},
    )
    tau = 100.0
    half, late = crossing(voltage("t"), 5.0, True), crossing(voltage("t"), 9.9, True)
    area, swings = integral(voltage("t")), crossing(voltage("mid"), 0.5, True, nth=5000)
    power = integral(made.circuit.benches["R3"].power)
    seen = made.run(half, late, area, swings, power)
    assert seen.value(half)[0] == pytest.approx(tau * math.log(2.0), rel=5e-4)
    assert seen.value(late)[0] == pytest.approx(tau * math.log(100.0), rel=5e-4)
    assert seen.value(area)[0] == pytest.approx(10.0 * (600.0 - tau * (1.0 - math.exp(-6.0))), rel=1e-3)
    assert seen.value(power)[0] == pytest.approx(600.0 * 0.5 * 1.0**2 / 1e3, rel=1e-3)
    assert seen.value(swings)[0] == pytest.approx(499.9 + 0.1 / 12.0, abs=1e-3)
    assert seen.results.work[0, 0] < 40_000


def test_two_oscillations_without_a_common_period_are_stepped_all_the_way(monkeypatch: pytest.MonkeyPatch) -> None:
    """Nothing is left out, to the bit."""
    made = setup(*astable(40.0), *astable(40.0 / math.sqrt(3.0), "x"), supply="9 V", ends=0.8)
    monkeypatch.setattr("stagebook.engine.carry.follower.ENOUGH", 2000)
    rows = [integral(voltage("ca")), crossing(voltage("cax"), 4.0, True, nth=7)]
    monkeypatch.setattr(running, "LINGERS", 300)
    seen = made.run(*rows)
    assert seen.carried.strides[0] == 0
    assert seen.results.work[0, 0] > 4000
    assert bits(seen) == bits(plainly(made, rows, monkeypatch))


def test_a_carried_lane_is_the_same_in_company() -> None:
    """Lanes of other periods beside it, on any number of threads: the same bits."""
    made = beside(200.0, 0.5, 0.8)
    values = {("C1", "value"): made.lanes()["C1", "value"][0] * np.linspace(0.6, 1.5, 9)}
    rows = [crossing(voltage("out"), 6.0, True), integral(voltage("ca")), lagged(voltage("ca"), 0.5)]
    lanes = made.lanes(values)
    together = run(made.circuit, lanes, made.program(lanes), rows, threads=2)
    assert np.all(together.carried.strides > 0)
    for lane in (0, 8):
        one = lanes.take([lane])
        alone = run(made.circuit, one, made.program(one), rows)
        for name in ("value", "time", "status", "ended", "work", "final"):
            assert getattr(alone.results, name)[0].tobytes() == getattr(together.results, name)[lane].tobytes(), name


def test_a_lane_that_stops_where_it_fires_stops_there(monkeypatch: pytest.MonkeyPatch) -> None:
    """A stride that lands beyond the instant is taken back: the lane stops when the trigger is seen, not later."""
    made = beside(50.0, 10.0, 16.0)
    fires = crossing(voltage("out"), 6.0, True)
    seen = made.run(fires, stop=fires, keep=[fires])
    plain = plainly(made, [fires], monkeypatch)
    assert seen.results.ended[0, 0] == layout.STOPPED
    assert seen.value(fires)[0] == pytest.approx(plain.value(fires)[0], rel=5e-4)
    assert seen.results.ended_at[0] == pytest.approx(seen.value(fires)[0], abs=0.01)
    assert seen.carried.periods[0] > 100


def test_a_traced_lane_is_carried_as_one_that_is_not() -> None:
    """Tracing changes no bit; what was taken back is not among the steps that are kept."""
    made = beside(50.0, 2.0, 4.0)
    rows = [crossing(voltage("out"), 6.0, True), integral(voltage("ca"))]
    plain, traced = made.run(*rows), made.run(*rows, trace=100_000, carry=True)
    assert plain.carried.taken_back[0] > 0
    assert bits(traced) == bits(plain)
    time = traced.results.trace_time[0]
    assert np.all(np.diff(time) >= 0.0)
    assert time.size == traced.results.trace_used[0] < plain.results.work[0, 0]
    assert sum(end - begin for begin, end in traced.carried.gaps) == pytest.approx(plain.carried.seconds[0])
    assert traced.results.trace_value[0, -1].tobytes() == plain.final[0].tobytes()


def test_what_rings_is_not_carried(monkeypatch: pytest.MonkeyPatch) -> None:
    """A coil and a capacitor that ring at 50 kHz for some 200 periods: taken ahead they would ring for ever."""
    made = setup(
        two("inductor", "L1", "supply", "a", inductance="1 mH", resistance="1 ohm"),
        capacitor("C1", "a", "0V", "10 nF"),
        supply="10 V",
        ends=1.0,
        events=[{"at": "0 s", "event": "connect supply", "rise": "1 us"}],
    )
    monkeypatch.setattr(running, "LINGERS", 300)
    seen = made.run(integral(voltage("a")))
    assert seen.results.work[0, 0] > 5000
    assert seen.carried.strides[0] == 0
    assert bits(seen) == bits(plainly(made, [integral(voltage("a"))], monkeypatch))
