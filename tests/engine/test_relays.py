"""Coils and the contacts they operate: instants of moving against closed forms of the winding's current."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.circuit.linearised import matrices
from stagebook.engine.primitives.signals import Anchor, crossing, level, maximum, voltage
from stagebook.engine.run import run
from stagebook.engine.studies.sequences import program_of

from .circuits import Json, Setup, resistor, setup, two

OHMS, HENRY = 400.0, 1.0
PULLS, LETS_GO = 8.4, 2.4  # V at 20 C
ARMATURE = "K1 armature"


def coil(a: str, b: str, **more: object) -> Json:
    fields = {"inductance": "1 H", "resistance": "400R", "pick_up": "8.4 V", "drop_out": "2.4 V", **more}
    return two("coil", "K1", a, b, **fields)


def switched(*more: Json, events: list[Json], ends: float = 0.2, ambient: str = "20 C", **fields: object) -> Setup:
    """A coil that S1 switches to 0V, with 40k across it for what flows on; its contact S2 pulls `out` up."""
    return setup(
        coil("supply", "low", **fields),
        two("contact", "S1", "low", "0V", data={"resistance": "1 mohm", "insulation": "1000G"}),
        resistor("R1", "supply", "low", "40k"),
        resistor("R2", "out", "0V", "10k"),
        *more,
        events=[{"at": "0 s", "event": "connect supply"}, *events],
        supply="12 V",
        ambient=ambient,
        ends=ends,
    )


def contact(**fields: object) -> Json:
    return two("contact", "S2", "supply", "out", operated_by="K1", **fields)


CLOSE: Json = {"at": "10 ms", "event": "close", "part": "S1"}
OPEN: Json = {"at": "100 ms", "event": "open", "part": "S1"}


def pull_in(ohms: float = OHMS) -> float:
    """i = (U/R)(1 - exp(-t R/L)) reaches the pick-up current (textbook form of an RL circuit)."""
    return -HENRY / ohms * math.log(1.0 - PULLS / OHMS / (12.0 / ohms))


@pytest.mark.parametrize("delay", ["0 s", "5 ms"])
def test_a_make_contact_closes_when_the_current_has_reached_pick_up(delay: str) -> None:
    circuit = switched(contact(), events=[CLOSE], armature_delay=delay)
    closes, moves = crossing(voltage("out"), 6.0, True), crossing(voltage(ARMATURE), 0.5, True)
    seen = circuit.run(closes, moves, relative=1e-4)
    exact = 0.01 + pull_in() + float(delay.split()[0]) * 1e-3
    assert seen.value(closes)[0] == pytest.approx(exact, abs=0.002 * pull_in())
    assert seen.value(moves)[0] == pytest.approx(seen.value(closes)[0], abs=1e-9)


def test_hot_copper_pulls_in_later() -> None:
    # R20 (234.5 + T)/254.5 (copper, common practice): 456.6 ohm at 56 C, where 8.4 V at 20 C need 9.59 V.
    hot = OHMS * (234.5 + 56.0) / 254.5
    circuit = switched(contact(), events=[CLOSE], ambient="56 C")
    closes = crossing(voltage("out"), 6.0, True)
    assert circuit.run(closes, relative=1e-4).value(closes)[0] == pytest.approx(
        0.01 + pull_in(hot), abs=0.002 * pull_in(hot)
    )


def test_a_break_contact_opens_and_the_coil_lets_go_through_what_lies_across_it() -> None:
    # The current decays through 40k and the winding: i = I exp(-t (R + 40k)/L) down to the drop-out current.
    circuit = switched(contact(form="break"), events=[CLOSE, OPEN], armature_delay="2 ms")
    opens = crossing(voltage("out"), 6.0, False, Anchor(5e-3))
    closes = crossing(voltage("out"), 6.0, True, Anchor(50e-3))
    seen = circuit.run(opens, closes)
    assert seen.value(opens)[0] == pytest.approx(0.01 + pull_in() + 2e-3, abs=1e-5)
    decay = HENRY / (OHMS + 40e3) * math.log((12.0 / OHMS) / (LETS_GO / OHMS))
    assert seen.value(closes)[0] == pytest.approx(0.1 + decay + 2e-3, abs=0.01 * decay)


def test_between_the_levels_nothing_moves() -> None:
    # 6 V stand between drop-out and pick-up: a coil at rest stays, one that was pulled in holds.
    held = switched(
        contact(),
        events=[CLOSE, {"at": "50 ms", "event": "dip", "to": "6 V", "for": "60 ms", "edge": "1 ms"}],
        ends=0.12,
    )
    assert held.run(level(voltage("out"), Anchor(0.1))).final[0, held.circuit.index(ARMATURE)] == 1.0
    weak = setup(coil("supply", "0V"), supply="6 V", ends=0.1, ambient="20 C")
    assert weak.final(ARMATURE) == 0.0


def test_a_contact_bounces_as_often_as_it_says() -> None:
    circuit = switched(contact(bounce={"for": "2 ms", "times": 3}), events=[CLOSE])
    closings = [crossing(voltage("out"), 6.0, True, nth=n) for n in (1, 2, 3, 4, 5)]
    seen = circuit.run(*closings)
    times = np.array([seen.value(row)[0] for row in closings])
    # It opens again three times; the edges are spread evenly over its bounce.
    assert times[:4] - times[0] == pytest.approx([0.0, 2e-3 / 3, 4e-3 / 3, 2e-3], abs=1e-6)
    assert np.isnan(times[4])


def test_a_coil_called_back_within_its_delay_does_not_move() -> None:
    short = switched(
        contact(), events=[CLOSE, {"at": "14 ms", "event": "open", "part": "S1"}], armature_delay="20 ms", ends=0.1
    )
    assert pull_in() < 4e-3
    most = maximum(voltage(ARMATURE))
    assert short.run(most).value(most)[0] == 0.0


def test_a_coil_that_interrupts_itself_buzzes_at_the_period_of_its_delays_and_currents() -> None:
    circuit = setup(
        coil("fed", "0V", armature_delay="3 ms"),
        two("contact", "S2", "supply", "fed", operated_by="K1", form="break", data={"insulation": "1000G"}),
        resistor("R1", "fed", "0V", "40k"),
        supply="12 V",
        ambient="20 C",
        ends=0.3,
    )
    turns = [crossing(voltage(ARMATURE), 0.5, True, nth=n) for n in (3, 13)]
    seen = circuit.run(*turns)
    period = float(seen.value(turns[1])[0] - seen.value(turns[0])[0]) / 10
    # Worked from the same RL forms: the current rises 3 ms beyond pick-up, decays, and stays away 3 ms more.
    top = 12.0 / OHMS * (1.0 - (1.0 - PULLS / 12.0) * math.exp(-3e-3 * OHMS / HENRY))
    decay = HENRY / (OHMS + 40e3) * math.log(top / (LETS_GO / OHMS))
    low = LETS_GO / OHMS * math.exp(-3e-3 * (OHMS + 40e3) / HENRY)
    rise = HENRY / OHMS * math.log((12.0 / OHMS - low) / (12.0 / OHMS - PULLS / OHMS))
    assert period == pytest.approx(3e-3 + decay + 3e-3 + rise, rel=2e-3)


def test_a_run_that_goes_on_from_a_kept_state_remembers_the_armature() -> None:
    circuit = switched(contact(), events=[CLOSE], ends=0.1)
    first = circuit.run()
    lanes = circuit.lanes()
    _, program = program_of(circuit.circuit, lanes, "alarm")
    program = program._replace(
        length=np.ascontiguousarray(program.length[:, -1:]),
        restart=np.ones(1, dtype=np.int64),
        source=np.ascontiguousarray(program.source[:, -1:]),
        switch=np.ascontiguousarray(program.switch[:, -1:]),
    )
    still = level(voltage("out"), Anchor(1e-3))
    again = run(circuit.circuit, lanes, program, [still], start=first.final)
    assert again.value(still)[0] == pytest.approx(12.0, rel=1e-3)


def test_lanes_move_each_at_its_own_time_and_the_same_alone() -> None:
    circuit = switched(contact(bounce={"for": "1 ms", "times": 2}), events=[CLOSE, OPEN], armature_delay="3 ms")
    lanes = circuit.lanes({("K1", "inductance"): np.linspace(0.5, 2.0, 21)}, 21)
    _, program = program_of(circuit.circuit, lanes, "alarm")
    closes = crossing(voltage("out"), 6.0, True)
    seen = run(circuit.circuit, lanes, program, [closes])
    assert np.all(np.diff(seen.value(closes)) > 0.0)
    for lane in (0, 7, 20):
        one = lanes.take([lane])
        _, alone = program_of(circuit.circuit, one, "alarm")
        assert run(circuit.circuit, one, alone, [closes]).value(closes)[0] == seen.value(closes)[lane]


@pytest.mark.parametrize(("pulled", "siemens"), [(0.0, 1e-9), (1.0, 10.0)])
def test_a_linearised_circuit_has_its_contacts_where_the_armature_is(pulled: float, siemens: float) -> None:
    # 0.1 ohm closed, 1 Gohm open (customary here, from memory), and 1 kohm to 0V.
    case = setup(
        two("coil", "K1", "supply", "0V", **{"class": "relay 12 V"}),
        two("contact", "S1", "supply", "out", operated_by="K1"),
        resistor("R1", "out", "0V", "1k"),
        supply="12 V",
        ends=1.0,
    )
    state = np.zeros((1, int(case.circuit.topology.size[2])))
    state[0, case.circuit.index("K1 armature")] = pulled
    conductance, _ = matrices(case.circuit, case.circuit.table(case.lanes()), state)
    out = case.circuit.index("out")
    assert conductance[0, out, out] == pytest.approx(1e-3 + siemens, rel=1e-9)
