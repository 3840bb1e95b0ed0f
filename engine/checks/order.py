"""Check 15: does one event come before another, both timers at opposite ends of their tolerance?

Both instants are read from the sequence; the corners find the opposite ends. Where the first event keeps the second
from coming at all there is nothing to compare it with: a requirement may then name the part that sets the first timer,
and a trial makes it larger until the second event wins.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import Timeline
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor
from ..run import Observed
from .check import Ask, Check, Judged, Mask, ratio
from .duration import Timing, instant
from .seen import Seen
from .trial import Trial
from .view import View

MOST = 30.0  # times its value to which the trial takes the part of the first timer, and its inverse
BEFORE = 1e-3  # s before the instant from which time counts, at which the trial begins


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of an order."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    subject, first_text, last_text = requirement.of, requirement.from_, requirement.to
    if subject is None or first_text is None or last_text is None:
        raise CircuitError(
            'requirement order: write "of", "from" (the event that must come first) and "to", for example "K1",'
            ' "K1 in" and "LS1 on"'
        )
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    since = Anchor() if requirement.at is None else view.anchor(requirement.at, sequence)
    first, last = view.anchor(first_text, sequence, since), view.anchor(last_text, sequence, since)
    timers = [_timer(view, requirement, key, since, end) for key, end in (("first", first), ("second", last))]

    def judge(seen: Seen) -> Judged:
        began, sooner, later = (instant(seen, anchor, sequence) for anchor in (since, first, last))
        outcomes = [
            (~np.isfinite(when), check.words["never"].format(what=text))
            for when, text in ((began, requirement.at), (sooner, first_text), (later, last_text))
        ]
        hand, apart = None, "the requirement names no first_timer and second_timer"
        one, other = timers
        if one is not None and other is not None:
            hand, apart = 1.0 - one.by_hand(seen, sequence) / other.by_hand(seen, sequence), ""
        return ratio(sooner - began, later - began, outcomes, hand, apart)

    if "vary" in requirement.extras:
        return _trial_ask(check, view, requirement, sequence, required, since, first)
    rows = tuple(anchor.row for anchor in (since, first, last) if anchor.row is not None)
    rows += tuple(row for timer in timers if timer is not None for row in timer.rows)
    return Ask(check, view.stage_named(subject), subject, (sequence,), required, judge, tuple(dict.fromkeys(rows)))


def _trial_ask(
    check: Check, view: View, requirement: Requirement, sequence: str, required: float, since: Anchor, first: Anchor
) -> Ask:
    """The ask of a requirement that names the part that sets the first timer."""
    subject, key = str(requirement.of), (str(requirement.extras["vary"]), "value")
    if key not in {column.key for column in view.circuit.columns}:
        raise CircuitError(
            f"requirement order, field vary: '{key[0]}' is no part with a value; name the resistor or the capacitor"
            " that sets the first timer"
        )
    begin = 0.0 if since.row is not None else max(0.0, since.by - BEFORE)
    start = since if since.row is not None else Anchor(since.by - begin)
    events = [view.anchor(text, sequence, start) for text in (str(requirement.from_), str(requirement.to))]
    sooner, later = (anchor.row for anchor in events)
    if sooner is None or later is None or first.row is None:
        raise CircuitError('requirement order: "from" and "to" must be events such as "K1 in" where "vary" is given')

    def drive(line: Timeline, knob: Floats) -> None:
        """What the sequence does is all that happens."""

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        one, other = observed.time(sooner), observed.time(later)
        return np.asarray(~np.isfinite(one) | (other <= one))

    trial = Trial(
        key=f"order {subject} {requirement.from_} {requirement.to}",
        sequence=sequence,
        start=Anchor(begin),
        drive=drive,
        ends=view.ends(sequence) - begin,
        safe=1.0 / MOST,
        severe=MOST,
        rows=(sooner, later),
        gives_in=gives_in,
        onward=True,
        vary=lambda lanes, knob: lanes.replaced({key: lanes[key] * knob}),
    )

    def judge(seen: Seen) -> Judged:
        began, done = (instant(seen, anchor, sequence) for anchor in (since, first))
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=done - began)
        outcomes = [
            (~np.isfinite(began), check.words["never"].format(what=requirement.at)),
            (edge.always, check.words["always"].format(what=requirement.to, part=key[0])),
            (~np.isfinite(done), check.words["never"].format(what=requirement.from_)),
        ]
        apart = "the first event keeps the second from coming: its time is only to be had by the trial"
        return ratio(done - began, edge.knob * (done - began), outcomes, apart=apart)

    rows = tuple(anchor.row for anchor in (since, first) if anchor.row is not None)
    screen = 1.0 / (1.0 - required) if required < 1.0 else None
    stage = view.stage_named(subject)
    return Ask(check, stage, subject, (sequence,), required, judge, tuple(dict.fromkeys(rows)), trial, screen)


def _timer(view: View, requirement: Requirement, key: str, since: Anchor, end: Anchor) -> Timing | None:
    """The timing pair of the stage that a field of the requirement names; None where it names none."""
    name = requirement.extras.get(f"{key}_timer")
    if name is None:
        return None
    stage = next((stage for stage in view.design.stages if stage.name == name), None)
    if stage is None or not {"timing_resistor", "timing_capacitor"} <= view.roles_of(stage).keys():
        raise CircuitError(
            f"requirement order, field {key}_timer: '{name}' is no stage with the roles timing_resistor and"
            " timing_capacitor; name such a stage or leave the field out"
        )
    return Timing(view, stage, since, end)


CHECKS = (
    Check(
        number=15,
        slug="order",
        title="order of events",
        unit="s",
        required=0.1,
        formula="D = time until the event that must come first, C = time until the other, both since `at`; with `vary`"
        " C = D x how much larger that part may be",
        asks=asks,
        reads={
            "of": "K1",
            "from": "K1 in",
            "to": "LS1 on",
            "at": "10 s",
            "first_timer": "entry",
            "second_timer": "exit",
            "vary": "C1",
        },
        worst="both timers at opposite ends of their tolerance",
        by_hand="R C ln(V_inf / (V_inf - V_th)) of the first timer over that of the second",
        accuracy=0.05,
        leaves_out="load of C, other delays",
        words={"never": "'{what}' never came", "always": "'{what}' comes first, however small {part} is"},
    ),
)
