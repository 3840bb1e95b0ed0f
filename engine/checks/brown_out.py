"""Check 23: does a dip of the supply leave the alarm as it was, set or at rest?

The trial begins with the dip of the sequence and makes it ever longer, until the state after it is another one than
before. Where the dip is not deep enough to change anything, no length is too long.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import DEFAULT_EDGE, Timeline
from ..design.part import Stage
from ..design.requirement import Requirement
from ..design.sequence import Dip
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, level
from ..quantity import read
from ..run import Observed
from .alarm_state import TOLD_BY, AlarmState, alarm_states
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .latch import hold_trial_of
from .seen import Seen
from .trial import Trial
from .view import View

SHORTEST, LONGEST = 0.01, 30.0  # dips of the trial, in lengths of the dip of the sequence
SETTLE = 0.1  # s after the dip at which the state is looked at, where the requirement gives none
BEFORE = 1e-6  # s before the dip, when the state is as it was


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every latch (or the load), where a sequence has a dip or a requirement asks for one."""
    asked = [r for r in view.design.requirements if r.check == check.slug]
    dips = [name for name, s in view.design.sequences.items() if any(isinstance(e, Dip) for e in s.events)]
    if not asked and not dips:
        return
    states = alarm_states(view)
    stages = view.design.stages
    if not states and stages:
        sequence = view.sequence(asked[0] if asked else None, *dips)
        yield unknown(check, stages[0].name, "supply", sequence, _required(check, view, None), TOLD_BY)
    for state in states:
        stage, part = _place(view, state)
        requirement = view.requirement(check.slug, part, stage.name)
        yield _ask(check, view, state, stage, part, requirement, view.sequence(requirement, *dips))


def _place(view: View, state: AlarmState) -> tuple[Stage, str]:
    if state.latch is not None:
        return state.latch.stage, state.latch.pnp.ref
    return view.design.stage_of(state.name), state.name


def _required(check: Check, view: View, requirement: Requirement | None) -> float:
    return view.required(check.slug, check.required, requirement)


def _ask(
    check: Check,
    view: View,
    state: AlarmState,
    stage: Stage,
    part: str,
    requirement: Requirement | None,
    sequence: str,
) -> Ask:
    required = _required(check, view, requirement)
    dip = next((e for e in view.design.sequences[sequence].events if isinstance(e, Dip)), None)
    if dip is None:
        missing = f"an event dip in sequence {sequence}"
        return unknown(check, stage.name, part, sequence, required, missing)
    at, to, during = read(dip.at, "s"), read(dip.to, "V"), read(dip.for_, "s")
    edge_time = min(DEFAULT_EDGE if dip.edge is None else read(dip.edge, "s"), during * SHORTEST)
    settle = view.extra(requirement, "settle", "s") or SETTLE
    over = BEFORE + LONGEST * during + edge_time
    first, last = Anchor(0.5 * BEFORE), Anchor(over + settle)

    def drive(line: Timeline, knob: Floats) -> None:
        # All dips end at the same instant, so that all are looked at equally soon after.
        line.excursion(BEFORE + LONGEST * during - knob, to, knob, edge_time)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        was, then = (state.alarmed(lanes, observed, at) for at in (first, last))
        return np.asarray(was != then)

    trial = Trial(
        key=f"brown-out {state.name}",
        sequence=sequence,
        start=Anchor(at),
        drive=drive,
        ends=over + settle,
        safe=SHORTEST * during,
        severe=LONGEST * during,
        rows=(*state.probes(first), *state.probes(last)),
        gives_in=gives_in,
    )
    feed = view.supply_current
    drawn = None if feed is None else level(feed, Anchor(at))

    def judge(seen: Seen) -> Judged:
        demand = np.full(seen.lanes.count, during)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        hand = None if drawn is None else _hand(view, state, seen, seen.value(drawn, sequence), during)
        words = check.words
        outcomes = [(edge.missing, words["missing"]), (edge.always, words["always"])]
        judged = ratio(demand, edge.knob, outcomes, hand)
        margin = np.where(edge.never, 1.0, judged.margin)
        outcomes_seen = (*judged.outcomes, (edge.never, words["immune"]))
        return Judged(margin, demand, judged.capability, outcomes=outcomes_seen, hand=judged.hand)

    screen = during / (1.0 - required) if required < 1.0 - 1.0 / LONGEST else None
    rows = () if drawn is None else (drawn,)
    return Ask(check, stage.name, part, (sequence,), required, judge, rows, trial, screen)


def _hand(view: View, state: AlarmState, seen: Seen, drawn: Floats, during: float) -> Floats | None:
    """1 - t I/(C_f (V - V_hold)), where a filter capacitor feeds what the unit draws during the dip."""
    if state.latch is None or SUPPLY not in seen.lanes:
        return None
    capacitor = view.role(state.latch.stage, "filter_capacitor")
    trial = hold_trial_of(state.latch)
    edge = seen.edges.get(trial.key)
    if capacitor is None or edge is None:
        return None
    spare = seen.lanes[SUPPLY] - edge.values[trial.rows[-1]]
    held = seen.lanes[capacitor.ref, "value"] * spare
    return np.where(held > 0.0, 1.0 - during * drawn / np.where(held > 0.0, held, 1.0), -1.0)


CHECKS = (
    Check(
        number=23,
        slug="brown_out",
        title="brown-out",
        unit="s",
        required=0.3,
        formula="D = length of the dip, C = longest dip of that depth that leaves the alarm as it was",
        worst="low supply, cold, small filter capacitor",
        by_hand="1 - t I / (C_f (V - V_hold)), I what the unit draws before the dip",
        asks=asks,
        words={
            "missing": "the dip never came",
            "always": "the alarm changes with the shortest dip, or by itself",
            "immune": "a dip to there changes nothing, however long",
        },
    ),
)
