"""Work is bounded by the size of the circuit: of one lane, and of the worst corners of a design.

The bounds are the project's own; what an iterate costs was measured (``engine/circuit/cost.py``).
"""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from typing import Any

import pytest

from stagebook.engine.circuit.circuit import Circuit, build
from stagebook.engine.circuit.cost import ABREAST, iterate_cost
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.kernel.layout import OVERWORKED, Program
from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.primitives.signals import Row
from stagebook.engine.results import Depth, Verdict
from stagebook.engine.run import (
    MOST_AT_JUMP,
    MOST_SECONDS,
    MOST_STEPS,
    Observed,
    control,
    most_iterates,
    most_steps,
    run,
)
from stagebook.engine.studies import effort, evaluate, faults, immunity, skipped, trials, waves
from stagebook.engine.studies.causes import causes
from stagebook.engine.studies.diagnosis import diagnosed
from stagebook.engine.studies.evaluate import asks_of, look
from stagebook.engine.studies.margins import study, worst_corners

from ..circuits import Json, Setup, capacitor, resistor, setup, transistor
from .test_faults import buzzer
from .units import changed, latch, timer

MODEL: Json = {"class": "small npn"}


def astable() -> list[Json]:
    """At some 10 kHz."""
    return [
        resistor("R901", "supply", "c1", "1k", rating="0.25 W"),
        resistor("R902", "supply", "b1", "68k"),
        resistor("R903", "supply", "b2", "68k"),
        resistor("R904", "supply", "c2", "1k"),
        capacitor("C1", "c1", "b2", "1n"),
        capacitor("C2", "c2", "b1", "1n2"),
        transistor("Q901", "c1", "b1", "0V", **MODEL),
        transistor("Q902", "c2", "b2", "0V", **MODEL),
    ]


def crosswise(nets: int, each: int) -> list[Json]:
    """Resistors from every net to as many others, spread so that the elimination fills up, and two to the rails."""
    pairs = {(k, (k + 1 + (7 * j * j) % (nets - 1)) % nets) for k in range(nets) for j in range(each)}
    parts = [resistor(f"R{n}", f"n{a}", f"n{b}", "47k") for n, (a, b) in enumerate(sorted(pairs), 1) if a != b]
    return [*parts, resistor("R999", "supply", "n0", "10k"), resistor("R998", "n1", "0V", "10k")]


def line(stages: int) -> list[Json]:
    """Common-emitter stages one behind the other."""
    parts: list[Json] = []
    before = "supply"
    for k in range(1, stages + 1):
        parts += [
            resistor(f"R{2 * k}", before, f"nb{k}", "47k"),
            resistor(f"R{2 * k + 1}", "supply", f"nc{k}", "4k7"),
            transistor(f"Q{k}", f"nc{k}", f"nb{k}", "0V", **MODEL),
        ]
        before = f"nc{k}"
    return parts


def test_a_line_of_stages_stays_sparse_and_crosswise_nets_do_not() -> None:
    short, long = (setup(*line(n), ends=1e-3).circuit for n in (10, 60))
    dense = setup(*crosswise(60, 3), ends=1e-3).circuit
    per_net = [c.topology.update.shape[0] / float(c.topology.size[0]) for c in (short, long, dense)]
    assert per_net[1] == pytest.approx(per_net[0], rel=0.2)
    assert per_net[2] > 20.0 * per_net[1]
    assert iterate_cost(long.topology) == pytest.approx(6.0 * iterate_cost(short.topology), rel=0.25)


def test_a_lane_may_take_fewer_steps_the_more_each_costs() -> None:
    small = setup(*astable(), ends=1e-3).circuit
    assert most_steps(small) == MOST_STEPS
    for parts in (line(60), crosswise(60, 3)):
        large = setup(*parts, ends=1e-3).circuit
        assert control(large).bounds[0] == most_steps(large) < MOST_STEPS
        # Two iterates a step are the least that there are.
        assert 2.0 * most_steps(large) * iterate_cost(large.topology) <= MOST_SECONDS
        assert most_steps(large, rows=1000) < most_steps(large)


def test_iterates_are_bounded_however_many_a_step_takes(monkeypatch: pytest.MonkeyPatch) -> None:
    """They are what costs: steps that take many, or are taken in vain, must not make a lane longer."""
    monkeypatch.setattr("stagebook.engine.run.ITERATES", 0.01)  # so that no number of steps is too large
    monkeypatch.setattr("stagebook.engine.run.MOST_SECONDS", 0.05)
    circuit = setup(*astable(), ends=1.0)
    lanes = circuit.lanes()
    seen = run(circuit.circuit, lanes, circuit.program(lanes), ())
    assert seen.results.ended[0, 0] == OVERWORKED
    iterates = int(seen.results.work[0, 2])
    # A step takes 12 for its stage and 12 for its end at most, a jump 200: one of them may go beyond.
    assert 0 < iterates - most_iterates(circuit.circuit) <= MOST_AT_JUMP


def test_what_takes_too_long_in_a_large_circuit_is_unknown_and_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("stagebook.engine.run.MOST_SECONDS", 0.5)
    circuit = setup(*crosswise(60, 3), *astable(), ends=1.0)
    lanes = circuit.lanes()
    setup(*astable(), ends=1e-6).run()  # compiles the kernel where that has not been done
    begin = time.perf_counter()
    seen = run(circuit.circuit, lanes, circuit.program(lanes), ())
    assert time.perf_counter() - begin < 20.0  # on a busy machine
    assert seen.results.ended[0, 0] == OVERWORKED
    steps, _, iterates, _ = (int(each) for each in seen.results.work[0])
    allowed, in_all = most_steps(circuit.circuit), most_iterates(circuit.circuit)
    assert allowed < 5_000
    assert steps == allowed + 1 or (steps <= allowed and iterates > in_all)
    assert iterates <= in_all + MOST_AT_JUMP
    nets = int(circuit.circuit.topology.size[0])
    said = str(diagnosed(seen, lanes, "alarm", 0))
    assert (
        f"({steps} are all that its time allows in a circuit of {nets} nets): it goes on oscillating near net" in said
    )
    found = {check.id: check for check in study(circuit.design).checks}["resistor_power:all:R901"]
    assert found.verdict is Verdict.UNKNOWN
    assert "took too many steps by" in str(found.reason)


@pytest.mark.parametrize("unit", [timer, latch])
def test_the_effort_told_before_is_about_what_is_done(
    unit: Callable[[], Json], monkeypatch: pytest.MonkeyPatch
) -> None:
    design = Design.load(unit())
    circuit = build(design)
    asks = asks_of(circuit)
    told = sum(effort.corner_effort(circuit, asks, look(circuit, asks, circuit.nominal()).observed).values())
    done = 0.0

    def counted(circuit: Circuit, lanes: Lanes, program: Program, rows: Sequence[Row], **how: Any) -> Observed:
        nonlocal done
        seen = run(circuit, lanes, program, rows, **how)
        done += float(seen.results.work[:, 2].sum()) / ABREAST * iterate_cost(circuit.topology, len(seen.rows))
        return seen

    monkeypatch.setattr(evaluate, "run", counted)
    monkeypatch.setattr(trials, "run", counted)
    worst_corners(circuit, asks)
    assert done > 0.0
    assert done / 3.0 < told < 3.0 * done


def test_a_design_that_is_too_large_for_its_corners_passes_nothing_and_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    design = Design.load(latch())
    plain = {check.id: check for check in study(design).checks}
    assert any(check.verdict is Verdict.PASS for check in plain.values())
    monkeypatch.setattr(effort, "MOST_EFFORT", 1e-6)
    sheet = study(design, lanes=50)
    assert {check.id for check in sheet.checks} == plain.keys()
    for check in sheet.checks:
        assert check.verdict is Verdict.UNKNOWN
        assert check.margin is None
        assert check.spread is None
        if not str(plain[check.id].reason).startswith("missing"):
            assert str(check.reason).startswith("too large for its corners: ")
            assert check.corner == ""  # no worst one is known
            assert "divide the design, or end sequence" in str(check.reason)
    # What the nominal lane showed is kept beside it, but for what a trial would have to tell.
    shown = [check for check in sheet.checks if check.nominal is not None]
    assert shown
    assert all(check.nominal == pytest.approx(plain[check.id].nominal) for check in shown)
    circuit = build(design)
    with pytest.raises(CircuitError, match="too large for its corners"):
        worst_corners(circuit, asks_of(circuit))
    # Margins that are known at nominal only are not taken for worst ones when somebody asks what changed them.
    other = Design.load(changed(latch(), R3="82k"))
    with pytest.raises(CircuitError, match="too large for its corners"):
        causes(design, other, stored=sheet, stored_new=study(other))


def done_by(monkeypatch: pytest.MonkeyPatch) -> Callable[[], float]:
    """Seconds of one core by the rule, of all runs from now on; eight lanes abreast, a few cost as much."""
    done = [0.0]

    def counted(circuit: Circuit, lanes: Lanes, program: Program, rows: Sequence[Row], **how: Any) -> Observed:
        seen = run(circuit, lanes, program, rows, **how)
        iterates = float(seen.results.work[:, 2].mean()) * -(-lanes.count // ABREAST)
        done[0] += iterates * iterate_cost(circuit.topology, len(seen.rows))
        return seen

    for module in (evaluate, trials, immunity, waves):
        monkeypatch.setattr(module, "run", counted)
    return lambda: done[0]


@pytest.mark.parametrize("what", ["its faults", "its immunity"])
def test_a_study_that_is_too_large_is_refused_before_it_is_begun(what: str, monkeypatch: pytest.MonkeyPatch) -> None:
    design = buzzer() if what == "its faults" else Design.load(latch())
    study_of: Callable[[Design], object] = faults.study if what == "its faults" else immunity.study
    done, told = done_by(monkeypatch), []
    words = effort._too_large

    def noted(*of: Any) -> str | None:
        told.append((of[0], sum(of[3].values())))
        return words(*of)

    monkeypatch.setattr(effort, "_too_large", noted)
    study_of(design)
    whole = done()
    (about,) = (seconds for of, seconds in told if of == what)
    # Both by the same rule. What the sound unit tells beforehand of units that are not sound is no more than the order.
    assert 0.0 < whole / 10.0 < about < 10.0 * whole
    monkeypatch.setattr(effort, "MOST_EFFORT", 1e-6)
    with pytest.raises(
        CircuitError, match=rf"^too large for {what}: \d+ .* would take about 0 minutes of one processor"
    ):
        study_of(design)
    assert done() - whole < 0.3 * whole


def test_causes_that_are_too_many_are_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    design, other = Design.load(latch()), Design.load(changed(latch(), R3="82k"))
    sheets = study(design), study(other)
    monkeypatch.setattr(effort, "MOST_EFFORT", 1e-6)
    with pytest.raises(CircuitError, match=r"^too large for its causes: 1 changes in 2 combinations of "):
        causes(design, other, stored=sheets[0], stored_new=sheets[1])


def test_a_spread_is_of_as_many_lanes_as_time_allows(monkeypatch: pytest.MonkeyPatch) -> None:
    """And the ones that are drawn are the first of those that would have been (keyed by seed, reference, datum)."""
    design = Design.load(timer())
    monkeypatch.setattr(effort, "MOST_SPREAD", 0.0)
    sheet = study(design, lanes=100_000)
    assert (sheet.lanes, sheet.depth) == (effort.LEAST_SPREAD, Depth.SPREAD)
    monkeypatch.undo()
    whole = study(design, lanes=effort.LEAST_SPREAD)
    assert [check.spread for check in sheet.checks] == [check.spread for check in whole.checks]
    assert any(check.spread for check in sheet.checks)
    assert study(design, lanes=0).lanes == 0


def test_growing_modes_are_the_same_however_many_states_are_in_memory(monkeypatch: pytest.MonkeyPatch) -> None:
    circuit: Setup = setup(*astable(), ends=0.5e-3)
    lanes = circuit.lanes()
    seen = circuit.run(trace=4096)
    used = int(seen.results.trace_used[0])
    assert used > 100
    parameters = skipped.parameters_at(
        circuit.circuit, circuit.circuit.table(lanes), circuit.program(lanes), 0, seen.results.trace_time[0, :used]
    )
    states = seen.results.trace_value[0, :used]
    # With a bound of nothing no two states share their modes.
    whole = skipped._modes(circuit.circuit, parameters, states, 0.0)
    monkeypatch.setattr(skipped, "MOST_ENTRIES", 1)
    pieces = skipped._modes(circuit.circuit, parameters, states, 0.0)
    assert [[mode.s for mode in modes] for modes in pieces] == [[mode.s for mode in modes] for modes in whole]
    assert any(whole)
