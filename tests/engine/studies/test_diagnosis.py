"""Lanes that come to no end: reason, time and nets in words that the bench understands, and work that is bounded."""

from __future__ import annotations

import re
import time

import pytest

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.primitives.signals import crossing, voltage
from stagebook.engine.results import Verdict
from stagebook.engine.run import MOST_STEPS, run
from stagebook.engine.studies.diagnosis import diagnosed
from stagebook.engine.studies.explanation import explain
from stagebook.engine.studies.margins import study
from stagebook.engine.studies.waves import waves

from ..circuits import Json, Setup, capacitor, resistor, setup, steps, transistor

BARE: Json = {"law": {"saturation_current": "1e-14 A", "forward_gain": 150, "reverse_gain": 2}}  # no capacitance at all


def latch() -> Setup:
    """A complementary latch that a slow ramp fires."""
    return setup(
        steps("G1", "in", "0V", (0.0, 0.0), (1e-3, 0.0), (50e-3, 5.0)),
        resistor("R1", "supply", "top", "1k", rating="0.25 W"),
        transistor("Q1", "gate", "mid", "top", "pnp", **BARE),
        transistor("Q2", "mid", "gate", "0V", **BARE),
        resistor("R2", "gate", "0V", "10k"),
        resistor("R3", "top", "mid", "10k"),
        resistor("R4", "in", "gate", "47k"),
        supply="9 V",
        ends=60e-3,
    )


def bistable(collector: str) -> Setup:
    """A bistable that a slow ramp sets and resets."""
    return setup(
        steps("G1", "in", "0V", (0.0, -5.0), (10e-3, -5.0), (40e-3, 9.0), (59e-3, -9.0)),
        resistor("R9", "in", "b1", "10k"),
        resistor("R1", "supply", "c1", collector, rating="0.25 W"),
        resistor("R2", "supply", "c2", "1k"),
        resistor("R3", "c1", "b2", "10k"),
        resistor("R4", "c2", "b1", "10k"),
        resistor("R5", "b1", "0V", "100k"),
        resistor("R6", "b2", "0V", "100k"),
        transistor("Q1", "c1", "b1", "0V", **BARE),
        transistor("Q2", "c2", "b2", "0V", **BARE),
        ends=60e-3,
    )


def words(circuit: Setup) -> str | None:
    lanes = circuit.lanes()
    return diagnosed(run(circuit.circuit, lanes, circuit.program(lanes), ()), lanes, "alarm", 0)


def unsolved() -> Setup:
    """A bistable of which no side is found: round-off says whether a jump comes down on it, and most do not."""
    made = (bistable(collector) for collector in ("1k", "1k05", "950", "1k1", "900", "1k2"))
    return next(circuit for circuit in made if words(circuit) is not None)


def test_what_switches_without_capacitance_is_named_with_its_cure() -> None:
    # Nothing makes the voltages of a regenerative loop continuous there: they would jump in no time at all.
    circuit = unsolved()
    said = words(circuit)
    assert said is not None
    told = re.fullmatch(
        r"could not be solved at [\d.]+ ms: nets (\w+) and (\w+) switch over with no capacitance to slow them; "
        r"a stray of 1 pF from net (\w+) to 0V, as wiring has it, cures it",
        said,
    )
    assert told is not None, said
    assert {told[1], told[2]} <= {"b1", "b2", "c1", "c2"}
    cured = Setup(edit.with_stray(circuit.design, told[3], "0V", "1p"))
    assert words(cured) is None


def test_a_snap_whose_far_side_is_found_comes_when_a_stray_has_it_come() -> None:
    fires = crossing(voltage("gate"), 0.4, True)
    bare, strayed = latch(), Setup(edit.with_stray(latch().design, "gate", "0V", "1p"))
    assert bare.run(fires).value(fires) == pytest.approx(strayed.run(fires).value(fires), abs=1e-6)
    assert bare.final("mid") == pytest.approx(strayed.final("mid"), abs=1e-6)


def test_a_margin_and_the_waves_give_the_same_reason() -> None:
    design = unsolved().design
    checks = {check.id: check for check in study(design).checks}
    found = checks["resistor_power:all:R1"]
    assert found.verdict is Verdict.UNKNOWN
    assert "a stray of 1 pF from net" in str(found.reason)
    with pytest.raises(CircuitError, match=r"sequence 'alarm': could not be solved at .* a stray of 1 pF"):
        waves(design)


def flasher(ends: float, beside: float | None = None) -> Design:
    """An astable at some 50 kHz; ``beside``: another one, so many times slower."""
    other = [] if beside is None else [
        resistor("R5", "supply", "c3", "1k"),
        resistor("R6", "supply", "b3", beside * 15e3),
        resistor("R7", "supply", "b4", beside * 15e3),
        resistor("R8", "supply", "c4", "1k"),
        capacitor("C3", "c3", "b4", "1n"),
        capacitor("C4", "c4", "b3", "1n2"),
        transistor("Q3", "c3", "b3", "0V", **{"class": "small npn"}),
        transistor("Q4", "c4", "b4", "0V", **{"class": "small npn"}),
    ]  # fmt: skip
    return setup(
        *other,
        resistor("R1", "supply", "c1", "1k"),
        resistor("R2", "supply", "b1", "15k"),
        resistor("R3", "supply", "b2", "15k"),
        resistor("R4", "supply", "c2", "1k"),
        capacitor("C1", "c1", "b2", "1n"),
        capacitor("C2", "c2", "b1", "1n2"),
        transistor("Q1", "c1", "b1", "0V", **{"class": "small npn"}),
        transistor("Q2", "c2", "b2", "0V", **{"class": "small npn"}),
        ends=ends,
    ).design


def test_flashers_that_run_too_long_are_told_by_their_frequency_and_cost_a_bounded_amount(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    # 0.69 R (C1 + C2) = 22.8 us: 44 kHz; real junctions make it a little quicker. Two that have no common period
    # cannot be carried forward.
    monkeypatch.setattr("stagebook.engine.carry.follower.MORE", 1.0)
    circuit = Setup(flasher(10.0, beside=3.0**0.5))
    lanes = circuit.lanes()
    seen = run(circuit.circuit, lanes, circuit.program(lanes), ())
    assert seen.results.work[0, 0] <= MOST_STEPS + 1
    said = diagnosed(seen, lanes, "alarm", 0)
    told = re.fullmatch(
        r"took too many steps by [\d.]+ ms: it goes on oscillating near net (\w+) at about ([\d.]+) kHz, "
        r"steadily \((\d+) periods alike\), not evenly enough in all nets to be carried forward; end the sequence "
        r"sooner, or look at the oscillation in a short sequence of its own",
        str(said),
    )
    assert told is not None, said
    assert float(told[2]) == pytest.approx(44.0, rel=0.15)
    assert int(told[3]) > 20


def test_a_flasher_alone_comes_to_its_end() -> None:
    """460,000 periods, all but some hundred of them carried forward."""
    circuit = Setup(flasher(10.0))
    lanes = circuit.lanes()
    seen = run(circuit.circuit, lanes, circuit.program(lanes), ())
    assert diagnosed(seen, lanes, "alarm", 0) is None
    assert seen.carried.hertz[0] == pytest.approx(44e3, rel=0.15)
    assert seen.carried.periods[0] == pytest.approx(10.0 * seen.carried.hertz[0], rel=0.01)


def test_a_study_spends_no_work_on_corners_of_what_comes_to_no_end(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("stagebook.engine.carry.follower.MORE", 1.0)
    begin = time.perf_counter()
    checks = study(flasher(10.0, beside=3.0**0.5), lanes=200).checks
    assert time.perf_counter() - begin < 60.0  # one lane takes a second; all corners and random lanes, minutes
    for check in checks:
        assert check.verdict is Verdict.UNKNOWN
        assert check.reason is not None
    assert any("goes on oscillating" in str(check.reason) for check in checks)


def test_a_solved_lane_has_no_reason() -> None:
    assert words(Setup(flasher(1e-3))) is None


def test_what_was_carried_forward_is_told_where_a_margin_comes_from() -> None:
    """A voltage across a capacitor of a flasher of 44 kHz, for 10 s."""
    design = flasher(10.0)
    check = next(check for check in study(design, lanes=0).checks if check.margin is not None)
    assert check.verdict in (Verdict.PASS, Verdict.THIN, Verdict.FAIL)
    (told,) = explain(design, check).carried
    found = re.fullmatch(
        r"sequence alarm: oscillates near net c[12] at ([\d.]+) kHz; ([\d,]+) of its periods \(.* s\) were carried "
        r"forward from those before and after them",
        told,
    )
    assert found is not None, told
    assert float(found[1]) == pytest.approx(44.0, rel=0.2)
    assert float(found[2].replace(",", "")) == pytest.approx(10.0 * 1e3 * float(found[1]), rel=0.02)
