"""Check 13: does a capacitor stay within its voltage and its ripple, and is a polarised one never reversed?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, Signal, integral, maximum, minimum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View

REVERSE = 1.0  # V that a polarised capacitor bears in reverse, common practice, from memory
FILTERS = ("filter_capacitor", "reservoir_capacitor")


def _across(part: Part) -> Signal:
    plus, minus = ("plus", "minus") if "plus" in part.pins else ("a", "b")
    return voltage(part.pins[plus], part.pins[minus])


def voltage_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every capacitor, over all sequences."""
    for stage, part in view.parts_of("capacitor"):
        requirement = view.requirement(check.slug, part.ref, stage.name)
        required = view.required(check.slug, check.required, requirement)
        rating = view.datum(part, "voltage", "V")
        if rating is None:
            first = next(iter(view.design.sequences))
            yield unknown(check, stage.name, part.ref, first, required, f"voltage of {part.ref}")
        else:
            name = "capacitor_electrolytic" if "plus" in part.pins else "capacitor_film"
            allowed = view.derating(name, requirement) * rating.low
            yield _voltage_ask(check, view, stage, part, required, allowed)


def _voltage_ask(check: Check, view: View, stage: Stage, part: Part, required: float, allowed: float) -> Ask:
    sequences = tuple(view.design.sequences)
    highest, lowest = maximum(_across(part)), minimum(_across(part))

    def judge(seen: Seen) -> Judged:
        peaks = [np.maximum(seen.value(highest, name), -seen.value(lowest, name)) for name in sequences]
        hand = 1.0 - seen.lanes[SUPPLY] / allowed if SUPPLY in seen.lanes else None
        return ratio(np.max(peaks, axis=0), np.full(seen.lanes.count, allowed), hand=hand)

    return Ask(check, stage.name, part.ref, sequences, required, judge, (highest, lowest))


def reverse_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every polarised capacitor, over all sequences."""
    for stage, part in view.parts_of("capacitor"):
        if "plus" in part.pins:
            yield _reverse_ask(check, view, stage, part)


def _reverse_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    allowed = view.extra(requirement, "reverse_voltage", "V") or REVERSE
    sequences = tuple(view.design.sequences)
    lowest = minimum(_across(part))

    def judge(seen: Seen) -> Judged:
        reverse = np.max([-seen.value(lowest, name) for name in sequences], axis=0)
        return ratio(np.maximum(0.0, reverse), np.full(seen.lanes.count, allowed))

    return Ask(check, stage.name, part.ref, sequences, required, judge, (lowest,))


def ripple_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every capacitor that filters, or that says what ripple it bears."""
    filters = {part.ref for _, _, part in view.with_role(*FILTERS)}
    for stage, part in view.parts_of("capacitor"):
        if part.ref in filters or part.entry("ripple_rating") is not None:
            yield _ripple_ask(check, view, stage, part)


def _ripple_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    rating, heat = view.datum(part, "ripple_rating", "A"), view.bench(part.ref).power
    for key, found in (("ripple_rating", rating), ("series_resistance", heat)):
        if found is None:
            return unknown(check, stage.name, part.ref, sequence, required, f"{key} of {part.ref}")
    assert rating is not None
    assert heat is not None
    allowed = view.derating("ripple_current", requirement) * rating.low
    load = view.load(stage)
    whole = view.ends(sequence)
    if load is None:
        start, end = Anchor(0.5 * whole), Anchor(whole)
    else:
        start, end = Anchor(1e-2, view.event(f"{load.ref} on")), Anchor(0.0, view.event(f"{load.ref} off"))
    # Where the load never goes off again, what is lost until the end of the sequence counts.
    lost, all_lost = integral(heat, start, end), integral(heat, start)

    def judge(seen: Seen) -> Judged:
        joules = seen.value(lost, sequence)
        joules = np.where(np.isfinite(joules), joules, seen.value(all_lost, sequence))
        lasted = np.full(seen.lanes.count, 0.5 * whole)
        if start.row is not None and end.row is not None:
            off = seen.time(end.row, sequence)
            lasted = np.where(np.isfinite(off), off, whole) - seen.time(start.row, sequence) - start.by
        ohms = seen.lanes[part.ref, "series_resistance"]
        never = ~(lasted > 0.0)
        current = np.sqrt(np.maximum(0.0, joules) / np.where(never, 1.0, lasted) / ohms)
        return ratio(current, np.full(seen.lanes.count, allowed), [(never, check.words["never"])])

    rows = (lost, all_lost, *(anchor.row for anchor in (start, end) if anchor.row is not None))
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)


CHECKS = (
    Check(
        number=13,
        slug="capacitor_voltage",
        title="capacitor voltage",
        unit="V",
        required=0.0,
        formula="D = largest voltage across it in all sequences, C = derating x rated voltage",
        asks=voltage_asks,
        worst="high supply",
        by_hand="the whole supply across it: a circuit without a coil",
    ),
    Check(
        number=13,
        slug="capacitor_reverse",
        title="capacitor reversed",
        unit="V",
        required=0.0,
        formula="D = largest reverse voltage in all sequences, C = 1 V, or reverse_voltage of a requirement",
        asks=reverse_asks,
        reads={"of": "C5", "reverse_voltage": "1 V"},
        worst="high supply",
    ),
    Check(
        number=13,
        slug="capacitor_ripple",
        title="capacitor ripple",
        unit="A",
        required=0.0,
        formula="D = root mean square of its current in the alarm, from the heat in its resistance, C = ripple rating",
        asks=ripple_asks,
        worst="high supply",
        words={"never": "the load that ripples never came on"},
    ),
)
