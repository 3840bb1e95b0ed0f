"""Check 15: does one event come before another, both timers at opposite ends of their tolerance?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.requirement import Requirement
from ..errors import CircuitError
from ..primitives.signals import Anchor
from .check import Ask, Check, Judged, ratio
from .duration import Timing, instant
from .seen import Seen
from .view import View


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
        hand = None
        one, other = timers
        if one is not None and other is not None:
            hand = 1.0 - one.by_hand(seen, sequence) / other.by_hand(seen, sequence)
        return ratio(sooner - began, later - began, outcomes, hand)

    rows = tuple(anchor.row for anchor in (since, first, last) if anchor.row is not None)
    rows += tuple(row for timer in timers if timer is not None for row in timer.rows)
    return Ask(check, view.stage_named(subject), subject, (sequence,), required, judge, tuple(dict.fromkeys(rows)))


def _timer(view: View, requirement: Requirement, key: str, since: Anchor, end: Anchor) -> Timing | None:
    """The timing pair of the stage that a field of the requirement names; None where it names none."""
    name = requirement.extras.get(f"{key}_timer")
    if name is None:
        return None
    stage = next((stage for stage in view.design.stages if stage.name == name), None)
    if stage is None or not {"timing_resistor", "timing_capacitor"} <= stage.roles.keys():
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
        formula="D = time until the event that must come first, C = time until the other, both since `at`",
        asks=asks,
        reads={
            "of": "K1",
            "from": "K1 in",
            "to": "LS1 on",
            "at": "10 s",
            "first_timer": "entry",
            "second_timer": "exit",
        },
        worst="both timers at opposite ends of their tolerance",
        by_hand="R C ln(V_inf / (V_inf - V_th)) of the first timer over that of the second",
        accuracy=0.2,
        words={"never": "'{what}' never came"},
    ),
)
