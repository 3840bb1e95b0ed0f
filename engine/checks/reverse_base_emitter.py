"""Check 7: is a base-emitter junction driven into reverse beyond its rating?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.signals import maximum
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .stepped_base import stepped
from .top_voltage import beside, beyond_rails, top_voltage
from .view import View, forward_base_voltage

BIPOLAR = ("npn", "pnp", "darlington_npn", "darlington_pnp")


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every bipolar transistor, over all sequences."""
    for stage, part in view.parts_of(*BIPOLAR):
        yield _ask(check, view, stage, part)


def _ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequences = tuple(view.design.sequences)
    rating = view.datum(part, "v_ebo", "V")
    if rating is None:
        return unknown(check, stage.name, part.ref, sequences[0], required, f"v_ebo of {part.ref}")
    allowed = view.derating("v_ebo", requirement) * rating.low
    reverse = maximum(forward_base_voltage(part).scaled(-1.0))
    may_step = stepped(view, part)

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(reverse, sequence) for sequence in sequences], axis=0)
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - (volts if may_step else beyond_rails(view, seen)) / allowed
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.maximum(0.0, peaks), capability, hand=hand, apart=beside(view))

    return Ask(check, stage.name, part.ref, sequences, required, judge, rows=(reverse,))


CHECKS = (
    Check(
        number=7,
        slug="reverse_base_emitter",
        title="reverse base-emitter",
        unit="V",
        required=0.0,
        formula="D = largest reverse base-emitter voltage of all sequences, C = derating x V_EBO",
        asks=asks,
        worst="high supply",
        by_hand="the whole supply where a capacitor leads to the base or the emitter is on no rail, else none",
        accuracy=0.05,
        bound=True,
        leaves_out="coils, rails that move",
    ),
)
