"""Check 27: do the cells last through the stand-by time and the alarm?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.requirement import Requirement
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, level
from .check import Ask, Check, Judged, ratio, unknown
from .driven import drawn, together
from .seen import Seen
from .view import View

HOUR = 3600.0


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of stand-by energy."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    subject = requirement.of or "supply"
    stage = view.design.stage_of(subject).name if view.design.has_part(subject) else view.design.stages[0].name
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    capacity = view.extra(requirement, "capacity", "Ah")
    standby_time = view.extra(requirement, "standby_time", "s")
    current = view.supply_current
    alarm_time = view.extra(requirement, "alarm_time", "s") or 0.0
    sounding_at = view.moment(sequence, "sounding")
    needs: dict[str, object] = {
        "capacity of the cells (requirement field capacity)": capacity,
        "stand-by time (requirement field standby_time)": standby_time,
        "source_resistance in the conditions, through which the current is seen": current,
        f"moment sounding of the sequence {sequence}, at which the alarm current is read": sounding_at
        if alarm_time
        else 0.0,
    }
    for missing, value in needs.items():
        if value is None:
            return unknown(check, stage, subject, sequence, required, missing)
    assert capacity is not None
    assert standby_time is not None
    assert current is not None
    age = view.extra(requirement, "age", "%")
    cold = view.extra(requirement, "cold", "%")
    lost = view.extra(requirement, "self_discharge", "%") or 0.0
    usable = capacity * (1.0 if age is None else age) * (1.0 if cold is None else cold) * (1.0 - lost)
    standby = level(current, view.moment(sequence, "standby") or Anchor(0.5 * view.ends(sequence)))
    sounding = None if sounding_at is None else level(current, sounding_at)

    load = view.load(view.design.stage(stage))
    draw = None if load is None else drawn(view, together(view, load))

    def judge(seen: Seen) -> Judged:
        charge = seen.value(standby, sequence) * standby_time
        by_hand = charge
        outcomes = []
        if sounding is not None and alarm_time > 0.0:
            charge = charge + seen.value(sounding, sequence) * alarm_time
            drawn = seen.value(standby, sequence)
            if draw is not None and SUPPLY in seen.lanes:
                drawn = drawn + np.asarray(draw(seen.lanes, seen.lanes[SUPPLY]))
            by_hand = by_hand + drawn * alarm_time
            outcomes.append((~seen.seen(sounding, sequence), check.words["never"]))
        apart = "no load says what it draws in the alarm" if draw is None and alarm_time > 0.0 else ""
        hand = 1.0 - by_hand / usable if usable > 0.0 and not apart else None
        return ratio(charge, np.full(seen.lanes.count, usable), outcomes, hand, apart)

    rows = (standby,) if sounding is None else (standby, sounding)
    return Ask(check, stage, subject, (sequence,), required, judge, rows)


CHECKS = (
    Check(
        number=27,
        slug="standby_energy",
        title="stand-by energy",
        unit="Ah",
        required=0.0,
        formula="D = stand-by current x time + alarm current x time, C = capacity x age x cold x (1 - self-discharge)",
        asks=asks,
        reads={
            "of": "G1",
            "capacity": "2.5 Ah",
            "standby_time": "8760 h",
            "alarm_time": "10 h",
            "age": "80 %",
            "cold": "80 %",
            "self_discharge": "10 %",
        },
        worst="hot, high supply",
        by_hand="I_standby (stand-by + alarm time) + I_load x alarm time, the load at the whole supply",
        accuracy=0.05,
        leaves_out="drops, other alarm draws",
        words={"never": "the alarm never sounded"},
    ),
)
