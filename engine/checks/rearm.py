"""Check 14: how soon after an alarm is the design ready for the next one, and is that one as long as the first?

The trial goes on from the end of the alarm, rests ever shorter, and then does once more what the sequence did; the
second alarm must come and, where a duration is required, last as long as that says.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import Timeline, apply
from ..design.part import Part
from ..design.requirement import Requirement
from ..design.sequence import ConnectSupply, DisconnectSupply, Event
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row
from ..quantity import read
from ..run import Observed
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .recovery import MISSING, Recovery
from .seen import Seen
from .trial import Trial
from .view import View

RESTS = 4.0, 1.0 / 64.0  # of the trial, in the time allowed
AFTER = 1e-6  # s
CHANGE = 0.1  # by which the second alarm may differ from the first, where the requirement does not say


def rearm_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement; it names the load and the time allowed."""
    for requirement, part in _loads(check, view):
        yield _rearm_ask(check, view, requirement, part)


def repeat_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement; it names the load and a sequence with two alarms."""
    for requirement, part in _loads(check, view):
        yield _repeat_ask(check, view, requirement, part)


def _loads(check: Check, view: View) -> Iterator[tuple[Requirement, Part]]:
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            if requirement.of is None or not view.design.has_part(requirement.of):
                raise CircuitError(f'requirement {check.slug}: write "of", the load that tells of an alarm')
            yield requirement, view.design.part(requirement.of)


def _own_events(view: View, sequence: str) -> list[Event]:
    """What the sequence does beside the supply, in order."""
    events = view.design.sequences[sequence].events
    own = [event for event in events if not isinstance(event, ConnectSupply | DisconnectSupply)]
    return sorted(own, key=lambda event: read(event.at, "s"))


def _rearm_ask(check: Check, view: View, requirement: Requirement, part: Part) -> Ask:
    stage = view.design.stage_of(part.ref)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    events = _own_events(view, sequence)
    missing = None
    if requirement.max is None:
        missing = f"max, the time allowed, in the requirement rearm of {part.ref}"
    elif view.bench(part.ref).on is None:
        missing = f"operating_minimum of {part.ref}"
    elif not events:
        missing = f"an event in sequence {sequence} that raises the alarm"
    if missing is not None:
        return unknown(check, stage.name, part.ref, sequence, required, missing)
    allowed = view.limit(requirement, "max", "s")
    if allowed <= 0.0:
        raise CircuitError(f"requirement rearm of {part.ref}, max: {requirement.max} cannot be; write a time")
    ended = view.anchor(requirement.from_ or f"{part.ref} off", sequence)
    # Where an event ends the alarm, it has happened by then.
    start = Anchor(ended.by + AFTER, ended.row)
    first = read(events[0].at, "s")
    longest = RESTS[0] * allowed
    on = view.event(f"{part.ref} on")
    off = view.event(f"{part.ref} off", Anchor(0.0, on))
    window = _window(view, part, sequence)

    def drive(line: Timeline, knob: Floats) -> None:
        # What is done once more begins at the same instant in every lane: the rest before it is what differs.
        for event in events:
            apply(line, event, 1.0 / knob - first)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        if window is None:
            return ~observed.seen(on)
        lasted = observed.time(off) - observed.time(on)
        return ~((lasted >= window[0]) & (lasted <= window[1]))

    trial = Trial(
        key=f"rearm {part.ref}",
        sequence=sequence,
        start=start,
        drive=drive,
        ends=longest + view.ends(sequence) - first,
        safe=1.0 / longest,
        severe=1.0 / (RESTS[1] * allowed),
        rows=(on, off),
        gives_in=gives_in,
        resolution=1.05,
    )

    recovery = Recovery.find(view, start)
    apart = "" if recovery is not None else MISSING
    if window is None:
        apart = f"no duration of {part.ref} is required: nothing says how far its capacitor must empty"

    def judge(seen: Seen) -> Judged:
        capability = np.full(seen.lanes.count, allowed)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), capability=capability)
        words, hand = check.words, None
        if recovery is not None and window is not None:
            lasted = seen.time(off, sequence) - seen.time(on, sequence)
            hand = 1.0 - recovery.rest(seen, sequence, lasted, window[0]) / allowed
        outcomes = [(edge.missing, words["missing"]), (edge.always, words["always"])]
        return ratio(1.0 / edge.knob, capability, outcomes, hand, apart)

    rows = () if recovery is None or window is None else (on, off, recovery.left)
    screen = 1.0 / (allowed * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows, trial, screen)


def _window(view: View, part: Part, sequence: str) -> tuple[float, float] | None:
    """How long an alarm must last: the required duration of the load, None where none is required."""
    for other in view.design.requirements:
        plain = other.from_ is None and other.to is None and other.sequence in (None, sequence)
        if other.check == "duration" and other.of == part.ref and plain and other.min and other.max:
            return read(other.min, "s"), read(other.max, "s")
    return None


def _repeat_ask(check: Check, view: View, requirement: Requirement, part: Part) -> Ask:
    stage = view.design.stage_of(part.ref)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    if view.bench(part.ref).on is None:
        return unknown(check, stage.name, part.ref, sequence, required, f"operating_minimum of {part.ref}")
    if requirement.max is None:
        allowed = view.customary("difference allowed", CHANGE, "%")
    else:
        allowed = view.limit(requirement, "max", "%")
    rows: list[Row] = []
    for change in ("on", "off", "on", "off"):
        rows.append(view.event(f"{part.ref} {change}", Anchor(0.0, rows[-1]) if rows else None))
    # Of events that come twice, the rest lies between the first half and the second.
    times = [read(event.at, "s") for event in _own_events(view, sequence)]
    half = len(times) // 2
    recovery = Recovery.find(view, Anchor(times[half - 1])) if times and len(times) % 2 == 0 else None

    def judge(seen: Seen) -> Judged:
        begin, end, again, over = (seen.time(row, sequence) for row in rows)
        once, twice = end - begin, over - again
        changed = np.abs(twice - once) / np.where(once > 0.0, once, np.nan)
        words = check.words
        outcomes = [
            (~np.isfinite(once), words["never"]),
            (np.isfinite(once) & ~np.isfinite(again), words["once"]),
            (np.isfinite(again) & ~np.isfinite(twice), words["endless"]),
        ]
        hand = None
        if recovery is not None:
            hand = 1.0 - recovery.change(seen, sequence, once, times[half] - times[half - 1]) / allowed
        apart = MISSING if hand is None else ""
        return ratio(changed, np.full(seen.lanes.count, allowed), outcomes, hand, apart)

    left = () if recovery is None else (recovery.left,)
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows=(*rows, *left))


CHECKS = (
    Check(
        number=14,
        slug="rearm",
        title="re-arm",
        unit="s",
        required=0.2,
        formula="D = shortest rest after which the next alarm comes as it should, C = time allowed",
        asks=rearm_asks,
        reads={"of": "LS1", "from": "LS1 off", "max": "10 s"},
        words={
            "missing": "the alarm never ended",
            "always": "not ready again after four times the time allowed",
        },
        worst="cold, low supply, large timing capacitor",
        by_hand="R' C ln(v / v_max), v left on C, v_max = V (1 - exp((T_min - T) / R C)), R' what empties it",
        hand_source="closed form of R and C",
        accuracy=0.1,
        leaves_out="other capacitors, diodes",
    ),
    Check(
        number=14,
        slug="repeatability",
        title="repeatability",
        unit="%",
        required=0.2,
        formula="D = difference of the second alarm's length to the first, C = difference allowed",
        asks=repeat_asks,
        reads={"of": "LS1", "max": "10 %"},
        words={
            "never": "the first alarm never came to an end",
            "once": "the second alarm never came",
            "endless": "the second alarm never came to an end",
        },
        worst="leaky capacitors, hot",
        by_hand="-R C ln(1 - v exp(-rest / R' C) / V) / T, v left on C, R' what empties it",
        hand_source="closed form of R and C",
        accuracy=0.05,
        leaves_out="other capacitors, diodes",
    ),
)
