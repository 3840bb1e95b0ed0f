"""How much computing the worst corners of a design will take, told from its nominal lane before they are begun.

The rule was set against studies of one, two and four alarms ``flood`` in one design (34, 68 and 136 parts): it counts
7, 26 and 117 s of one core for them, the runs took 4, 17 and 72 s of two busy ones. Of ten, 340 parts: 1,065 s.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from ..checks.check import Ask
from ..circuit.circuit import Circuit
from ..circuit.cost import ABREAST, iterate_cost
from ..run import Observed
from .lanes import axes, settings, tolerances

MOST_EFFORT = 1200.0
"""Seconds of one core, by :mod:`..circuit.cost`, that the worst corners of a design may take."""

HARDER = 1.3  # iterates of a lane at a corner, of the nominal one's
VERTICES, TRIAL_VERTICES = 2, 6  # lanes that a margin, and one with a trial, is tried in with all parts at an end
OF_A_TRIAL = 0.3  # iterates of a trial's lane, of its sequence's
NEAR, COARSE, FULL = 7, 9, 30  # lanes of a search near a known edge, of a coarse one and of one to the resolution
FEW_ROWS = 5  # rows that a trial watches
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
        iterates = HARDER * float(observed.results.work[0, 2])
        own = [ask for ask in tried if ask.trial is not None and ask.trial.sequence == sequence]
        keys = {ask.trial.key for ask in own if ask.trial is not None}
        of_trials = NEAR * single * len(keys) + (COARSE * extremes + FULL * TRIAL_VERTICES) * len(own)
        found[sequence] = (
            iterates
            / ABREAST
            * (
                lanes * iterate_cost(circuit.topology, len(observed.rows))
                + OF_A_TRIAL * of_trials * iterate_cost(circuit.topology, FEW_ROWS)
            )
        )
    return found


def beyond(circuit: Circuit, asks: Sequence[Ask], nominal: Mapping[str, Observed]) -> str | None:
    """What is too large for the worst corners to be searched, and what to do, in words; None where it is not."""
    efforts = corner_effort(circuit, asks, nominal)
    total = sum(efforts.values())
    if total <= MOST_EFFORT:
        return None
    longest = max(efforts, key=efforts.__getitem__)
    steps = int(nominal[longest].results.work[0, 0])
    nets = int(circuit.topology.size[0])
    crowded = circuit.topology.update.shape[0] > CROWDED * max(1, nets)
    joined = ", joined crosswise," if crowded else ""
    return (
        f"too large for its corners: {len(asks)} margins of {len(circuit.design.parts)} parts and {nets} nets{joined} "
        f"would take about {total / 60.0:.0f} minutes of one processor core, {MOST_EFFORT / 60.0:.0f} are allowed; "
        f"divide the design, or end sequence {longest} sooner ({steps} steps, {efforts[longest] / total:.0%} of it)"
    )
