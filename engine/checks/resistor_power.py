"""Check 30: does a resistor stay below its derated power?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.signals import Anchor, integral, level
from .check import Ask, Check, Judged, ratio, unknown
from .peak_collector_emitter import LIFTED
from .seen import Seen
from .top_voltage import beside, top_voltage
from .view import View

FULL_UNTIL, ZERO_AT = 70.0, 155.0  # deg C, metal film, from memory


def permitted(rating: float, celsius: Floats) -> Floats:
    """Rated power at an ambient temperature: full to 70 C, falling to nothing at 155 C."""
    return rating * np.clip((ZERO_AT - celsius) / (ZERO_AT - FULL_UNTIL), 0.0, 1.0)


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every resistor that is not a 0R link."""
    for stage, part in view.parts_of("resistor"):
        if view.bench(part.ref).power is not None:
            yield _ask(check, view, stage, part)


def _ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    rating = view.datum(part, "rating", "W")
    if rating is None:
        return unknown(check, stage.name, part.ref, sequence, required, f"rating of {part.ref}")
    factor = view.derating("resistor_power", requirement)
    power = view.bench(part.ref).power
    assert power is not None
    moments = [view.anchor(name, sequence) for name in view.design.sequences[sequence].moments]
    instants = moments or [Anchor(0.5 * view.ends(sequence))]
    steady = tuple(level(power, at) for at in instants)
    load = view.load(stage)
    whole = None
    if load is not None:
        on, off = view.event(f"{load.ref} on"), view.event(f"{load.ref} off")
        whole = integral(power, Anchor(0.0, on), Anchor(0.0, off))

    def judge(seen: Seen) -> Judged:
        powers = [seen.value(row, sequence) for row in steady]
        if whole is not None:
            lasted = seen.value(off, sequence) - seen.value(on, sequence)
            powers.append(seen.value(whole, sequence) / np.where(lasted > 0.0, lasted, np.nan))
        never = np.asarray(np.isnan(powers).all(axis=0))
        largest = np.max(np.nan_to_num(powers), axis=0)
        for what, celsius in (("full power up to", FULL_UNTIL), ("no power from", ZERO_AT)):
            view.customary(what, celsius, "degC")
        allowed = factor * permitted(rating.low, seen.lanes.ambient)
        volts, hand = top_voltage(view, seen, (sequence,)), None
        if volts is not None:
            # By hand the whole supply stands across it: V^2/R, never less than what it dissipates without a coil.
            hand = 1.0 - volts**2 / seen.lanes[part.ref, "value"] / np.where(allowed > 0.0, allowed, np.nan)
        return ratio(largest, allowed, [(never, check.words["never"])], hand, beside(view))

    rows = (*steady, *((whole, on, off) if whole is not None else ()))
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)


CHECKS = (
    Check(
        number=30,
        slug="resistor_power",
        title="resistor power",
        unit="W",
        required=0.0,
        formula="D = largest power at the moments of the sequence and averaged over the alarm, C = derating x P(T)",
        asks=asks,
        worst="hot, high supply",
        by_hand="V^2/R with the whole supply across it",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
        words={"never": "none of the moments at which its power is read ever came"},
    ),
)
