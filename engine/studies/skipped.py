"""Growing modes that the steps of a run did not resolve: eigenvalues at the states that long steps reached."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ..circuit.circuit import Circuit
from ..circuit.linearised import Mode, growing, matrices, parameters_at
from ..kernel.layout import Floats, Ints, Program
from ..primitives.columns import Lanes
from ..run import Observed

SKIPPED = 0.6  # |s| h from which a step does not resolve a mode: about ten steps a period
SHOWS = 7.0  # e-folds that take a disturbance of a millivolt to volts
SHORTEST = 1e-6  # s; a step that skips a growing mode is soon followed by longer ones
ALIKE = 0.3  # largest change of an entry of C or G, beside its diagonals, between states that share their modes
FINE = 0.01  # the same once a growing mode was found, to see where it begins
MOST_STATES = 1500  # of one run that are looked at: those that the longest steps reached
MOST_MODES = 7e9  # states times unknowns cubed: some 20 s of eigenvalues; from 170 unknowns on fewer states are seen
MOST_ENTRIES = 2_000_000  # of the matrices that are in memory at a time
BRIEF = 2e-3  # of the time since the beginning: a switching that is met so little late is met in time
FEW = 5.0  # periods in that time which are no oscillation to speak of
BETWEEN = 24  # states between two, to see where a mode begins to grow
MOST_BRIEF = 200  # brief ones looked at: what switches that often is followed


@dataclass(frozen=True)
class Skipped:
    """A growing mode that the steps of a run did not resolve.

    ``time`` and ``growth`` (1/s) of the states from the last good one to the last bad one, ``speed`` the largest |s|,
    ``mode`` the first one, ``net`` where it is largest.
    """

    time: Floats
    growth: Floats
    speed: Floats
    mode: Mode
    net: str


def skipped(
    circuit: Circuit, lane: Lanes, program: Program, observed: Observed, alike: float = ALIKE
) -> Skipped | None:
    """The first growing mode that the steps of a traced run did not resolve and that would have shown.

    A switching that is already under way at the end of the step in which it began is none: it is met a little late.
    """
    used = int(observed.results.trace_used[0])
    time, states = observed.results.trace_time[0, :used], observed.results.trace_value[0, :used]
    step = np.diff(time, prepend=0.0)
    looked = np.flatnonzero(step > SHORTEST)
    if not looked.size or not circuit.topology.size[1]:
        return None  # nothing was long, or everything is driven
    most = max(1, min(MOST_STATES, int(MOST_MODES / float(circuit.topology.size[1]) ** 3)))
    if looked.size > most:
        looked = np.sort(looked[np.argpartition(-step[looked], most)[:most]])
    table = circuit.table(lane)
    modes = _modes(circuit, parameters_at(circuit, table, program, 0, time[looked]), states[looked], alike)
    for number, (found, first) in enumerate(_regions(circuit, time, step, looked, modes)):
        if number >= MOST_BRIEF:
            return None
        before, after = first - 1, first
        share = np.arange(1, BETWEEN + 1)[:, None] / BETWEEN
        instants = time[before] + (time[after] - time[before]) * share[:, 0]
        between = states[before] + (states[after] - states[before]) * share
        if not _brief(
            found, instants, _modes(circuit, parameters_at(circuit, table, program, 0, instants), between, 0.0)
        ):
            return found
    return None


def _modes(circuit: Circuit, parameters: Floats, states: Floats, alike: float) -> list[list[Mode]]:
    """Growing modes at every state, as many states at a time as memory should hold."""
    portion = max(2, MOST_ENTRIES // int(circuit.topology.size[1]) ** 2)
    return [
        modes
        for low in range(0, len(states), portion)
        for modes in _modes_alike(circuit, parameters[low : low + portion], states[low : low + portion], alike)
    ]


def _modes_alike(circuit: Circuit, parameters: Floats, states: Floats, alike: float) -> list[list[Mode]]:
    """The same. Those whose matrices are alike, entry by entry beside the diagonals, share them."""
    conductance, capacitance = matrices(circuit, parameters, np.ascontiguousarray(states))
    both = np.stack([conductance, capacitance], axis=1)
    scale = 1.0 / np.sqrt(np.maximum(np.abs(both.diagonal(axis1=2, axis2=3)), 1e-18))
    weight = scale[:, :, :, None] * scale[:, :, None, :]
    own, of = [0], [0]
    for k in range(1, len(states)):
        if np.max(np.abs((both[k] - both[own[-1]]) * weight[own[-1]])) > alike:
            own.append(k)
        of.append(len(own) - 1)
    found = growing(conductance[own], capacitance[own])
    return [found[k] for k in of]


def _regions(
    circuit: Circuit, time: Floats, step: Floats, looked: Ints, modes: list[list[Mode]]
) -> Iterator[tuple[Skipped, int]]:
    """Successions of states with a growing mode that was skipped and would have shown, each with its first state."""
    course: list[tuple[float, float, float]] = []  # time, growth, |s|
    first: Mode | None = None
    begin, total = 0, 0.0
    for k, n in enumerate((*looked, -1)):
        bad = [] if n < 0 else [mode for mode in modes[k] if abs(mode.s) * step[n] > SKIPPED]
        if bad:
            fastest = max(bad, key=lambda mode: mode.s.real)
            if first is None:
                first, begin, total = fastest, int(n), 0.0
                course = [(float(time[n] - step[n]), 0.0, abs(fastest.s))]
            course.append((float(time[n]), fastest.s.real, max(abs(mode.s) for mode in bad)))
            total += fastest.s.real * float(step[n])
        elif first is not None:
            if total > SHOWS:
                place = int(np.argmax(np.abs(first.shape[: int(circuit.topology.size[0])])))
                table = np.array(course)
                yield Skipped(table[:, 0], table[:, 1], table[:, 2], first, circuit.unknown_name(place)), begin
            first = None


def _brief(found: Skipped, instants: Floats, modes: list[list[Mode]]) -> bool:
    """Whether a mode grew for so short a time, and in so few periods, that nothing was lost by skipping it."""
    onset = next((k for k, there in enumerate(modes) if there), None)
    if onset is None:
        return False
    late = float(found.time[-1]) - float(instants[onset])
    if late > BRIEF * float(found.time[-1]):
        return False
    frequency = max(mode.s.imag for mode in modes[onset]) / (2.0 * math.pi)
    return late * frequency < FEW
