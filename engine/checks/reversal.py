"""Check 25: does a diode bear the reverse voltage, above all the one that takes a reversed supply?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.columns import SUPPLY
from ..primitives.signals import maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .peak_collector_emitter import LIFTED
from .seen import Seen
from .top_voltage import beside, top_voltage
from .view import View

ROLE = "reverse_diode"


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every diode that blocks, over all sequences."""
    entry = {part.ref for _, _, part in view.with_role(ROLE)}
    for stage, part in view.parts_of("diode", "schottky", "led"):
        yield _ask(check, view, stage, part, part.ref in entry)


def _ask(check: Check, view: View, stage: Stage, part: Part, takes_supply: bool) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequences = tuple(view.design.sequences)
    rating = view.datum(part, "v_rrm", "V")
    if rating is None:
        return unknown(check, stage.name, part.ref, sequences[0], required, f"v_rrm of {part.ref}")
    allowed = view.derating("v_rrm", requirement) * rating.low
    reverse = maximum(voltage(part.pins["cathode"], part.pins["anode"]))

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(reverse, name) for name in sequences], axis=0)
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - volts / allowed
        if takes_supply and SUPPLY in seen.lanes:
            # Whether a sequence reverses the supply or not: that is what this diode is there for.
            peaks = np.maximum(peaks, seen.lanes[SUPPLY])
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.maximum(0.0, peaks), capability, hand=hand, apart=beside(view))

    return Ask(check, stage.name, part.ref, sequences, required, judge, (reverse,))


CHECKS = (
    Check(
        number=25,
        slug="reversal",
        title="reverse voltage",
        unit="V",
        required=0.0,
        formula="D = largest reverse voltage of all sequences, of an entry diode at least the supply, C = V_RRM",
        asks=asks,
        worst="high supply",
        by_hand="the whole supply across it",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
    ),
)
