"""Check 23: does a dip of the supply leave the alarm as it was, set or at rest?

Two trials begin with the dip of the sequence and make it ever longer, or ever deeper, until the state after it is
another one than before. Where the dip is not deep enough to change anything, no length is too long.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import DEFAULT_EDGE, Timeline
from ..design.part import Stage
from ..design.requirement import Requirement
from ..design.sequence import Dip
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor
from ..quantity import read
from ..run import Observed
from .alarm_state import TOLD_BY, WAIT, AlarmState, alarm_states
from .check import Apart, Ask, Check, Judged, Mask, ratio, unknown
from .fed_latch import HOLDS_ON, NOT_FED, Fed
from .seen import Seen
from .trial import Trial
from .view import View

SHORTEST, LONGEST = 0.01, 30.0  # dips of the trial, in lengths of the dip of the sequence
SHALLOW = 0.01  # of the supply, least depth of the trial
SETTLE = 0.1  # s after the dip at which the state is looked at, where the requirement gives none
BEFORE = 1e-6  # s before the dip, when the state is as it was


def time_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every latch (or the load), where a sequence has a dip or a requirement asks for one."""
    yield from _asks(check, view, deeper=False)


def depth_asks(check: Check, view: View) -> Iterator[Ask]:
    """As :func:`time_asks`."""
    yield from _asks(check, view, deeper=True)


def _asks(check: Check, view: View, deeper: bool) -> Iterator[Ask]:
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
        yield _ask(check, view, state, stage, part, requirement, view.sequence(requirement, *dips), deeper)


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
    deeper: bool,
) -> Ask:
    required = _required(check, view, requirement)
    dip = next((e for e in view.design.sequences[sequence].events if isinstance(e, Dip)), None)
    if dip is None:
        missing = f"an event dip in sequence {sequence}"
        return unknown(check, stage.name, part, sequence, required, missing)
    at = read(dip.at, "s")
    to = view.noted("dip to", read(dip.to, "V"), "V", f"sequence {sequence}")
    during = view.noted("length of the dip", read(dip.for_, "s"), "s", f"sequence {sequence}")
    edge_time = min(DEFAULT_EDGE if dip.edge is None else read(dip.edge, "s"), during * SHORTEST)
    settle = view.extra(requirement, "settle", "s") or view.customary(WAIT, SETTLE, "s")
    knobs = (SHALLOW, 1.0) if deeper else (SHORTEST * during, LONGEST * during)
    over = BEFORE + (during if deeper else knobs[1]) + edge_time
    first, last = Anchor(0.5 * BEFORE), Anchor(over + settle)

    def drive(line: Timeline, knob: Floats) -> None:
        if deeper:
            line.excursion(BEFORE, line.supply.values[-1] * (1.0 - knob), during, edge_time)
        else:
            # All dips end at the same instant, so that all are looked at equally soon after.
            line.excursion(BEFORE + knobs[1] - knob, to, knob, edge_time)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        was, then = (state.alarmed(lanes, observed, at) for at in (first, last))
        return np.asarray(was != then)

    trial = Trial(
        key=f"brown-out {'deeper' if deeper else 'longer'} {state.name}",
        sequence=sequence,
        start=Anchor(at),
        drive=drive,
        ends=over + settle,
        safe=knobs[0],
        severe=knobs[1],
        rows=(*state.probes(first), *state.probes(last)),
        gives_in=gives_in,
        unit="%" if deeper else "s",
    )
    fed = Fed.find(view, state, Anchor(at))

    def judge(seen: Seen) -> Judged:
        supply = seen.lanes[SUPPLY] if SUPPLY in seen.lanes else np.zeros(seen.lanes.count)
        demand = np.maximum(0.0, supply - to) if deeper else np.full(seen.lanes.count, during)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        hand = None if fed is None else fed.depth(seen, sequence, during) if deeper else fed.seconds(seen, sequence, to)
        hand = None if hand is None else 1.0 - demand / hand
        apart: Apart = ((None, NOT_FED),) if hand is None else ((np.isnan(hand), HOLDS_ON),)
        words = check.words
        outcomes = [(edge.always, words["always"])]
        judged = ratio(demand, edge.knob * (supply if deeper else 1.0), outcomes, hand, apart)
        margin = np.where(edge.never, 1.0, judged.margin)
        return replace(judged, margin=margin, outcomes=(*judged.outcomes, (edge.never, words["immune"])))

    screen = during / (1.0 - required) if required < 1.0 - 1.0 / LONGEST and not deeper else None
    rows = () if fed is None else fed.rows
    return Ask(check, stage.name, part, (sequence,), required, judge, rows, trial, screen)


WORDS = {
    "always": "the alarm changes with the least dip, or by itself",
    "immune": "no dip of that kind changes the alarm",
}
CHECKS = (
    Check(
        number=23,
        slug="brown_out",
        title="brown-out",
        unit="s",
        required=0.3,
        formula="D = length of the dip, C = longest dip of that depth that leaves the alarm as it was",
        asks=time_asks,
        reads={"of": "Q4", "settle": "0.2 s"},
        words=WORDS | {"immune": "a dip to there changes nothing, however long"},
        worst="low supply, cold, small filter capacitor",
        by_hand="t / (C_f (V - V_hold) / I) behind a diode, else t / (R_f C_f ln((V - V_dip) / (V_hold - V_dip))); I"
        " the mean of the latch's current, V_hold = 0.8 V + (V - 0.8 V) I_hold / I_latch",
        hand_source="closed form of R and C, I_hold by hand as in latch hold",
        accuracy=0.2,
        leaves_out="gains, other loads of C",
    ),
    Check(
        number=23,
        slug="brown_out_depth",
        title="brown-out depth",
        unit="V",
        required=0.3,
        formula="D = depth of the dip, C = deepest dip of that length that leaves the alarm as it was",
        asks=depth_asks,
        reads={"of": "Q4", "settle": "0.2 s"},
        words=WORDS | {"immune": "a dip of that length changes nothing, however deep"},
        worst="low supply, cold, small filter capacitor",
        by_hand="depth / ((V - V_hold) / (1 - exp(-t / R_f C_f))), V_hold = 0.8 V + (V - 0.8 V) I_hold / I_latch",
        hand_source="closed form of R and C, I_hold by hand as in latch hold",
        accuracy=0.2,
        leaves_out="gains, other loads of C",
    ),
)
