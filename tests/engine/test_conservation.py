"""Kirchhoff's laws, on random small circuits: nothing is lost between nets, nor between accepted steps."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.circuit.circuit import Circuit
from stagebook.engine.design.document import Design
from stagebook.engine.kernel.layout import Floats
from stagebook.engine.kernel.linearised import linearised
from stagebook.engine.kernel.newton import REMAINDER
from stagebook.engine.kernel.steps import GAMMA, TO_STAGE, TO_START, A
from stagebook.engine.primitives.builder import Handle
from stagebook.engine.primitives.signals import Signal, integral
from stagebook.engine.run import control

from .circuits import Setup
from .random_circuits import random_circuits


@dataclass(frozen=True)
class Flows:
    """Currents out of, charges on every net, and the matrix of the free ones, at some voltages."""

    current: Floats
    charge: Floats
    matrix: Floats

    @classmethod
    def at(cls, circuit: Circuit, parameters: Floats, x: Floats, ah: float) -> Flows:
        made = linearised(circuit.topology, parameters[None, :], len(circuit.source_names), x[None, :])
        return cls(made.current[0], made.charge[0], made.capacitance[0] + ah * made.conductance[0])


@given(random_circuits(), st.integers(0, 2**32 - 1), st.sampled_from([0.0, 1e-9, 1e-5]))
@settings(max_examples=80, deadline=None)
def test_what_leaves_one_net_enters_another(circuit: Setup, seed: int, ah: float) -> None:
    x = np.random.default_rng(seed).uniform(-1.0, 1.0, int(circuit.circuit.topology.size[2]))
    x[-1] = 0.0
    flows = Flows.at(circuit.circuit, circuit.circuit.table(circuit.lanes())[0], x, ah)
    for each in (flows.current, flows.charge):
        assert abs(np.sum(each)) <= 1e-12 * np.sum(np.abs(each)) + 1e-30


@given(random_circuits(), st.integers(0, 2**32 - 1), st.sampled_from([1e-9, 1e-5]))
@settings(max_examples=80, deadline=None)
def test_the_matrix_is_the_derivative_of_charges_and_currents(circuit: Setup, seed: int, ah: float) -> None:
    made = circuit.circuit
    parameters = made.table(circuit.lanes())[0]
    x = np.random.default_rng(seed).uniform(-0.6, 0.6, int(made.topology.size[2]))
    x[-1] = 0.0
    matrix = Flows.at(made, parameters, x, ah).matrix
    step = 2e-6
    for column in range(int(made.topology.size[1])):
        sides = []
        for sign in (1.0, -1.0):
            moved = x.copy()
            moved[column] += sign * step
            flows = Flows.at(made, parameters, moved, ah)
            sides.append((flows.charge + ah * flows.current)[: matrix.shape[0]])
        numeric = (sides[0] - sides[1]) / (2 * step)
        round_off = 1e-15 * np.max(np.abs(sides)) / step
        assert np.max(np.abs(numeric - matrix[:, column])) <= 1e-5 * np.max(np.abs(matrix[:, column])) + round_off


def steps_of(circuit: Setup, trace: int = 6000) -> tuple[Floats, Floats]:
    """Times and voltages of all accepted steps."""
    seen = circuit.run(trace=trace)
    used = int(seen.results.trace_used[0])
    return seen.results.trace_time[0, :used], seen.results.trace_value[0, :used]


@given(random_circuits())
@settings(max_examples=25, deadline=None)
def test_kirchhoffs_current_law_holds_at_every_accepted_step(circuit: Setup) -> None:
    # TR-BDF2 (Bank et al. 1985) written out: the trapezoidal stage is solved here to round-off, then the second
    # difference at the step's end must hold within the stated part of the tolerance, for the end and for the stage.
    made = circuit.circuit
    parameters = made.table(circuit.lanes())[0]
    free = int(made.topology.size[1])
    tolerances = control(made)
    program = circuit.program(circuit.lanes())
    corners = np.concatenate([[0.0], np.cumsum(program.length[0])])
    times, states = steps_of(circuit)
    for n in range(1, times.size - 1):
        if np.min(np.abs(times[n] - corners)) < 2e-12 or np.min(np.abs(times[n + 1] - corners - 1e-12)) < 1e-15:
            continue  # the backward-Euler step that takes in a jump
        h = times[n + 1] - times[n]
        ah = A * h
        x0, x1 = states[n], states[n + 1]
        tolerance = tolerances.relative * np.abs(x0[:free]) + tolerances.absolute
        start, end = (Flows.at(made, parameters, x, ah) for x in (x0, x1))
        stage_x = x0 + GAMMA * (x1 - x0)
        constant = -start.charge[:free] + ah * start.current[:free]
        for _ in range(60):
            stage = Flows.at(made, parameters, stage_x, ah)
            rest = stage.charge[:free] + ah * stage.current[:free] + constant
            step = np.linalg.solve(stage.matrix, -rest)
            stage_x[:free] += np.clip(step, -0.1, 0.1)
            if np.max(np.abs(step) / tolerance) < 1e-6:
                break
        stage = Flows.at(made, parameters, stage_x, ah)
        rest = (
            end.charge[:free]
            + ah * end.current[:free]
            + TO_START * start.charge[:free]
            - TO_STAGE * stage.charge[:free]
        )
        capacitances = stage.matrix - Flows.at(made, parameters, stage_x, 0.0).matrix * 0.0
        # What the tangents leave over is judged through the diagonal, what the laws bend away from them as a step of
        # its own, which all entries of a row turn into a current.
        allowed = REMAINDER * (np.abs(np.diag(end.matrix)) * tolerance + np.abs(end.matrix) @ tolerance)
        allowed += TO_STAGE * REMAINDER * np.abs(capacitances) @ tolerance
        noise = 1e-14 * (np.abs(end.charge[:free]) + np.abs(start.charge[:free]))
        assert np.all(np.abs(rest[:free]) <= allowed + noise)


def into(circuit: Circuit, net: str) -> Signal:
    """Everything that conducts away from a net, as one signal."""
    made = circuit.builder
    total = Signal(())
    for n, (a, b, _) in enumerate(made.conductances):
        current = Handle("conductance", n, (a, b)).current
        total += current.scaled(float(a == net) - float(b == net))
    for n, (a, b, _) in enumerate(made.junctions):
        current = Handle("junction", n, (a, b)).current
        total += current.scaled(float(a == net) - float(b == net))
    for n, (c, b, e, *_) in enumerate(made.transports):
        handle = Handle("transport", n, (c, b, e))
        total += handle.current.scaled(float(c == net) - float(e == net))
        total += handle.base_current.scaled(float(b == net) - float(e == net))
    for n, (d, g, s, *_) in enumerate(made.channels):
        current = Handle("channel", n, (d, g, s)).current
        total += current.scaled(float(d == net) - float(s == net))
    return Signal(tuple(term for term in total.terms if term[2] != 0.0))


@given(random_circuits())
@settings(max_examples=40, deadline=None)
def test_charge_that_flowed_is_charge_that_arrived(circuit: Setup) -> None:
    made = circuit.circuit
    nets = [net for net, place in made.nets.items() if place < int(made.topology.size[1])]
    rows = [integral(into(made, net)) for net in nets]
    through = [
        integral(Handle("conductance", n, (a, b)).current) for n, (a, b, _) in enumerate(made.builder.conductances)
    ]
    seen = circuit.run(*rows, *through, relative=1e-5)
    parameters = made.table(circuit.lanes())[0]
    start, end = np.zeros(seen.final.shape[1]), seen.final[0].copy()
    moved = Flows.at(made, parameters, end, 0.0).charge - Flows.at(made, parameters, start, 0.0).charge
    # The charge that ten times the tolerance stands for (the integral has an error of its own), and twice the tolerance
    # of all that merely flowed through.
    allowed = np.abs(Flows.at(made, parameters, end, 0.0).matrix) @ np.full(len(nets), 10 * (1e-5 * 12.0 + 1e-6))
    allowed += 1e-3 * np.abs(moved[: len(nets)]) + 2e-5 * sum(abs(seen.value(row)[0]) for row in through)
    for net, row in zip(nets, rows, strict=True):
        place = made.nets[net]
        assert abs(moved[place] + seen.value(row)[0]) <= allowed[place] + 1e-16


def renamed(circuit: Setup, names: dict[str, str]) -> Setup:
    document = circuit.design.dump()
    for part in document["stages"][0]["parts"]:
        part["pins"] = {pin: names.get(net, net) for pin, net in part["pins"].items()}
    return Setup(Design.load(document))


@given(random_circuits(), st.permutations(["n0", "n1", "n2", "n3"]))
@settings(max_examples=25, deadline=None)
def test_names_of_nets_mean_nothing(circuit: Setup, order: list[str]) -> None:
    names = {f"n{k}": f"stage/{name}" for k, name in enumerate(order)}
    other = renamed(circuit, names)
    one, two = circuit.run(), other.run()
    for net, place in circuit.circuit.nets.items():
        assert one.final[0, place] == two.final[0, other.circuit.nets[names.get(net, net)]]


@given(random_circuits(), st.randoms(use_true_random=False))
@settings(max_examples=25, deadline=None)
def test_the_order_of_parts_means_nothing_but_round_off(circuit: Setup, chance: object) -> None:
    document = circuit.design.dump()
    chance.shuffle(document["stages"][0]["parts"])  # type: ignore[attr-defined]
    other = Setup(Design.load(document))
    one, two = circuit.run(relative=1e-5), other.run(relative=1e-5)
    for net, place in circuit.circuit.nets.items():
        assert abs(one.final[0, place] - two.final[0, other.circuit.nets[net]]) <= 1e-3
