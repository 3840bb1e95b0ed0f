"""Check 3: does leakage through the base-emitter resistor stay below what begins to turn a transistor on?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.builder import RETURN, SUPPLY_NET
from ..primitives.signals import Anchor, level, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .driven import driven
from .seen import Seen
from .view import View, forward_base_voltage, polarity

ROLES = ("trip_device", "latch_npn", "latch_pnp", "threshold_device", "reset_device", "driver")
OPEN = 0.1  # V of collector over base from which its leakage flows in full
PERMITTED = 1e-6  # A, collector current that counts as off where the requirement gives none


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every transistor in a switching role."""
    found: set[str] = set()
    for stage, role, part in view.with_role(*ROLES):
        if view.bench(part.ref).base_voltage is not None and part.ref not in found:
            found.add(part.ref)
            yield _ask(check, view, stage, role, part)


def _ask(check: Check, view: View, stage: Stage, role: str, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    sequence = view.sequence(requirement)
    load = next(iter(driven(view, stage, role, part)), None) if role.startswith("driver") else None
    rests = load is not None and view.rests_on(load)
    at = view.moment(sequence, *(("sounding", "on") if rests else ("standby",))) or Anchor(0.5 * view.ends(sequence))
    across = level(forward_base_voltage(part), at)
    permitted = view.extra(requirement, "off_current", "A") or view.customary("permitted off-current", PERMITTED, "A")
    required = view.required(check.slug, check.required, requirement)
    bench = view.bench(part.ref)
    if bench.leakage is None:
        return unknown(check, stage.name, part.ref, sequence, required, f"i_cbo of {part.ref}")
    resistor = view.base_emitter_resistor(stage, role)
    followed = any(
        each.pins["emitter"] == part.pins["base"] for _, each in view.parts_of("npn", "pnp") if each.ref != part.ref
    )
    leaking = (part, *_leaking_into(view, part, resistor))
    # A collector that stands no higher than its base lets nothing through.
    open_ = tuple(
        level(voltage(each.pins["collector"], each.pins["base"]).scaled(polarity(each)), at) for each in leaking
    )

    def judge(seen: Seen) -> Judged:
        assert bench.base_voltage is not None
        allowed = bench.base_voltage(seen.lanes, permitted)
        hand = None
        # A fail-safe driver is held off by another transistor, and not by leakage through its own resistor.
        if resistor is not None and bench.leakage is not None and not rests:
            leaks = np.zeros(seen.lanes.count)
            for each, row in zip(leaking, open_, strict=True):
                leak = view.bench(each.ref).leakage
                leaks = leaks + (
                    0.0 if leak is None else np.where(seen.value(row, sequence) > OPEN, leak(seen.lanes), 0.0)
                )
            hand = 1.0 - leaks * seen.lanes[resistor.ref, "value"] / allowed
        apart = ""
        if hand is None:
            apart = "its base is held off by another transistor" if rests else "no base-emitter resistor in its role"
        elif followed:
            apart = "the emitter of another transistor feeds its base, with more than leakage"
        return ratio(np.maximum(0.0, seen.value(across, sequence)), allowed, hand=hand, apart=apart)

    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows=(across, *open_))


def _leaking_into(view: View, part: Part, resistor: Part | None) -> list[Part]:
    """The other transistors whose collector leakage flows into a base, straight or through a resistor."""
    if resistor is None or part.pins["base"] not in resistor.pins.values():
        return []
    nets = {part.pins["base"]}
    for _, other in view.parts_of("resistor"):
        ends = set(other.pins.values())
        if other is not resistor and part.pins["base"] in ends and not ends & {RETURN, SUPPLY_NET}:
            nets |= ends
    opposite = [each for _, each in view.parts_of("npn", "pnp") if polarity(each) != polarity(part)]
    return [each for each in opposite if each.pins["collector"] in nets and each.ref != part.ref]


CHECKS = (
    Check(
        number=3,
        slug="hot_off_state",
        title="hot off-state",
        unit="V",
        required=0.5,
        formula="D = base-emitter voltage in stand-by, C = the base-emitter voltage at the permitted off-current",
        asks=asks,
        reads={"of": "Q8", "off_current": "1 uA"},
        worst="hot",
        by_hand="I_CBO R_BE / V_BE at the permitted current: its own and that of transistors whose collectors feed it",
        accuracy=0.1,
        leaves_out="what else feeds its base",
    ),
)
