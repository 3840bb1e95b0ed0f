"""Check 8: does the collector-emitter, or drain-source, voltage stay below its rating?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.columns import SUPPLY
from ..primitives.signals import maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .reverse_base_emitter import BIPOLAR
from .seen import Seen
from .view import View, polarity

MOSFETS = ("mosfet_n", "mosfet_p")


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every transistor, over all sequences."""
    for stage, part in view.parts_of(*BIPOLAR, *MOSFETS):
        yield _ask(check, view, stage, part)


def _ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequences = tuple(view.design.sequences)
    rated, plus, minus = ("v_dss", "drain", "source") if part.kind in MOSFETS else ("v_ceo", "collector", "emitter")
    rating = view.datum(part, rated, "V")
    if rating is None:
        return unknown(check, stage.name, part.ref, sequences[0], required, f"{rated} of {part.ref}")
    allowed = view.derating("v_ceo", requirement) * rating.low
    across = maximum(voltage(part.pins[plus], part.pins[minus]).scaled(polarity(part)))

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(across, sequence) for sequence in sequences], axis=0)
        # By hand an off transistor without a coil stands at the supply.
        hand = 1.0 - seen.lanes[SUPPLY] / allowed if SUPPLY in seen.lanes else None
        return ratio(np.maximum(0.0, peaks), np.full(seen.lanes.count, allowed), hand=hand)

    return Ask(check, stage.name, part.ref, sequences, required, judge, rows=(across,))


CHECKS = (
    Check(
        number=8,
        slug="peak_collector_emitter",
        title="peak collector-emitter",
        unit="V",
        required=0.0,
        formula="D = largest collector-emitter voltage of all sequences, C = derating x V_CEO",
        asks=asks,
        worst="high supply",
        by_hand="the supply across it: a transistor that is off, without a coil",
    ),
)
