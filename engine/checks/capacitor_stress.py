"""Check 13: does a capacitor stay within its voltage and its ripple, and is a polarised one never reversed?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.builder import RETURN, SUPPLY_NET
from ..primitives.signals import Anchor, Signal, integral, maximum, minimum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .driven import drawn, together
from .peak_collector_emitter import LIFTED
from .seen import Seen
from .top_voltage import beside, beyond_rails, top_voltage
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
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - volts / allowed
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.max(peaks, axis=0), capability, hand=hand, apart=beside(view))

    return Ask(check, stage.name, part.ref, sequences, required, judge, (highest, lowest))


def reverse_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every polarised capacitor, over all sequences."""
    for stage, part in view.parts_of("capacitor"):
        if "plus" in part.pins:
            yield _reverse_ask(check, view, stage, part)


def _reverse_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    allowed = view.extra(requirement, "reverse_voltage", "V") or view.customary("reverse voltage borne", REVERSE, "V")
    sequences = tuple(view.design.sequences)
    lowest = minimum(_across(part))
    # Between 0V and the supply, no net lies below 0V or above the supply.
    tied = part.pins["minus"] == RETURN or part.pins["plus"] == SUPPLY_NET

    def judge(seen: Seen) -> Judged:
        reverse = np.max([-seen.value(lowest, name) for name in sequences], axis=0)
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - (beyond_rails(view, seen) if tied else volts) / allowed
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.maximum(0.0, reverse), capability, hand=hand, apart=beside(view))

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
    drawing = load or view.role(stage, "load")
    draw = None if drawing is None else drawn(view, together(view, drawing))
    apart = "" if draw is not None else "nothing in the role load says what it draws in turns"
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
        hand = None
        volts = top_voltage(view, seen, (sequence,))
        if draw is not None and volts is not None:
            hand = 1.0 - 0.5 * draw(seen.lanes, volts) / allowed
        words = [(never, check.words["never"])]
        return ratio(current, np.full(seen.lanes.count, allowed), words, hand, apart or beside(view))

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
        by_hand="the whole supply across it",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
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
        by_hand="none with its minus at 0V or its plus at the supply, the whole supply between other nets",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
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
        by_hand="I_load / 2: on for a share d of the time, it draws I root(d (1 - d)) of alternating current",
        accuracy=0.1,
        bound=True,
        leaves_out="surges and charging",
    ),
)
