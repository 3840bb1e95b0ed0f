"""Check 12: does the timing capacitor get to its threshold at all, its leakage against its resistor?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..primitives.columns import SUPPLY
from ..primitives.signals import Anchor, maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every timing resistor with its capacitor."""
    for stage in view.design.stages:
        if {"timing_resistor", "timing_capacitor"} <= view.roles_of(stage).keys():
            yield _ask(
                check,
                view,
                stage,
                *(view.design.part(view.roles_of(stage)[f"timing_{p}"]) for p in ("resistor", "capacitor")),
            )


def _ask(check: Check, view: View, stage: Stage, resistor: Part, capacitor: Part) -> Ask:
    requirement = view.requirement(check.slug, resistor.ref, capacitor.ref, stage.name)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    leakage = view.bench(capacitor.ref).leak_conductance
    net = next((n for n in resistor.pins.values() if n in capacitor.pins.values()), None)
    far = next((n for n in resistor.pins.values() if n != net), None)
    if net is None or far is None:
        missing = f"a net shared by {resistor.ref} and {capacitor.ref}"
        return unknown(check, stage.name, capacitor.ref, sequence, required, missing)
    load = view.load(stage)
    asked = requirement is not None and requirement.from_ is not None and requirement.to is not None
    if load is None and not asked:
        missing = "operating_minimum of the part in the role load, whose going off tells when the timer has run out"
        return unknown(check, stage.name, capacitor.ref, sequence, required, missing)
    if requirement is not None and requirement.from_ is not None and requirement.to is not None:
        begins = view.awaited(requirement.from_, sequence)
        start = view.anchor(requirement.from_, sequence)
        end = view.anchor(requirement.to, sequence, start)
    else:
        assert load is not None
        begins = f"{load.ref} on"
        start, end = (Anchor(0.0, view.event(f"{load.ref} {change}")) for change in ("on", "off"))
    dropped = _dropped(view, stage)
    reached = maximum(voltage(net), start, end)
    rail = maximum(voltage(far), start)

    def judge(seen: Seen) -> Judged:
        threshold = seen.value(reached, sequence)
        late = ~np.isfinite(threshold)
        if leakage is not None and late.any():
            # Where the timer never ran out, its threshold is read from the same lanes with a capacitor without leakage.
            again = seen.rerun(sequence, (reached,), {(capacitor.ref, "leakage_share"): 0.0}, late)
            threshold = np.where(late, again[reached], threshold)
        leak = 0.0 if leakage is None else np.asarray(leakage(seen.lanes))
        final_share = 1.0 + seen.lanes[resistor.ref, "value"] * leak
        final = seen.value(rail, sequence) / final_share
        started = np.isfinite(seen.value(rail, sequence))
        outcomes = [
            (~started, check.words["never"].format(event=begins)),
            (~np.isfinite(threshold), check.words["late"]),
        ]
        hand, apart = None, "the conditions name no supply"
        if SUPPLY in seen.lanes:
            hand, apart = 1.0 - threshold * final_share / (seen.lanes[SUPPLY] - dropped), ""
        return ratio(threshold, final, outcomes, hand, apart)

    rows = (reached, rail)
    return Ask(check, stage.name, capacitor.ref, (sequence,), required, judge, rows)


def _dropped(view: View, stage: Stage) -> float:
    """What the diodes between supply and timer drop at little current, V: that of an entry, and of the timer's feed."""
    found = [view.role(stage, "reverse_diode")]
    if "feed_diode" in view.roles_of(stage):
        found.append(view.role(stage, "feed_diode"))
    drops = [view.datum(part, "forward_low", "V") for part in found if part is not None]
    return sum(drop.typical for drop in drops if drop is not None)


CHECKS = (
    Check(
        number=12,
        slug="arrival",
        title="arrival at the threshold",
        unit="V",
        required=0.3,
        formula="D = voltage at which the timer runs out, C = rail / (1 + R G_leak), the threshold part unloaded",
        asks=asks,
        reads={"of": "C5", "from": "begins", "to": "LS1 on"},
        worst="hot, low supply, leaky capacitors",
        by_hand="V_th (1 + R G_leak) / (supply - entry diode - feed diode)",
        accuracy=0.05,
        leaves_out="other drops before it",
        words={
            "never": "'{event}' never happened, after which the timer is looked at",
            "late": "does not run out within the sequence, even without leakage",
        },
    ),
)
