"""Check 11: does a timed interval stay within its window?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Stage
from ..design.requirement import Requirement
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.signals import Anchor, Row, crossing, integral, level, maximum, minimum, voltage
from ..quantity import read
from .alarm_state import HOLDS
from .check import Apart, Ask, Check, Judged, window
from .complementary_latch import latches
from .seen import Seen
from .view import View

UNTIMED = "neither its own stage nor just one fills timing_resistor and timing_capacitor"
OTHERWISE = 0.03  # of its charge: with more the closed form is further off than it says of itself
ANOTHER_WAY = "more than 3 % of the capacitor's charge came or went another way: through diodes, or into what it fires"
KICKED = 1e-4  # s after which a capacitor that begins an interval below 0 V stands there
SET = 0.3  # V across the base-emitter junction of a latch: not before it is set, not while it is reset (from memory)
UNREACHED = "by hand the timing capacitor does not come to what it was seen to have"


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a duration."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    subject = requirement.of
    if subject is None or requirement.min is None or requirement.max is None:
        raise CircuitError('requirement duration: write "of", "min" and "max", for example "LS1", "60 s" and "120 s"')
    low, high = (view.limit(requirement, end, "s") for end in ("min", "max"))
    if not low < high:
        raise CircuitError(
            f"requirement duration of {subject}: min {requirement.min} is not below max {requirement.max}"
        )
    sequence = view.sequence(requirement)
    stage = view.design.stage_of(subject) if view.design.has_part(subject) else view.design.stages[0]
    first_text, last_text = requirement.from_ or f"{subject} on", requirement.to or f"{subject} off"
    first = view.anchor(first_text, sequence)
    last = view.anchor(last_text, sequence, first)
    timing = Timing.find(view, stage, first, last)
    brief = _within_chatter(first, last)
    again = _again(view, first, last)
    spike = None
    if last.row is not None and last.row.rising and last_text.endswith(" on"):
        spike = last.row.level, minimum(last.row.signal, Anchor(0.05 * HOLDS, last.row), Anchor(HOLDS, last.row))

    events = [read(event.at, "s") for event in view.design.sequences[sequence].events]

    def judge(seen: Seen) -> Judged:
        begin, end = (instant(seen, anchor, sequence) for anchor in (first, last))
        if brief is not None:
            back, settled = brief
            over = seen.value(settled, sequence) - back.level
            end = np.where(over > 0.0 if back.rising else over < 0.0, seen.time(back, sequence), end)
        started = np.isfinite(begin)
        outcomes = [
            (~started, check.words["never"].format(what=first_text)),
            (started & ~np.isfinite(end), check.words["endless"].format(what=last_text)),
        ]
        if spike is not None:
            at, stayed = spike
            early = (end - begin < low) & (seen.value(stayed, sequence) < at)
            outcomes.append((early, check.words["spike"].format(what=last_text)))
        if again is not None:
            # Nothing happened between its end and its coming again: what started it still does.
            comes = np.fmax.reduce([seen.time(row, sequence) for row in again])
            alone = np.all([(at <= end) | (at >= comes) for at in events], axis=0) & np.isfinite(end)
            outcomes.append((alone & np.all([seen.seen(row, sequence) for row in again], axis=0), check.words["again"]))
        hand = None if timing is None else timing.by_hand(seen, sequence, end - begin)
        apart: Apart = ((None, UNTIMED),)
        if hand is not None and timing is not None:
            apart = ((np.isnan(hand), UNREACHED), (timing.otherwise(seen, sequence) > OTHERWISE, ANOTHER_WAY))
        return window(end - begin, low, high, outcomes, hand, apart, of_value=True)

    rows = tuple(anchor.row for anchor in (first, last) if anchor.row is not None)
    rows += brief or ()
    rows += () if spike is None else spike[1:]
    rows += again or ()
    if timing is not None:
        rows += timing.rows
    required = view.required(check.slug, check.required, requirement)
    return Ask(check, stage.name, subject, (sequence,), required, judge, rows)


def _within_chatter(first: Anchor, last: Anchor) -> tuple[Row, Row] | None:
    """Rows for an end that comes before the chatter is over: the end, and what the signal settled to by then. None
    where the end is looked for from ``first`` on, without waiting for a chatter to be over."""
    if last.row is None or last.row.start.row is None or last.row.start.row != first.row or last.row.start == first:
        return None
    end = last.row
    return crossing(end.signal, end.level, end.rising, first), level(end.signal, end.start)


def _again(view: View, first: Anchor, last: Anchor) -> tuple[Row, ...] | None:
    """Rows for a latch that is set again after an alarm has ended, and for its load that comes on again. None where the
    interval is not that of a load that comes on and goes off, or where nothing latches."""
    on, off = first.row, last.row
    if on is None or off is None or on.signal != off.signal or not on.rising or off.rising:
        return None
    over = Anchor(0.0, off)
    set_again = tuple(crossing(latch.lifts[0], SET, True, over) for latch in latches(view))
    return (*set_again, crossing(on.signal, on.level, True, over)) if len(set_again) == 1 else None


def instant(seen: Seen, anchor: Anchor, sequence: str) -> Floats:
    """When an anchor is, in s from the start of the sequence; NaN in lanes where it never came."""
    if anchor.row is None:
        return np.full(seen.lanes.count, anchor.by)
    return seen.time(anchor.row, sequence) + anchor.by


class Timing:
    """The timing resistor and capacitor of a stage, for t = tau ln(V_inf / (V_inf - V_th)) with leakage."""

    def __init__(self, view: View, stage: Stage, first: Anchor, last: Anchor) -> None:
        resistor, capacitor = (
            view.design.part(view.roles_of(stage)[r]) for r in ("timing_resistor", "timing_capacitor")
        )
        self.resistor, self.capacitor = resistor.ref, capacitor.ref
        self.leakage = view.bench(capacitor.ref).leak_conductance
        shared = set(resistor.pins.values()) & set(capacitor.pins.values())
        self.net = shared.pop() if len(shared) == 1 else next(iter(capacitor.pins.values()))
        rail = next((net for net in resistor.pins.values() if net != self.net), self.net)
        self.threshold = maximum(voltage(self.net), first, last)
        self.rail = maximum(voltage(rail), first, last)
        self.begun = level(voltage(self.net), Anchor(first.by + KICKED, first.row))
        self.fed, self.stood = (integral(voltage(each), first, last) for each in (rail, self.net))
        self.rows: tuple[Row, ...] = (self.threshold, self.rail, self.begun, self.fed, self.stood)

    @classmethod
    def find(cls, view: View, stage: Stage, first: Anchor, last: Anchor) -> Timing | None:
        """The timing pair of a stage, else the only one of the design; None where the roles are not filled or there
        are several."""
        pairs = [s for s in view.design.stages if {"timing_resistor", "timing_capacitor"} <= view.roles_of(s).keys()]
        own = [pair for pair in pairs if pair is stage] or pairs
        return cls(view, own[0], first, last) if len(own) == 1 else None

    def by_hand(self, seen: Seen, sequence: str, lasted: Floats | None = None) -> Floats:
        """The interval by the closed form, with the threshold that the simulation shows and the rail: its mean where it
        ``lasted`` s, else its most."""
        resistance, leak, begun = self._parts(seen, sequence)
        share = 1.0 / (1.0 + resistance * leak)
        rail = seen.value(self.rail, sequence)
        if lasted is not None:
            mean = seen.value(self.fed, sequence) / np.where(lasted > 0.0, lasted, np.nan)
            rail = np.where(np.isfinite(mean), mean, rail)
        final = rail * share
        threshold = seen.value(self.threshold, sequence)
        reached = np.where(final > threshold, (threshold - begun) / np.where(final > begun, final - begun, 1.0), np.nan)
        return np.asarray(-resistance * share * self._farads(seen) * np.log1p(-reached))

    def _farads(self, seen: Seen) -> Floats:
        """The capacitor, with what it drifts."""
        farads = seen.lanes[self.capacitor, "value"]
        drift = self.capacitor, "drift"
        return farads * (1.0 + seen.lanes[drift]) if drift in seen.lanes else farads

    def _parts(self, seen: Seen, sequence: str) -> tuple[Floats, Floats, Floats]:
        """The resistor, the capacitor's leakage in S, and the voltage that it begins with."""
        resistance = seen.lanes[self.resistor, "value"]
        leak = np.zeros(seen.lanes.count) if self.leakage is None else np.asarray(self.leakage(seen.lanes))
        return resistance, leak, np.nan_to_num(seen.value(self.begun, sequence))

    def otherwise(self, seen: Seen, sequence: str) -> Floats:
        """The share of the capacitor's charge that came or went another way than through the resistor and its leakage:
        through diodes, or into what it fires."""
        resistance, leak, begun = self._parts(seen, sequence)
        stood = seen.value(self.stood, sequence)
        through = (seen.value(self.fed, sequence) - stood) / resistance - leak * stood
        kept = self._farads(seen) * (seen.value(self.threshold, sequence) - begun)
        return np.abs(through - kept) / np.where(kept != 0.0, np.abs(kept), np.nan)


CHECKS = (
    Check(
        number=11,
        slug="duration",
        title="duration window",
        unit="s",
        required=0.1,
        formula="x = time from one event to the other, m = min(U - x, x - L) / ((U - L)/2)",
        asks=asks,
        reads={"of": "LS1", "from": "LS1 on", "to": "LS1 off", "min": "60 s", "max": "120 s"},
        worst="hot, leaky capacitors; cold, conditioned capacitors",
        by_hand="R C ln(V_inf / (V_inf - V_th)) with the rail and threshold seen, the threshold part unloaded",
        accuracy=0.05,
        leaves_out="load of C, other delays",
        words={
            "never": "'{what}' never came",
            "endless": "'{what}' never came: it runs on",
            "spike": "'{what}' came too early, for less than 20 us: a spike",
            "again": "the alarm comes again by itself when it is over: what started it is still there",
        },
    ),
)
