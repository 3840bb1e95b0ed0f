"""Check 28: is the alarm loud enough where it has to be heard?

The level falls by 20 log10 of the distance, a point source in the open, and the sound pressure goes with the voltage
across the sounder: both common practice, from memory.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.requirement import Requirement
from ..errors import CircuitError
from ..primitives.signals import Anchor, level, voltage
from .check import Ask, Check, Judged, everywhere, unknown
from .driven import OVER, over
from .load_voltage import FED_OTHERWISE, fed_otherwise, left_by_hand
from .seen import Seen
from .view import View

DECADE = 10.0  # dB that count as the whole margin


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every requirement of a sound level."""
    for requirement in view.design.requirements:
        if requirement.check == check.slug:
            yield _ask(check, view, requirement)


def _ask(check: Check, view: View, requirement: Requirement) -> Ask:
    subject = requirement.of
    if subject is None or not view.design.has_part(subject) or requirement.min is None:
        raise CircuitError(
            'requirement sound_level: write "of" and "min", for example "LS1" and "80 dB", and "distance"'
        )
    sounder, stage = view.design.part(subject), view.design.stage_of(subject)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    wanted = view.limit(requirement, "min", "dB")
    distance = view.extra(requirement, "distance", "m")
    loud, rated = view.datum(sounder, "sound_level", "dB"), view.datum(sounder, "rated_voltage", "V")
    on = view.bench(subject).on
    needs = {
        f"sound_level of {subject}": loud,
        f"operating_minimum of {subject}": on,
        "distance at which it is to be heard (requirement field distance)": distance,
    }
    for missing, found in needs.items():
        if found is None:
            return unknown(check, stage.name, subject, sequence, required, missing)
    assert loud is not None
    assert on is not None
    assert distance is not None
    if distance <= 0.0:
        raise CircuitError('requirement sound_level, field distance: it must be above zero; write it like "1 m"')
    volts = view.circuit.builder.supply_nominal if rated is None else rated.typical
    at = view.moment(sequence, "sounding", "on") or Anchor(1e-2, view.event(f"{subject} on"))
    across = level(voltage(on[0], on[1]), at)
    _, gone = over(view, sounder, at)

    def judge(seen: Seen) -> Judged:
        given = seen.value(across, sequence)
        never = ~(given > 0.0)
        with_voltage = 20.0 * np.log10(np.where(never, volts, given) / volts)
        there = loud.low + with_voltage - 20.0 * np.log10(distance)
        off_again = ~never & gone(seen, sequence)
        margin = np.where(never | off_again, -1.0, (there - wanted) / DECADE)
        words = (never, check.words["never"].format(sounder=subject)), (off_again, OVER.format(load=subject))
        left = None if fed_otherwise(view, sequence) else left_by_hand(view, stage, sounder, seen.lanes)
        hand = None
        if left is not None:
            by_hand = loud.low + 20.0 * np.log10(np.where(left > 0.0, left, np.nan) / volts)
            hand = (by_hand - 20.0 * np.log10(distance) - wanted) / DECADE
        demand = np.full(seen.lanes.count, wanted)
        apart = everywhere(FED_OTHERWISE if hand is None else "")
        return Judged(margin, demand, there, outcomes=words, hand=hand, apart=apart)

    return Ask(check, stage.name, subject, (sequence,), required, judge, (across,))


CHECKS = (
    Check(
        number=28,
        slug="sound_level",
        title="sound level",
        unit="dB",
        required=0.3,
        formula="m = (L - D) / 10 dB, L = level at 1 m + 20 log10(V / V_rated) - 20 log10(distance / 1 m)",
        asks=asks,
        reads={"of": "LS1", "min": "80 dB", "distance": "1 m"},
        worst="low supply",
        by_hand="the same with the supply - V_CE(sat) - entry diode - I (R_source + R_lead) in place of V",
        accuracy=0.1,
        leaves_out="other drops",
        words={"never": "{sounder} never came on"},
    ),
)
