"""How much computing a study of a design will take, told from its nominal lane before it is begun.

The rule was set against studies of one, two and four alarms ``flood`` in one design (34, 68 and 136 parts): it counts
7, 26 and 117 s of one core for their corners, the runs took 4, 17 and 72 s of two busy ones. Of ten, 340 parts:
1,065 s. Of faults, immunity and spread of four demos it counted 0.3 to 4 times of what was done.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from ..carry.carrier import LINGERS
from ..checks.check import Ask
from ..checks.trial import Trial
from ..circuit.circuit import Circuit
from ..circuit.cost import ABREAST, iterate_cost
from ..quantity import read
from ..run import ITERATES, Observed
from .lanes import axes, settings, tolerances

MOST_EFFORT = 1200.0
"""Seconds of one core, by :mod:`..circuit.cost`, that a study may take: corners, faults, immunity, causes."""
MOST_SPREAD = 3600.0
"""The same for the lanes of a spread, of which the user says how many."""
LEAST_SPREAD = 20
"""Lanes of a spread; they cost less than the corners do."""

HARDER = 1.3  # iterates of a lane at a corner, of the nominal one's
VERTICES, TRIAL_VERTICES = 2, 6  # lanes that a margin, and one with a trial, is tried in with all parts at an end
OF_A_TRIAL = 0.3  # iterates of a trial's lane, of its sequence's
NEAR, COARSE, FULL = 7, 9, 30  # lanes of a search near a known edge, of a coarse one and of one to the resolution
FEW_ROWS = 5  # rows that a trial watches
FAULTY = 2.0  # iterates of a lane with a fault, of the sound one's
ROWS_OF_A_PART, ROWS_OF_AN_ASK = 3, 6  # that are watched, about
CHARGES = 20  # values of the charge that each net is tried with
CROWDED = 30  # multiplications a net in the elimination; in lines of stages it is 4


def corner_effort(circuit: Circuit, asks: Sequence[Ask], nominal: Mapping[str, Observed]) -> dict[str, float]:
    """About how many seconds of one core the worst corners take, by sequence.

    ``nominal`` are the runs of the nominal lane, by sequence.
    """
    tried = [ask for ask in asks if ask.trial is not None and ask.missing is None]
    single = 2 * len(tolerances(circuit.columns))
    lanes = len(settings(circuit.columns)) + single + VERTICES * (len(asks) - len(tried))
    extremes = 2 ** len(axes(circuit.columns))
    lanes += (extremes + TRIAL_VERTICES) * len(tried)
    found = {}
    for sequence, observed in nominal.items():
        iterates = _iterates(observed)
        own = [ask for ask in tried if ask.trial is not None and ask.trial.sequence == sequence]
        each = [_of_trial(circuit, ask.trial, iterates) for ask in own if ask.trial is not None]
        keys = {ask.trial.key: shared for ask, shared in zip(own, each, strict=True) if ask.trial is not None}
        of_trials = NEAR * single * sum(keys.values()) + (COARSE * extremes + FULL * TRIAL_VERTICES) * sum(each)
        found[sequence] = (
            iterates * lanes * iterate_cost(circuit.topology, len(observed.rows))
            + of_trials * iterate_cost(circuit.topology, FEW_ROWS)
        ) / ABREAST
    return found


def spread_lanes(circuit: Circuit, asks: Sequence[Ask], nominal: Mapping[str, Observed], wanted: int) -> int:
    """How many of the random lanes that are wanted may be drawn: a spread of fewer says so by its wider interval."""
    screens = {(ask.trial.key, ask.screen): ask.trial for ask in asks if ask.trial is not None}
    a_lane = 0.0
    for sequence, observed in nominal.items():
        iterates = _iterates(observed)
        looks = sum(_of_trial(circuit, trial, iterates) for trial in screens.values() if trial.sequence == sequence)
        looks *= iterate_cost(circuit.topology, FEW_ROWS)
        a_lane += (iterates * iterate_cost(circuit.topology, len(observed.rows)) + looks) / ABREAST
    return min(wanted, max(LEAST_SPREAD, int(MOST_SPREAD / max(a_lane, 1e-9))))


def faults_beyond(
    circuit: Circuit, nominal: Mapping[str, Observed], loads: int, made: Sequence[tuple[Circuit, int]]
) -> str | None:
    """Why the single faults of a design are too much to be computed, in words; None where they are not.

    ``made`` are the circuits that hold the faults, with the number of their lanes. Before them the sound unit is run
    once for each load and event, to find what causes its alarm.
    """
    efforts = {}
    for sequence, observed in nominal.items():
        alone = loads * (1 + len(circuit.design.sequences[sequence].events)) * iterate_cost(circuit.topology)
        rows = ROWS_OF_A_PART * len(circuit.design.parts)
        faults = sum(-(-lanes // ABREAST) * iterate_cost(each.topology, rows) for each, lanes in made)
        efforts[sequence] = float(observed.results.work[0, 2]) * (alone + FAULTY * faults)
    count = sum(lanes - 1 for _, lanes in made)
    return _too_large("its faults", f"{count} faults", circuit, efforts, nominal)


def immunity_beyond(circuit: Circuit, lanes: int, tried: Observed, sequence: str) -> str | None:
    """Why the charge that trips an alarm is too much to be computed, in words; None where it is not.

    ``lanes`` are all nets with both signs in every corner, ``tried`` a run with a charge.
    """
    iterates = HARDER * float(tried.results.work[:, 2].max())
    each = iterates / ABREAST * iterate_cost(circuit.topology, len(tried.rows))
    efforts = {sequence: lanes * CHARGES * each}
    what = f"{lanes} nets with a sign in a corner"
    return _too_large("its immunity", what, circuit, efforts, {sequence: tried})


def causes_beyond(
    circuit: Circuit, nominal: Mapping[str, Observed], asks: int, changes: int, lanes: int, trials: int, times: int
) -> str | None:
    """Why what caused a change is too much to be computed, in words; None where it is not.

    ``times`` the design is computed with some of its ``changes`` made, in ``lanes`` with ``trials`` of them besides.
    """
    rows = ROWS_OF_AN_ASK * asks
    a_row = iterate_cost(circuit.topology, rows) * -(-lanes // ABREAST)
    a_row += OF_A_TRIAL * FULL * iterate_cost(circuit.topology, FEW_ROWS) * trials / ABREAST
    efforts = {sequence: times * _iterates(observed) * a_row for sequence, observed in nominal.items()}
    return _too_large("its causes", f"{changes} changes in {times} combinations", circuit, efforts, nominal)


def _of_trial(circuit: Circuit, trial: Trial, iterates: float) -> float:
    """Iterates of a trial's lane, of a sequence that takes ``iterates``: where that oscillates for long, no more
    than fall to the time that the trial lasts."""
    before = min(iterates, HARDER * ITERATES * LINGERS)
    share = min(1.0, float(np.max(trial.ends)) / read(circuit.design.sequences[trial.sequence].ends, "s"))
    return OF_A_TRIAL * (before + (iterates - before) * share)


def _iterates(observed: Observed) -> float:
    return HARDER * float(observed.results.work[0, 2])


def beyond(circuit: Circuit, asks: Sequence[Ask], nominal: Mapping[str, Observed]) -> str | None:
    """What is too large for the worst corners to be searched, and what to do, in words; None where it is not."""
    efforts = corner_effort(circuit, asks, nominal)
    return _too_large("its corners", f"{len(asks)} margins", circuit, efforts, nominal)


def _too_large(
    what: str, counted: str, circuit: Circuit, efforts: Mapping[str, float], nominal: Mapping[str, Observed]
) -> str | None:
    total = sum(efforts.values())
    if total <= MOST_EFFORT:
        return None
    longest = max(efforts, key=efforts.__getitem__)
    steps = int(nominal[longest].results.work[0, 0])
    nets = int(circuit.topology.size[0])
    crowded = circuit.topology.update.shape[0] > CROWDED * max(1, nets)
    joined = ", joined crosswise," if crowded else ""
    return (
        f"too large for {what}: {counted} of {len(circuit.design.parts)} parts and {nets} nets{joined} "
        f"would take about {total / 60.0:.0f} minutes of one processor core, {MOST_EFFORT / 60.0:.0f} are allowed; "
        f"divide the design, or end sequence {longest} sooner ({steps} steps, {efforts[longest] / total:.0%} of it)"
    )
