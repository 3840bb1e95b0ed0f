"""Events of a sequence land where and when they should; nets that 0R joins; generators between nets."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.circuit.timeline import Timeline
from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import Anchor, crossing, integral, level, maximum, minimum, voltage
from stagebook.engine.run import run

from .circuits import Json, Setup, capacitor, resistor, setup, sine, steps, two


def event(at: float, what: str, **fields: object) -> Json:
    return {"at": f"{at!r} s", "event": what, **fields}


def volts_at(circuit: Setup, net: str, *times: float) -> list[float]:
    rows = [level(voltage(net), Anchor(t)) for t in times]
    seen = circuit.run(*rows)
    return [float(seen.value(row)[0]) for row in rows]


def pulled_up(*events: Json, ends: float, form: str = "make", **fields: object) -> Setup:
    """A contact that pulls a net to 0V against 10k; open it is as good as none."""
    contact = two("contact", "S1", "n", "0V", form=form, data={"insulation": "1000G", "resistance": "0.1 ohm"})
    return setup(
        resistor("R1", "supply", "n", "10k"),
        contact,
        supply="6 V",
        events=[event(0.0, "connect supply", rise="1 us"), *events],
        ends=ends,
        **fields,
    )


def test_a_contact_is_open_at_first_a_break_contact_closed() -> None:
    assert volts_at(pulled_up(ends=1e-3), "n", 1e-3) == pytest.approx([6.0], abs=1e-6)
    assert volts_at(pulled_up(ends=1e-3, form="break"), "n", 1e-3) == pytest.approx([6.0 * 0.1 / 10000.1], abs=1e-6)


def test_a_contact_closes_and_opens_when_the_sequence_says() -> None:
    circuit = pulled_up(event(1.0, "close", part="S1"), event(3.0, "open", part="S1"), ends=5.0)
    falls, rises = crossing(voltage("n"), 3.0, False), crossing(voltage("n"), 3.0, True, start=Anchor(0.5))
    seen = circuit.run(falls, rises)
    # A jump is taken in by one step of 1e-12 s.
    assert seen.value(falls)[0] == pytest.approx(1.0, abs=2e-12)
    assert seen.value(rises)[0] == pytest.approx(3.0, abs=2e-12)


def test_events_are_taken_in_the_order_of_their_times() -> None:
    circuit = pulled_up(event(3.0, "open", part="S1"), event(1.0, "close", part="S1"), ends=5.0)
    assert volts_at(circuit, "n", 0.5, 2.0, 4.0) == pytest.approx([6.0, 0.0, 6.0], abs=1e-4)


@pytest.mark.parametrize("times", [1, 3, 4])
def test_a_bouncing_contact_opens_as_often_as_it_says(times: int) -> None:
    bounce = {"for": "2 ms", "times": times}
    circuit = pulled_up(event(1.0, "close", part="S1", bounce=bounce), ends=1.01)
    rows = [crossing(voltage("n"), 3.0, True, start=Anchor(0.9), nth=n) for n in range(1, times + 2)]
    settled = crossing(voltage("n"), 3.0, False, start=Anchor(0.9), nth=times + 1)
    open_time = integral(voltage("n"), Anchor(1.0))
    seen = circuit.run(*rows, settled, open_time)
    assert [bool(seen.seen(row)[0]) for row in rows] == [True] * times + [False]
    # Even interruptions: each begins in the middle of its share of the time, the last ends with it.
    for n, row in enumerate(rows[:times]):
        assert seen.value(row)[0] == pytest.approx(1.0 + 2e-3 * (n + 0.5) / times, abs=1e-11)
    assert seen.value(settled)[0] == pytest.approx(1.002, abs=1e-11)
    assert seen.value(open_time)[0] == pytest.approx(6.0 * 1e-3, rel=1e-3)


def test_a_bouncing_contact_that_opens_closes_again_in_between() -> None:
    bounce = {"for": "2 ms", "times": 2}
    circuit = pulled_up(event(1.0, "open", part="S1", bounce=bounce), ends=1.01, form="break")
    closed_time = integral(voltage("n"), Anchor(1.0), Anchor(1.002))
    settled = crossing(voltage("n"), 3.0, True, start=Anchor(0.9), nth=3)
    seen = circuit.run(closed_time, settled)
    assert seen.value(closed_time)[0] == pytest.approx(6.0 * 1e-3, rel=1e-3)
    assert seen.value(settled)[0] == pytest.approx(1.002, abs=1e-11)


def probed(*events: Json, ends: float) -> Setup:
    return setup(
        resistor("R1", "supply", "n", "100k"),
        two("probe", "B1", "n", "0V", "1M"),
        supply="6 V",
        events=[event(0.0, "connect supply", rise="1 us"), *events],
        ends=ends,
    )


def test_a_probe_is_set_at_once() -> None:
    circuit = probed(event(1.0, "set", part="B1", to="50k"), event(2.0, "set", part="B1", to="200k"), ends=3.0)
    exact = [6.0 * r / (100e3 + r) for r in (1e6, 50e3, 200e3)]
    assert volts_at(circuit, "n", 0.5, 1.5, 2.5) == pytest.approx(exact, rel=1e-6)


def test_a_probe_ramps_evenly_in_ohms() -> None:
    # Straight pieces of conductance between sixteen points that lie on the ramp: within 1 % of R between a tenth.
    circuit = probed(event(1.0, "ramp", part="B1", to="100k", **{"for": "10 s"}), ends=12.0)
    times = np.array([1.0, 3.5, 6.0, 8.5, 11.0, 11.5])
    ohms = np.interp(times, [1.0, 11.0], [1e6, 100e3])
    assert volts_at(circuit, "n", *times) == pytest.approx(6.0 * ohms / (100e3 + ohms), rel=2e-3)


def test_a_ramp_starts_from_what_was_set_before() -> None:
    circuit = probed(
        event(1.0, "set", part="B1", to="400k"), event(2.0, "ramp", part="B1", to="200k", **{"for": "4 s"}), ends=7.0
    )
    exact = [6.0 * r / (100e3 + r) for r in (400e3, 300e3, 200e3)]
    assert volts_at(circuit, "n", 1.5, 4.0, 6.5) == pytest.approx(exact, rel=2e-3)


@pytest.mark.parametrize(("to", "words"), [("0 ohm", "probe of 0 ohm"), ("50 V", "ohm")])
def test_a_probe_that_cannot_be_is_refused(to: str, words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        probed(event(1.0, "set", part="B1", to=to), ends=2.0).run()


def test_a_supply_is_taken_away_and_comes_back() -> None:
    circuit = setup(
        resistor("R1", "supply", "0V", "1k"),
        capacitor("C1", "supply", "0V", "100 uF"),
        supply="6 V",
        source="1R",
        events=[
            event(0.0, "connect supply", rise="1 us"),
            event(0.1, "disconnect supply"),
            event(0.2, "connect supply", rise="1 us"),
        ],
        ends=0.3,
    )
    held = 6.0 * 1000 / 1001
    decayed = held * math.exp(-0.05 / 0.1)
    lowest = held * math.exp(-1.0)
    assert volts_at(circuit, "supply", 0.05, 0.099) == pytest.approx([held] * 2, rel=1e-4)
    assert volts_at(circuit, "supply", 0.15) == pytest.approx([decayed], rel=1e-3)
    dip = minimum(voltage("supply"), Anchor(0.05))
    seen = circuit.run(dip)
    assert seen.value(dip)[0] == pytest.approx(lowest, rel=5e-3)  # no timing capacitor, computed to 1e-3 a step
    assert seen.time(dip)[0] == pytest.approx(0.2, abs=1e-5)
    tau = 100e-6 * 1000 / 1001
    back = held + (lowest - held) * math.exp(-2e-4 / tau)
    assert volts_at(circuit, "supply", 0.2 + 2e-4) == pytest.approx([back], rel=1e-3)


def test_an_ideal_supply_cannot_be_taken_away() -> None:
    circuit = setup(
        resistor("R1", "supply", "0V", "1k"),
        supply="6 V",
        events=[event(0.0, "connect supply"), event(0.1, "disconnect supply")],
        ends=0.3,
    )
    with pytest.raises(CircuitError, match="source_resistance"):
        circuit.run()


@pytest.mark.parametrize("rise", [1e-7, 1e-3, 0.5])
def test_the_supply_rises_evenly(rise: float) -> None:
    circuit = setup(
        resistor("R1", "supply", "n", "1k"),
        resistor("R2", "n", "0V", "1k"),
        supply="6 V",
        events=[event(0.25, "connect supply", rise=f"{rise!r} s")],
        ends=1.0,
    )
    rows = [crossing(voltage("supply"), 6.0 * share, True) for share in (0.25, 0.5, 0.9)]
    seen = circuit.run(*rows)
    for row, share in zip(rows, (0.25, 0.5, 0.9), strict=True):
        assert seen.value(row)[0] == pytest.approx(0.25 + rise * share, abs=1e-4 * rise + 1e-13)


def test_without_an_event_the_supply_comes_within_100_ns() -> None:
    circuit = setup(resistor("R1", "supply", "0V", "1k"), supply="6 V", ends=1e-3)
    full = crossing(voltage("supply"), 5.999999, True)
    assert circuit.run(full).value(full)[0] == pytest.approx(100e-9, rel=1e-4)


def test_with_starts_the_supply_stands() -> None:
    circuit = setup(
        resistor("R1", "supply", "n", "1k"),
        capacitor("C1", "n", "0V", "1 uF"),
        supply="6 V",
        starts={"n": "2 V"},
        ends=5e-3,
    )
    assert volts_at(circuit, "supply", 1e-9) == pytest.approx([6.0], abs=1e-9)
    assert volts_at(circuit, "n", 1e-9, 1e-3) == pytest.approx([2.0, 6 - 4 * math.exp(-1)], rel=1e-3)


def test_each_lane_has_supply_and_source_resistance_of_its_own() -> None:
    circuit = setup(
        resistor("R1", "supply", "0V", "10R"),
        supply={"min": "4 V", "nominal": "6 V", "max": "8 V"},
        source="1R",
        events=[event(0.0, "connect supply", rise="1 us")],
        ends=1e-3,
    )
    supplies, sources = np.array([4.0, 6.0, 8.0]), np.array([0.1, 1.0, 5.0])
    changes = {("conditions", "supply"): supplies, ("conditions", "source_resistance"): sources}
    seen = circuit.run(changes=changes)
    place = circuit.circuit.index("supply")
    assert seen.final[:, place] == pytest.approx(supplies * 10 / (10 + sources), rel=1e-9)


def test_nets_joined_by_0r_are_one_net() -> None:
    circuit = setup(
        resistor("R1", "supply", "a", "1k"),
        resistor("R2", "a", "b", "0R"),
        resistor("R3", "b", "c", "0R"),
        resistor("R4", "c", "0V", "2k"),
        resistor("R5", "d", "0V", "0R"),
        resistor("R6", "supply", "d", "1k"),
        supply="6 V",
        ends=1e-3,
    )
    assert circuit.circuit.index("a") == circuit.circuit.index("b") == circuit.circuit.index("c")
    assert circuit.circuit.index("d") == circuit.circuit.index("0V")
    assert [circuit.final(net) for net in "abcd"] == pytest.approx([4.0, 4.0, 4.0, 0.0], rel=1e-9)


def test_a_net_joined_to_the_supply_is_the_supply() -> None:
    circuit = setup(
        resistor("R1", "rail", "supply", "0R"), resistor("R2", "rail", "n", "1k"), resistor("R3", "n", "0V", "1k"),
        supply="6 V",
        source="1R",
        events=[event(0.0, "connect supply")],
        ends=1e-3,
    )  # fmt: skip
    assert circuit.circuit.index("rail") == circuit.circuit.index("supply")
    assert circuit.final("n") == pytest.approx(6.0 * 1000 / 2001, rel=1e-6)


def test_a_generator_between_two_nets_floats() -> None:
    circuit = setup(
        steps("G1", "top", "bottom", (0.0, 0.0), (1e-3, 5.0)),
        resistor("R1", "top", "0V", "3k"),
        resistor("R2", "bottom", "0V", "2k"),
        supply=None,
        ends=2e-3,
    )
    rows = {net: level(voltage(net), Anchor(2e-3)) for net in ("top", "bottom")}
    half = level(voltage("top", "bottom"), Anchor(0.5e-3))
    seen = circuit.run(*rows.values(), half)
    assert seen.value(rows["top"])[0] == pytest.approx(3.0, rel=1e-6)
    assert seen.value(rows["bottom"])[0] == pytest.approx(-2.0, rel=1e-6)
    assert seen.value(half)[0] == pytest.approx(2.5, rel=1e-6)


def test_a_floating_sine_adds_to_what_it_stands_on() -> None:
    circuit = setup(
        steps("G1", "base", "0V", (0.0, 0.0), (1e-6, 3.0)),
        sine("G2", "n", "base", 1.0, 50.0),
        resistor("R1", "n", "0V", "1k"),
        resistor("R2", "base", "0V", "1k"),
        supply=None,
        ends=40e-3,
    )
    top, low = maximum(voltage("n"), Anchor(1e-3)), minimum(voltage("n"), Anchor(1e-3))
    seen = circuit.run(top, low)
    assert seen.value(top)[0] == pytest.approx(4.0, abs=0.012)
    assert seen.value(low)[0] == pytest.approx(2.0, abs=0.012)


def test_strays_count_as_capacitors() -> None:
    parts = [
        steps("G1", "in", "0V", (0.0, 0.0), (1e-9, 5.0)),
        resistor("R1", "in", "n", "10k"),
        resistor("R2", "n", "0V", "100M"),
    ]
    at = crossing(voltage("n"), 2.5, True)
    with_stray = setup(*parts, supply=None, strays=[("n", "0V", "100 pF")], ends=1e-5)
    with_part = setup(*parts, capacitor("C1", "n", "0V", "100 pF"), supply=None, ends=1e-5)
    assert with_stray.run(at).value(at)[0] == with_part.run(at).value(at)[0]
    assert with_part.run(at).value(at)[0] == pytest.approx(1e-6 * math.log(2.0), rel=2e-3)


def test_instants_that_differ_by_rounding_only_are_one() -> None:
    # A ramp is broken into pieces, and the end of one is the begin of the next but for the last digit: a segment of
    # 1e-19 s has no step in it, and the solver could not leave it. 0.1 + 0.2 is not 0.3 either.
    circuit = setup(
        resistor("R1", "supply", "n", "10k"),
        two("light_resistor", "B1", "n", "0V", "10k", **{"class": "ldr"}),
        two("contact", "S1", "n", "0V"),
        events=[
            {"at": "0.0010000000000000002 s", "event": "close", "part": "S1"},
            {"at": "1 ms", "event": "ramp", "part": "B1", "to": "530 lx", "for": "28 us"},
        ],
        ends=2e-3,
    )
    lanes = circuit.lanes()
    stops = np.array([0.5e-3, 1e-3, 1.5e-3])
    program = circuit.timeline(lanes).program(circuit.ends, stops)
    assert program.length.min() > 1e-9
    assert program.length.sum() == pytest.approx(circuit.ends, rel=1e-15)
    starts = np.cumsum(program.length[0]) - program.length[0]
    gentle = starts[program.restart == 0]
    # The stop at 1 ms is one with events: it stays a jump.
    assert gentle == pytest.approx([0.5e-3, 1.5e-3], rel=1e-12)


def test_events_of_every_lane_come_at_instants_of_its_own() -> None:
    circuit = pulled_up(ends=5.0)
    lanes = circuit.lanes(count=3)
    line = Timeline(circuit.circuit, lanes)
    connected, rise, closed = np.array([0.1, 0.2, 0.3]), np.array([1e-3, 5e-2, 1e-6]), np.array([3.0, 1.0, 2.0])
    line.connect_supply(connected, rise)
    line.set_part("S1", closed, "closed")
    up, down = crossing(voltage("n"), 3.0, True), crossing(voltage("n"), 3.0, False)
    seen = run(circuit.circuit, lanes, line.program(5.0), [up, down])
    assert seen.value(up) == pytest.approx(connected + 0.5 * rise, rel=1e-6)
    assert seen.value(down) == pytest.approx(closed, abs=2e-12)


def test_what_starts_do_not_name_is_solved_at_the_beginning() -> None:
    # The net between two resistors has no charge to keep: it stands between the supply and what the capacitor holds.
    circuit = setup(
        resistor("R1", "supply", "m", "1k"),
        resistor("R2", "m", "n", "2k"),
        capacitor("C1", "n", "0V", "1 uF"),
        supply="6 V",
        starts={"n": "3 V"},
        ends=1e-3,
    )
    assert volts_at(circuit, "m", 1e-9) == pytest.approx([5.0], abs=1e-4)


@pytest.mark.parametrize("radians", [0.0, 0.7, -2.0])
def test_a_sine_begins_at_its_phase(radians: float) -> None:
    wave = {"offset": "1 V", "amplitude": "2 V", "frequency": "50 Hz", "phase": radians}
    generator = two("generator", "G1", "n", "0V", waveform={"sine": wave})
    circuit = setup(generator, resistor("R1", "n", "0V", "1k"), supply=None, ends=30e-3)
    times = np.array([1e-9, 3e-3, 11e-3, 29e-3])
    exact = 1.0 + 2.0 * np.sin(2.0 * math.pi * 50.0 * times + radians)
    # Between the steps, a twentieth of a period each, it is a parabola.
    assert volts_at(circuit, "n", *times) == pytest.approx(exact, abs=0.01)
