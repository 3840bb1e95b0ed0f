"""Check 22: does the latch hold when its own load comes on and pulls the supply down?

The dip is read where the latch is fed, once it has lasted for a while; what it bears is what is left to the voltage
there at which it lets go, found by the trial of check 5. A latch that is fed through a resistor keeps its own voltage:
its supply is looked at instead.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part
from ..design.sequence import Dip, DisconnectSupply, ReverseSupply, Surge
from ..kernel.layout import Floats
from ..primitives.builder import SUPPLY_NET
from ..primitives.columns import SOURCE_RESISTANCE, SUPPLY
from ..primitives.signals import Anchor, level
from ..quantity import read
from .alarm_state import standby
from .check import Apart, Ask, Check, Judged, Mask, ratio, unknown
from .complementary_latch import Latch, latches
from .driven import drawn, joined, surged, together
from .latch import hold_trial_of, not_set
from .seen import Seen
from .view import View

LOOKS = tuple(20e-6 * 1.9**k for k in range(18))
"""s after the load came on, up to 1 s: what none of them meets is over before a latch has let go (from memory)."""
BEHIND = "it is fed through more than a fuse or a lead, and what lies between drops as well"
COLLAPSED = 1.6  # V: a conducting latch that stands below this is fed by a current, from memory


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch, where the design has a load that an alarm turns on."""
    for latch in latches(view):
        load = view.load(latch.stage)
        # A load that an alarm lets go of pulls nothing down.
        if load is not None and len(latch.rails) == 2 and not view.rests_on(load):
            yield _ask(check, latch, load)


def _ask(check: Check, latch: Latch, load: Part) -> Ask:
    view, stage, npn, pnp = latch.view, latch.stage, latch.npn, latch.pnp
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    if view.design.conditions.source_resistance is None:
        missing = "source_resistance under conditions (0R where there is none)"
        return unknown(check, stage.name, pnp.ref, sequence, required, missing)
    trial = hold_trial_of(latch)
    missing = not_set(view, stage, sequence)
    # As the supply comes the load may be on for a moment.
    rest = standby(view, sequence)
    on = Anchor(0.0, view.event(f"{load.ref} on", rest))
    before = [level(rail, rest) for rail in latch.rails]
    looks = [[level(rail, Anchor(after, on.row)) for after in LOOKS] for rail in latch.rails]
    undisturbed = _undisturbed(view, sequence)
    own = level(latch.rail, on)

    def least(seen: Seen, n: int) -> Floats:
        """The lowest of all looks before an event moves the supply; NaN where there was none."""
        early = [seen.time(row, sequence) < undisturbed for row in looks[n]]
        values = [np.where(e, seen.value(row, sequence), np.nan) for e, row in zip(early, looks[n], strict=True)]
        return np.asarray(np.fmin.reduce(values))

    fed = SUPPLY_NET in joined(view, pnp.pins["emitter"])

    def judge(seen: Seen) -> Judged:
        collapsed = seen.value(own, sequence) < view.customary("latch fed by a current below", COLLAPSED, "V")
        full = _pick(collapsed, *(seen.value(row, sequence) for row in before))
        dip = full - _pick(collapsed, least(seen, 0), least(seen, 1))
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=dip)
        held = _pick(collapsed, *(edge.values[row] for row in trial.rows[-2:]))
        outcomes = [
            (edge.missing, missing),
            (edge.always, check.words["always"]),
            (~np.isfinite(dip), check.words["never"]),
        ]
        hand = _hand(view, load, seen, held)
        apart: Apart = ((~collapsed & (not fed), BEHIND),)
        if hand is None:
            apart = ((None, f"what {load.ref} draws, or the supply, is not given"),)
        return ratio(dip, full - held, outcomes, hand, apart)

    rows = (*before, *looks[0], *looks[1], own)
    # What the load draws moves the margin, and is nothing that the trial moves.
    return Ask(check, stage.name, pnp.ref, (sequence,), required, judge, rows, trial, follows_knob=False)


def _undisturbed(view: View, sequence: str) -> float:
    """Until when no event moves the supply, s."""
    events = view.design.sequences[sequence].events
    moved = [read(e.at, "s") for e in events if isinstance(e, DisconnectSupply | ReverseSupply | Dip | Surge)]
    return min(moved, default=np.inf)


def _pick(collapsed: Mask, own: Floats, supply: Floats) -> Floats:
    return np.where(collapsed, supply, own)


def _hand(view: View, load: Part, seen: Seen, held: Floats) -> Floats | None:
    """1 - V R/(R + R_load)/(V - V_hold): R of source and fuse, R_load = V/I, I the larger of surge and current."""
    loads = together(view, load)
    if drawn(view, loads) is None or SUPPLY not in seen.lanes or SOURCE_RESISTANCE not in seen.lanes:
        return None
    supply = seen.lanes[SUPPLY]
    current = surged(view, loads, lambda each: view.bench(each.ref).draw)(seen.lanes, supply)
    ohms = seen.lanes[SOURCE_RESISTANCE]
    for _, fuse in view.parts_of("fuse"):
        resistance = view.datum(fuse, "resistance", "ohm")
        ohms = ohms + (0.0 if resistance is None else resistance.typical)
    dip = current * ohms / (1.0 + current * ohms / supply)
    return np.asarray(1.0 - dip / (supply - held))


CHECKS = (
    Check(
        number=22,
        slug="self_dip",
        title="self-dip",
        unit="V",
        required=0.3,
        formula="D = dip of the feed as the load comes on, C = the feed before it - that at which the latch lets go",
        worst="low supply, soft source, cold",
        by_hand="V R / (R + R_load) / (V - V_hold), R = R_source + R_fuse, R_load = V / I, I the larger of surge and"
        " current of the load",
        hand_source="Ohm's law, V_hold by the trial",
        accuracy=0.05,
        leaves_out="other drops, capacitors",
        asks=asks,
        words={
            "always": "the latch lets go by itself",
            "never": "the load never came on",
        },
    ),
)
