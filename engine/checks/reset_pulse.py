"""Check 5, reset pulse: does the shortest true reset end the alarm?

The trial begins in alarm: the event of the reset contact is made ever shorter until the alarm goes on after it.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import Timeline
from ..design.part import Part
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor
from ..run import Observed
from .alarm_state import TOLD_BY, WAIT, alarm_states
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .contact_events import contacts, states
from .emptied import Emptied
from .latch import NEVER_SET, latched, not_set
from .seen import Seen
from .trial import Trial
from .view import View

SETTLE = 0.1  # s after the reset at which the alarm must be over, where the requirement gives none
LONGEST, SHORTEST = 30.0, 3e-3  # resets of the trial, in lengths of the shortest true one


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every contact that a requirement names as one that resets."""
    for requirement, part in contacts(check, view):
        yield _ask(check, view, requirement, part)


def _ask(check: Check, view: View, requirement: Requirement, part: Part) -> Ask:
    stage = view.design.stage_of(part.ref)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    if requirement.min is None:
        missing = f"min, the shortest true reset, in the requirement reset_pulse of {part.ref}"
        return unknown(check, stage.name, part.ref, sequence, required, missing)
    told_by = alarm_states(view, stage)
    if not told_by:
        return unknown(check, stage.name, part.ref, sequence, required, TOLD_BY)
    shortest = view.limit(requirement, "min", "s")
    if shortest <= 0.0:
        raise CircuitError(f"requirement reset_pulse of {part.ref}, min: {requirement.min} cannot be; write a time")
    settle = view.extra(requirement, "settle", "s") or view.customary(WAIT, SETTLE, "s")
    over = (1.0 + 1e-3) * LONGEST * shortest
    active, rest = states(view, sequence, part)
    start = latched(view, stage, sequence)
    last = Anchor(over + settle)
    missing = not_set(view, stage, sequence)

    def drive(line: Timeline, knob: Floats) -> None:
        # Every reset is over at the same instant, so that all are looked at equally soon after.
        line.set_part(part.ref, over - 1.0 / knob, active)
        line.set_part(part.ref, over, rest)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        return np.asarray(np.any([state.alarmed(lanes, observed, last) for state in told_by], axis=0))

    trial = Trial(
        key=f"reset {part.ref}",
        sequence=sequence,
        start=start,
        drive=drive,
        ends=over + settle,
        safe=1.0 / (LONGEST * shortest),
        severe=1.0 / (SHORTEST * shortest),
        rows=tuple(row for state in told_by for row in state.probes(last)),
        gives_in=gives_in,
    )

    emptied = Emptied.find(view, part, told_by[0].latch, start)

    def judge(seen: Seen) -> Judged:
        capability = np.full(seen.lanes.count, shortest)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), capability=capability)
        # Without an alarm there is nothing to reset, and every reset seems to do.
        observed = seen.observed[sequence]
        was = np.any([state.alarmed(seen.lanes, observed, start) for state in told_by], axis=0)
        return ratio(
            1.0 / edge.knob,
            capability,
            [(edge.missing, missing), (~was, check.words["unset"]), (edge.always, check.words["always"])],
            None if emptied is None else 1.0 - emptied.seconds(seen, sequence) / shortest,
            f"no latch and capacitor that {part.ref} empties, through one resistor at most" if emptied is None else "",
        )

    rows = tuple(row for state in told_by for row in state.probes(start))
    rows += () if emptied is None else emptied.rows
    screen = 1.0 / (shortest * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows, trial, screen)


CHECKS = (
    Check(
        number=5,
        slug="reset_pulse",
        title="reset pulse",
        unit="s",
        required=0.5,
        formula="D = shortest event of the contact that ends the alarm, C = shortest true reset",
        asks=asks,
        reads={"of": "S2", "min": "50 ms", "settle": "0.1 s"},
        words={
            "unset": NEVER_SET,
            "always": "did not let go: not by a reset of thirty times that length either",
        },
        worst="high supply, hot",
        by_hand="R C ln((V - V_low) / (V_hold - V_low)): the contact empties C to where the latch lets go,"
        " V_hold = 0.8 V + (V - 0.8 V) I_hold / I_latch",
        hand_source="closed form of R and C, I_hold by hand as in latch hold",
        accuracy=0.2,
        leaves_out="gains, the latch's draw",
    ),
)
