"""Check 14, re-power: does the supply that comes back to a rail lingering at 1 to 2 V trip the latch?

As check 6, but not from an empty circuit: from stand-by the supply goes down to 1 V, later to 2 V, and comes back ever
faster each time.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import Timeline
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, slew
from ..run import Observed
from .alarm_state import AlarmState, standby
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .complementary_latch import Latch, latches
from .seen import Seen
from .supply_slew import UNCOUPLED, WATCHED, connection, slew_by_hand
from .trial import Trial
from .view import View

LINGERING = (1.0, 2.0)  # V
FALL = 10e-3  # s in which the supply goes down
LINGERS = 50e-3  # s
SLOWEST, FASTEST = 1.0, 1e-8  # s, rise times of the trial
SETTLE = 0.1  # s after the rise at which the last look is taken


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch, where a requirement asks for it."""
    if any(requirement.check == check.slug for requirement in view.design.requirements):
        for latch in latches(view):
            yield _ask(check, view, latch)


def _ask(check: Check, view: View, latch: Latch) -> Ask:
    stage, npn, pnp = latch.stage, latch.npn, latch.pnp
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    sequence = view.sequence(requirement, "snap")
    required = view.required(check.slug, check.required, requirement)
    lowest = view.design.conditions.levels("supply")
    if lowest is None or lowest.min <= LINGERING[-1]:
        missing = f"a supply above {LINGERING[-1]:g} V under conditions"
        return unknown(check, stage.name, npn.ref, sequence, required, missing)
    at, rise = connection(view, sequence)
    for lingers in LINGERING:
        view.customary(f"rail lingers at {lingers:g} V", lingers, "V")
    steepest = slew(latch.rail, Anchor(at), Anchor(at + rise + WATCHED))
    state = AlarmState(stage.name, latch, None)
    each = FALL + LINGERS + SLOWEST + SETTLE
    ups = [k * each + FALL + LINGERS + SLOWEST for k in range(len(LINGERING))]
    fastest = [slew(latch.rail, Anchor(up - SLOWEST - 0.5 * LINGERS), Anchor(up + WATCHED)) for up in ups]

    def drive(line: Timeline, knob: Floats) -> None:
        full = line.supply.values[-1]
        for volts, up in zip(LINGERING, ups, strict=True):
            line.move_supply(up - SLOWEST - LINGERS - FALL, volts, FALL)
            line.move_supply(up - 1.0 / knob, full, 1.0 / knob)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        return np.asarray(np.any([state.tripped(lanes, observed, up, SETTLE) for up in ups], axis=0))

    trial = Trial(
        key=f"repower {stage.name}",
        sequence=sequence,
        start=standby(view, sequence),
        drive=drive,
        ends=ups[-1] + SETTLE,
        safe=1.0 / SLOWEST,
        severe=1.0 / FASTEST,
        rows=(*fastest, *(row for up in ups for row in state.watch(up, SETTLE)), *state.lifts()),
        gives_in=gives_in,
        spare=state.spare,
    )

    def judge(seen: Seen) -> Judged:
        demand = seen.value(steepest, sequence)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        words = check.words
        capability = np.max([edge.values[row] for row in fastest], axis=0)
        hand = slew_by_hand(latch, seen, demand, LINGERING[0])
        outcomes = [(edge.missing, words["missing"]), (edge.always, words["always"])]
        judged = ratio(demand, capability, outcomes, hand, UNCOUPLED if hand is None else "")
        margin = np.where(edge.never, 1.0, judged.margin)
        return replace(judged, margin=margin, outcomes=(*judged.outcomes, (edge.never, words["immune"])))

    screen = 1.0 / (rise * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, npn.ref, (sequence,), required, judge, (steepest,), trial, screen)


CHECKS = (
    Check(
        number=14,
        slug="repower",
        title="re-power on a lingering rail",
        unit="V/s",
        required=0.2,
        formula="D = slew of the latch's supply as the supply comes, C = largest that does not trip it from 1 V or 2 V",
        asks=asks,
        reads={"of": "Q4"},
        words={
            "missing": "stand-by never came",
            "always": "trips however slowly the supply comes back",
            "immune": "immune at any slew",
        },
        worst="hot, high supply",
        by_hand="s of V_BE = s R C_c (1 - exp(-(V - 1 V)/(s R C))): one base alone, rising from 1 V",
        hand_source="closed form of R and C",
        accuracy=0.1,
        leaves_out="other base, filters before",
    ),
)
