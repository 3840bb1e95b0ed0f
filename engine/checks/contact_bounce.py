"""Check 17: is a bouncing contact ignored, and is a true event of a contact accepted?

Two trials in stand-by. A burst of bounces that ends where it began is made ever longer until there is an alarm; an
event that begins with the contact's bounce is made ever shorter until there is none.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import Timeline
from ..design.part import Part
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..run import Observed
from .alarm_state import TOLD_BY, alarm_states, settling, standby
from .check import Apart, Ask, Check, Judged, Mask, ratio, unknown
from .contact_events import contacts, longest_bounce, states
from .debounced import LATER, MISSING, Debounced
from .seen import Seen
from .trial import Trial
from .view import View

SETTLE = 0.2  # s after the event at which the last look is taken, where the requirement gives none
TIMES = 4  # interruptions of a burst, where the requirement gives none
BURSTS = 3e-3, 100.0  # of the trial, in lengths of the longest bounce
EVENTS = 30.0, 3e-3  # of the trial, in lengths of the shortest true event


def bounce_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every contact whose bounce a requirement wants to be ignored."""
    for requirement, part in contacts(check, view):
        yield _bounce_ask(check, view, requirement, part)


def acceptance_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every contact whose events a requirement wants to be accepted."""
    for requirement, part in contacts(check, view):
        yield _acceptance_ask(check, view, requirement, part)


def _trial(
    view: View,
    requirement: Requirement,
    sequence: str,
    key: str,
    drive: Callable[[Timeline, Floats, float], None],
    longest: float,
    knobs: tuple[float, float],
    accepts: bool,
) -> Trial:
    """``drive(line, knob, over)`` moves the contact so that its event is over at the same instant in every lane."""
    told_by = alarm_states(view)
    settle = view.extra(requirement, "settle", "s") or settling(view, told_by, sequence, SETTLE)
    over = 1e-3 * longest + longest

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        came = np.any([state.tripped(lanes, observed, over, settle) for state in told_by], axis=0)
        return np.asarray(came != accepts)

    return Trial(
        key=key,
        sequence=sequence,
        start=standby(view, sequence),
        drive=lambda line, knob: drive(line, knob, over),
        ends=over + settle,
        safe=knobs[0],
        severe=knobs[1],
        rows=tuple(row for state in told_by for row in state.watch(over, settle)),
        gives_in=gives_in,
        unit="" if accepts else "s",
    )


def _bounce_ask(check: Check, view: View, requirement: Requirement, part: Part) -> Ask:
    stage = view.design.stage_of(part.ref)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    longest = longest_bounce(view, requirement, part)
    if longest is None or longest <= 0.0:
        missing = f"bounce of {part.ref}, or max in the requirement contact_bounce"
        return unknown(check, stage.name, part.ref, sequence, required, missing)
    if not alarm_states(view, stage):
        return unknown(check, stage.name, part.ref, sequence, required, TOLD_BY)
    times = int(view.extra(requirement, "times", "") or view.customary("interruptions of a bounce", TIMES, ""))
    active, rest = states(view, sequence, part)

    def drive(line: Timeline, knob: Floats, over: float) -> None:
        line.bounce(part.ref, over - knob, active, knob, times)
        line.set_part(part.ref, over, rest)

    knobs = BURSTS[0] * longest, BURSTS[1] * longest
    trial = _trial(view, requirement, sequence, f"bounce {part.ref}", drive, knobs[1], knobs, accepts=False)

    debounced = Debounced.find(view, sequence)

    def judge(seen: Seen) -> Judged:
        demand = np.full(seen.lanes.count, longest)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        words = check.words
        hand = None if debounced is None else 1.0 - longest / debounced.rejects(seen, sequence, times)
        judged = ratio(
            demand, edge.knob, [(edge.missing, words["missing"]), (edge.always, words["always"])], hand, _why(hand)
        )
        outcomes = (*judged.outcomes, (edge.never, words["immune"]))
        return replace(judged, margin=np.where(edge.never, 1.0, judged.margin), outcomes=outcomes)

    screen = min(longest / (1.0 - required), knobs[1]) if required < 1.0 else None
    rows = () if debounced is None else debounced.rows
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows, trial, screen)


def _why(hand: Floats | None) -> Apart:
    """Why there is no hand value, and where."""
    return ((None, MISSING),) if hand is None else ((np.isnan(hand), LATER),)


def _acceptance_ask(check: Check, view: View, requirement: Requirement, part: Part) -> Ask:
    stage = view.design.stage_of(part.ref)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    if requirement.min is None:
        missing = f"min, the shortest true event, in the requirement acceptance of {part.ref}"
        return unknown(check, stage.name, part.ref, sequence, required, missing)
    if not alarm_states(view, stage):
        return unknown(check, stage.name, part.ref, sequence, required, TOLD_BY)
    shortest = view.limit(requirement, "min", "s")
    if shortest <= 0.0:
        raise CircuitError(f"requirement acceptance of {part.ref}, min: {requirement.min} cannot be; write a time")
    bounce = longest_bounce(view, requirement, part) or 0.0
    times = int(view.extra(requirement, "times", "") or view.customary("interruptions of a bounce", TIMES, ""))
    active, rest = states(view, sequence, part)

    def drive(line: Timeline, knob: Floats, over: float) -> None:
        begin = over - 1.0 / knob
        if bounce > 0.0:
            line.bounce(part.ref, begin, active, np.minimum(bounce, 1.0 / knob), times)
        else:
            line.set_part(part.ref, begin, active)
        line.set_part(part.ref, over, rest)

    knobs = 1.0 / (EVENTS[0] * shortest), 1.0 / (EVENTS[1] * shortest)
    trial = _trial(
        view, requirement, sequence, f"acceptance {part.ref}", drive, EVENTS[0] * shortest, knobs, accepts=True
    )

    debounced = Debounced.find(view, sequence)

    def judge(seen: Seen) -> Judged:
        capability = np.full(seen.lanes.count, shortest)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), capability=capability)
        words = check.words
        hand = None if debounced is None else 1.0 - debounced.accepts(seen, sequence, bounce) / shortest
        outcomes = [(edge.missing, words["missing"]), (edge.always, words["always"])]
        return ratio(1.0 / edge.knob, capability, outcomes, hand, _why(hand))

    rows = () if debounced is None else debounced.rows
    screen = 1.0 / (shortest * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows, trial, screen)


CHECKS = (
    Check(
        number=17,
        slug="contact_bounce",
        title="contact bounce",
        unit="s",
        required=0.3,
        formula="D = longest bounce of the contact, C = longest burst of bounces that raises no alarm",
        asks=bounce_asks,
        reads={"of": "S1", "max": "2 ms", "times": "4", "settle": "0.1 s"},
        words={
            "missing": "stand-by never came",
            "always": "there is an alarm with the shortest burst, or by itself",
            "immune": "no burst raises an alarm, however long",
        },
        worst="small capacitor, low threshold",
        by_hand="2 n t, t the pieces with which R C of the debounce just comes to V_th: V (1-a)(1-(ab)^n)/(1-ab) ="
        " V_th, a = exp(-t/RC), b likewise with the pull resistor",
        hand_source="closed form of R and C, V_th as seen in the sequence",
        accuracy=0.1,
        leaves_out="what follows the debounce",
    ),
    Check(
        number=17,
        slug="acceptance",
        title="acceptance",
        unit="s",
        required=0.3,
        formula="D = shortest event of the contact that raises the alarm, C = shortest true event",
        asks=acceptance_asks,
        reads={"of": "S1", "min": "200 ms", "times": "4", "settle": "0.1 s"},
        words={
            "missing": "stand-by never came",
            "always": "never fired: not by an event of thirty times that length either",
        },
        worst="large capacitor, high threshold, low supply",
        by_hand="bounce + R C ln(V / (V - V_th)) of the debounce, half of the bounce counted",
        hand_source="closed form of R and C, V_th as seen in the sequence",
        accuracy=0.1,
        leaves_out="what follows the debounce",
    ),
)
