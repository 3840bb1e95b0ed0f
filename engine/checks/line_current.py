"""Check 20: does a wet lead or probe stay below what trips, and does a contact carry enough current to stay clean?"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from ..design.part import Part, Stage
from ..design.requirement import Requirement
from ..design.sequence import ContactEvent
from ..errors import CircuitError
from ..kernel.layout import Floats
from ..primitives.builder import RETURN, SUPPLY_NET
from ..primitives.columns import SUPPLY
from ..primitives.signals import START, Anchor, Row, level, maximum, minimum, voltage
from ..quantity import read
from .check import Ask, Check, Judged, ratio, unknown
from .complementary_latch import TRIP_CURRENT
from .seen import Seen
from .view import View

PULLS = ("pull_up", "pull_down")
BEFORE = 1e-3  # s before a contact moves again at which its current is read


def wet_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a wet lead or probe."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _wet_ask(check, view, requirement)


def _wet_ask(check: Check, view: View, requirement: Requirement) -> Ask:
    subject = requirement.of
    if subject is None or not view.design.has_part(subject):
        raise CircuitError('requirement wet_lead: write the probe or contact as "of", for example "B1"')
    part, stage = view.design.part(subject), view.design.stage_of(subject)
    sequence = view.sequence(requirement, "trip")
    required = view.required(check.slug, check.required, requirement)
    insulation = view.extra(requirement, "insulation", "ohm")
    if insulation is None:
        missing = "insulation at which it must not trip (requirement field insulation)"
        return unknown(check, stage.name, subject, sequence, required, missing)
    if insulation <= 0.0:
        raise CircuitError('requirement wet_lead, field insulation: it must be above zero; write it like "2M"')
    found = _at_event(view, requirement, stage, part, sequence) or _at_level(view, requirement, stage)
    if isinstance(found, str):
        return unknown(check, stage.name, subject, sequence, required, found)
    trip_rows, trip_current, trip_by_hand = found
    device = next((device for _, _, device in view.with_role("trip_device")), None)
    raised = requirement.at is not None and device is not None and _raised(device)
    across = voltage(*part.pins.values())
    most, least = maximum(across), minimum(across)

    def judge(seen: Seen) -> Judged:
        dry = np.maximum(seen.value(most, sequence), -seen.value(least, sequence))
        trips = trip_current(seen, sequence, dry)
        hand = None
        by_hand = trip_by_hand(seen)
        if by_hand is not None and SUPPLY in seen.lanes:
            hand = 1.0 - seen.lanes[SUPPLY] / insulation / by_hand
        never = ~np.isfinite(trips)
        apart = "the trip device or the resistor at its base is not in its role" if hand is None else ""
        if hand is None and raised:
            apart = "the emitter of its trip device stands on a resistor: V_BE alone does not trip it"
        return ratio(dry / insulation, trips, [(never, check.words["never"])], hand, apart)

    return Ask(check, stage.name, subject, (sequence,), required, judge, (most, least, *trip_rows))


Trips = tuple[tuple[Row, ...], Callable[[Seen, str, Floats], Floats], Callable[[Seen], "Floats | None"]]


def _raised(device: Part) -> bool:
    """Whether a transistor's emitter is not at 0V or the supply: with a resistor there V_BE alone does not trip it."""
    return device.pins.get("emitter") not in (None, RETURN, SUPPLY_NET)


def _at_event(view: View, requirement: Requirement, stage: Stage, part: Part, sequence: str) -> Trips | None:
    """The current through the part as a ramp of its resistance makes the circuit trip; None where no event is named."""
    current = view.bench(part.ref).currents.get("a")
    if requirement.at is None or current is None:
        return None
    row = level(current, view.anchor(requirement.at, sequence))
    place, device = next(((s, p) for s, role, p in view.with_role("trip_device")), (stage, None))
    resistor = view.base_emitter_resistor(place, "trip_device")
    turn_on = None if device is None else view.bench(device.ref).base_voltage

    def by_hand(seen: Seen) -> Floats | None:
        if device is None or resistor is None or turn_on is None or _raised(device):
            return None
        # Where the resistor does not begin at the device's own base, another junction lies between.
        junctions = 1.0 if device.pins["base"] in resistor.pins.values() else 2.0
        return np.asarray(junctions * turn_on(seen.lanes, TRIP_CURRENT) / seen.lanes[resistor.ref, "value"])

    return (row,), lambda seen, sequence, dry: np.abs(seen.value(row, sequence)), by_hand


def _at_level(view: View, requirement: Requirement, stage: Stage) -> Trips | str:
    """The current that brings the line from rest to ``trip_level`` through its pull resistor."""
    trip = view.extra(requirement, "trip_level", "V")
    pull = next((found for role in PULLS if (found := view.role(stage, role)) is not None), None)
    if trip is None:
        return (
            "event with which it trips (requirement field at), or the level of its line at which it does (trip_level)"
        )
    if pull is None:
        return "the resistor that feeds the line (role pull_up or pull_down)"

    def by_hand(seen: Seen) -> Floats | None:
        if SUPPLY not in seen.lanes:
            return None
        return np.maximum(seen.lanes[SUPPLY] - trip, 0.0) / seen.lanes[pull.ref, "value"]

    return (), lambda seen, sequence, dry: np.maximum(dry - trip, 0.0) / seen.lanes[pull.ref, "value"], by_hand


def wetting_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every contact that says what current it needs, or that fills the role ``contact``."""
    filled = {part.ref for _, _, part in view.with_role("contact")}
    for stage, part in view.parts_of("contact"):
        if part.ref in filled or part.entry("minimum_current") is not None:
            yield _wetting_ask(check, view, stage, part)


def _wetting_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    needs = view.datum(part, "minimum_current", "A")
    current = view.bench(part.ref).currents.get("a")
    if needs is None or current is None:
        return unknown(check, stage.name, part.ref, sequence, required, f"minimum_current of {part.ref}")
    pull = next((view.design.part(view.roles_of(stage)[role]) for role in PULLS if role in view.roles_of(stage)), None)
    entry = view.role(stage, "reverse_diode")
    forward = None if entry is None else view.datum(entry, "forward_low", "V")
    dropped = 0.0 if forward is None else forward.typical
    rows = tuple(level(current, Anchor(at)) for at in _closed_until(view, part, sequence))

    def judge(seen: Seen) -> Judged:
        wanted = np.full(seen.lanes.count, needs.high)
        if not rows:
            never = np.ones(seen.lanes.count, dtype=bool)
            return ratio(wanted, wanted, [(never, check.words["never"].format(contact=part.ref))])
        hand = None
        if pull is not None and SUPPLY in seen.lanes:
            hand = 1.0 - wanted * seen.lanes[pull.ref, "value"] / (seen.lanes[SUPPLY] - dropped)
        apart = "no pull resistor in its stage, or the conditions name no supply" if hand is None else ""
        carried = np.min([np.abs(seen.value(row, sequence)) for row in rows], axis=0)
        return ratio(wanted, carried, hand=hand, apart=apart)

    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows or (level(current, START),))


def _closed_until(view: View, part: Part, sequence: str) -> list[float]:
    """Just before the ends of the times in which the contact is closed, s from the start."""
    moves = sorted(
        (read(event.at, "s"), event.event)
        for event in view.design.sequences[sequence].events
        if isinstance(event, ContactEvent) and event.part == part.ref
    )
    closed = [(0.0, part.form == "break"), *((at, event == "close") for at, event in moves)]
    ends = [at for at, _ in closed[1:]] + [view.ends(sequence)]
    return [
        end - min(BEFORE, 0.1 * (end - at)) for (at, shut), end in zip(closed, ends, strict=True) if shut and end > at
    ]


CHECKS = (
    Check(
        number=20,
        slug="wet_lead",
        title="wet lead or probe",
        unit="A",
        required=0.5,
        formula="D = voltage across it when dry / insulation when wet, C = current through it that trips",
        asks=wet_asks,
        reads={"of": "B1", "insulation": "2M", "at": "LS1 on", "trip_level": "3 V"},
        worst="hot, high supply, strong h_FE",
        by_hand="(supply / insulation) / (V_BE / R_BE of the trip device, or (supply - trip level) / R_pull)",
        accuracy=0.1,
        leaves_out="gains, drains of the line",
        words={"never": "it never tripped"},
    ),
    Check(
        number=20,
        slug="wetting_current",
        title="wetting current",
        unit="A",
        required=0.0,
        formula="D = least current that keeps the contact clean, C = current through it before it opens again",
        asks=wetting_asks,
        worst="low supply",
        by_hand="least current x R_pull / (supply - entry diode), R_pull the pull resistor of its stage",
        hand_source="Ohm's law",
        accuracy=0.05,
        bound=True,
        leaves_out="drops",
        words={"never": "{contact} is never closed in the sequence"},
    ),
)
