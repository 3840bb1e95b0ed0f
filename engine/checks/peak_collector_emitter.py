"""Check 8: do the collector-emitter or drain-source voltage, and the gate-source voltage, stay below their ratings?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.signals import maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .reverse_base_emitter import BIPOLAR
from .seen import Seen
from .top_voltage import beside, top_voltage
from .view import View, polarity

MOSFETS = ("mosfet_n", "mosfet_p")
LIFTED = "coils, lifted capacitors"


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
    clamp = _clamped(view, stage, part.pins[plus])

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(across, sequence) for sequence in sequences], axis=0)
        # By hand an off transistor stands at the supply, and while it switches a coil off at what clamps that above it.
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - (volts + clamp) / allowed
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.maximum(0.0, peaks), capability, hand=hand, apart=beside(view))

    return Ask(check, stage.name, part.ref, sequences, required, judge, rows=(across,))


def _clamped(view: View, stage: Stage, switched: str) -> float:
    """Volts of the flyback diode, and of the zener in series with it, of a coil on this net; 0 where there is none."""
    diode, zener = (stage.roles.get(f"flyback_{name}") for name in ("diode", "zener"))
    if diode is None or switched not in view.design.part(diode).pins.values():
        return 0.0
    forward = view.datum(view.design.part(diode), "forward_high", "V")
    stands = None if zener is None else view.datum(view.design.part(zener), "value", "V")
    return sum(0.0 if found is None else found.typical for found in (forward, stands))


def gate_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every field-effect transistor, over all sequences."""
    for stage, part in view.parts_of(*MOSFETS):
        yield _gate_ask(check, view, stage, part)


def _gate_ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequences = tuple(view.design.sequences)
    rating = view.datum(part, "v_gss", "V")
    if rating is None:
        return unknown(check, stage.name, part.ref, sequences[0], required, f"v_gss of {part.ref}")
    allowed = view.derating("v_gss", requirement) * rating.low
    gate = voltage(part.pins["gate"], part.pins["source"])
    most, least = maximum(gate), maximum(gate.scaled(-1.0))
    divided = gate_divider(view, stage, part)

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(row, sequence) for sequence in sequences for row in (most, least)], axis=0)
        volts = top_voltage(view, seen, sequences)
        hand = None if volts is None else 1.0 - gate_by_hand(seen, volts, divided) / allowed
        capability = np.full(seen.lanes.count, allowed)
        return ratio(np.maximum(0.0, peaks), capability, hand=hand, apart=beside(view))

    return Ask(check, stage.name, part.ref, sequences, required, judge, rows=(most, least))


def gate_divider(view: View, stage: Stage, part: Part) -> tuple[str, str] | None:
    """The resistors of a stage that divide the supply to its gate, in series and to its source."""
    series, bleed = (view.role(stage, f"gate_{name}resistor") for name in ("", "bleed_"))
    if series is None or bleed is None or any(part.pins["gate"] not in r.pins.values() for r in (series, bleed)):
        return None
    return series.ref, bleed.ref


def gate_by_hand(seen: Seen, volts: Floats, divided: tuple[str, str] | None) -> Floats:
    """A voltage, or what the resistors of :func:`gate_divider` leave of it at the gate, V per lane."""
    if divided is None:
        return volts
    series, bleed = (seen.lanes[ref, "value"] for ref in divided)
    return np.asarray(bleed / (bleed + series) * volts)


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
        by_hand="the supply (in a surge its clamp) and, with a coil, what takes it: V + V_flyback + V_zener",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
    ),
    Check(
        number=8,
        slug="gate_source",
        title="peak gate-source",
        unit="V",
        required=0.0,
        formula="D = largest gate-source voltage of either sign in all sequences, C = derating x V_GSS",
        asks=gate_asks,
        worst="high supply",
        by_hand="supply x R_bleed / (R_bleed + R_gate), the whole supply without these: driven from rail to rail",
        accuracy=0.05,
        bound=True,
        leaves_out=LIFTED,
    ),
)
