"""Check 29: is a stand-by battery never charged too hard, and does the charge make up for what it loses?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..design.sequence import ContactEvent
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, Row, Signal, level, maximum
from ..quantity import read
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View

ROLE = "standby_battery"
UNCHARGED = "no charge_resistor in its role, or the conditions name no supply"
SPIKE = 1e-3  # s after a contact has moved from which on a current counts, from memory


def most_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every battery in the role of a stand-by battery."""
    for stage, _, part in view.with_role(ROLE):
        yield _most_ask(check, view, stage, part)


def _most_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    limits = part.limits("charge_limits", "A", "current")
    allowed = None if limits is None else limits.max if limits.max is not None else limits.typical
    if allowed is None:
        return unknown(check, stage.name, part.ref, sequence, required, f"charge_limits current of {part.ref}")
    rows = _between_contacts(view, view.bench(part.ref).currents["plus"], sequence)

    def judge(seen: Seen) -> Judged:
        current = np.max([np.maximum(0.0, np.nan_to_num(seen.value(row, sequence))) for row in rows], axis=0)
        by_hand = _by_hand(view, stage, part, seen)
        hand = None if by_hand is None else 1.0 - by_hand / allowed
        return ratio(current, np.full(seen.lanes.count, allowed), hand=hand, apart=UNCHARGED if hand is None else "")

    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)


def _between_contacts(view: View, current: Signal, sequence: str) -> tuple[Row, ...]:
    """The largest current from a little after each move of a contact to the next: what its closing charges in
    nanoseconds heats no battery."""
    events = view.design.sequences[sequence].events
    moved = sorted({0.0, *(read(each.at, "s") for each in events if isinstance(each, ContactEvent))})
    ends = [*moved[1:], view.ends(sequence)]
    return tuple(
        maximum(current, Anchor(at + SPIKE), Anchor(end))
        for at, end in zip(moved, ends, strict=True)
        if end > at + SPIKE
    )


def _by_hand(view: View, stage: Stage, part: Part, seen: Seen) -> Floats | None:
    """(supply - diode - batteries of the stage in series) / R_charge, where the role charge_resistor is filled."""
    resistor = view.role(stage, "charge_resistor")
    in_series = [cell.ref for place, _, cell in view.with_role(ROLE) if place is stage]
    known = view.circuit.builder.batteries
    sources = [known[name] for ref in in_series if (name := f"{ref} source") in known]
    if resistor is None or not sources or SUPPLY not in seen.lanes:
        return None
    diode = view.role(stage, "charge_diode")
    battery = sum(np.asarray(source(seen.lanes)) for source in sources)
    left = seen.lanes[SUPPLY] - view.forward(diode, "forward_low", seen.lanes) - battery
    return np.asarray(np.maximum(0.0, left) / seen.lanes[resistor.ref, "value"])


def upkeep_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every battery in the role of a stand-by battery."""
    for stage, _, part in view.with_role(ROLE):
        yield _upkeep_ask(check, view, stage, part)


def _upkeep_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    capacity, lost = view.datum(part, "capacity", "Ah"), view.datum(part, "self_discharge", "1/s")
    for key, found in (("capacity", capacity), ("self_discharge", lost)):
        if found is None:
            return unknown(check, stage.name, part.ref, sequence, required, f"{key} of {part.ref}")
    assert capacity is not None
    assert lost is not None
    load = view.extra(requirement, "load", "A") or 0.0
    at = view.moment(sequence, "standby") or Anchor(0.5 * view.ends(sequence))
    row = level(view.bench(part.ref).currents["plus"], at)

    def judge(seen: Seen) -> Judged:
        wanted = np.full(seen.lanes.count, capacity.high * lost.high + load)
        hand = None
        current = _by_hand(view, stage, part, seen)
        if current is not None:
            hand = 1.0 - wanted / np.where(current > 0.0, current, np.nan)
        return ratio(wanted, seen.value(row, sequence), hand=hand, apart=UNCHARGED if hand is None else "")

    return Ask(check, stage.name, part.ref, (sequence,), required, judge, (row,))


CHECKS = (
    Check(
        number=29,
        slug="charge_current",
        title="charge current",
        unit="A",
        required=0.0,
        formula="D = largest current into it from 1 ms after a contact moved on, C = the charge current that it bears",
        asks=most_asks,
        worst="high supply, empty battery",
        by_hand="(supply - diode - battery voltage) / R_charge over what it bears",
        hand_source="Ohm's law",
        accuracy=0.05,
        leaves_out="how the diode's drop moves",
    ),
    Check(
        number=29,
        slug="charge_upkeep",
        title="charge upkeep",
        unit="A",
        required=0.0,
        formula="D = self-discharge x capacity + load of the requirement, C = current into the battery in stand-by",
        asks=upkeep_asks,
        reads={"of": "G1", "load": "1 mA"},
        worst="low supply, full battery",
        by_hand="what it must make up for over (supply - diode - battery voltage) / R_charge",
        hand_source="Ohm's law",
        accuracy=0.05,
        leaves_out="how the diode's drop moves",
    ),
)
