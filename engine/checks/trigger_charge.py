"""Check 4: does the trigger's capacitor bring enough charge to fire the latch, or whatever it triggers?

The trial makes the capacitor smaller until what the sequence does to fire it no longer does. Demand is the
charge of the smallest one that does, capability that of the one in the design, at the same swing of its driven side.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import Timeline
from ..design.part import Part, Stage
from ..design.sequence import ConnectSupply, ContactEvent, DisconnectSupply, RampLevel
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, crossing, maximum, minimum, voltage
from ..quantity import read
from ..run import Observed
from .alarm_state import TOLD_BY, alarm_states, settling
from .base_capacitance import held_by
from .check import Apart, Ask, Check, Judged, Mask, ratio, unknown
from .complementary_latch import TRIP_CURRENT, Latch
from .seen import Seen
from .trial import Trial
from .view import View

SLOW = 30e-6  # s until a latch helps itself: meanwhile its base takes the more the quicker the charge comes
TAKES_LONG = "its latch takes more than 30 us to help itself, and its base more than the formula counts"
LARGEST, SMALLEST = 30.0, 0.01  # capacitors of the trial, in that of the design
BEFORE = 1e-3  # s before the event that fires the latch
SETTLE = 0.1  # s after it at which the last look is taken, where the requirement gives none


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every trigger capacitor."""
    for stage, _, part in view.with_role("trigger_capacitor"):
        yield _ask(check, view, stage, part)


def _fires(view: View, sequence: str, from_: str | None) -> tuple[float, float] | None:
    """When the event happens that raises the alarm, and how long it takes: the first that is none of the supply."""
    if from_ is not None:
        anchor = view.anchor(from_, sequence)
        return None if anchor.row is not None else (anchor.by, 0.0)
    for event in sorted(view.design.sequences[sequence].events, key=lambda e: read(e.at, "s")):
        if not isinstance(event, ConnectSupply | DisconnectSupply):
            lasts = 0.0
            if isinstance(event, RampLevel):
                lasts = read(event.for_, "s")
            elif isinstance(event, ContactEvent) and event.bounce is not None:
                lasts = read(event.bounce.for_, "s")
            return read(event.at, "s"), lasts
    return None


def _ask(check: Check, view: View, stage: Stage, part: Part) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    states = alarm_states(view, stage)
    if not states:
        return unknown(check, stage.name, part.ref, sequence, required, TOLD_BY)
    state = states[0]
    latch = state.latch
    fires = _fires(view, sequence, None if requirement is None else requirement.from_)
    if fires is None:
        missing = f"an event in sequence {sequence} that raises the alarm, or its time as from in the requirement"
        return unknown(check, stage.name, part.ref, sequence, required, missing)
    at, lasts = fires
    before = min(BEFORE, 0.5 * at)
    settle = view.extra(requirement, "settle", "s") or settling(view, states, sequence, SETTLE)
    over = before + lasts
    begin, end = Anchor(at - before), Anchor(min(at + lasts + settle, view.ends(sequence)))
    swings = [(maximum(voltage(net), begin, end), minimum(voltage(net), begin, end)) for net in part.pins.values()]
    lifted = []
    if latch is not None:
        pair = zip(latch.lifts, (latch.npn, latch.pnp), strict=True)
        lifted = [crossing(lift, _turn_on(view, who), True, begin) for lift, who in pair]
    key = part.ref, "value"

    def drive(line: Timeline, knob: Floats) -> None:
        """What the sequence does is all that happens."""

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        return ~state.tripped(lanes, observed, over, settle)

    trial = Trial(
        key=f"trigger charge {part.ref}",
        sequence=sequence,
        start=begin,
        drive=drive,
        ends=over + settle,
        safe=1.0 / LARGEST,
        severe=1.0 / SMALLEST,
        rows=state.watch(over, settle),
        gives_in=gives_in,
        onward=True,
        vary=lambda lanes, knob: lanes.replaced({key: lanes[key] / knob}),
    )

    def judge(seen: Seen) -> Judged:
        # Its driven side is the one that swings more.
        swing = np.max([seen.value(top, sequence) - seen.value(low, sequence) for top, low in swings], axis=0)
        brought = seen.lanes[key] * swing
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), capability=brought)
        outcomes = [(edge.always, check.words["always"])]
        hand, late = None, np.zeros(seen.lanes.count, dtype=bool)
        if latch is not None:
            between = np.abs(seen.time(lifted[0], sequence) - seen.time(lifted[1], sequence))
            hand, late = _hand(latch, part, seen, swing, between), between > SLOW
        apart: Apart = ((late, TAKES_LONG),)
        if latch is None:
            apart = ((None, "no latch: the formula is that of its npn's base"),)
        elif hand is None:
            apart = ((None, f"a gain of {latch.npn.ref}, its base-emitter resistor or the supply is not given"),)
        return ratio(brought / edge.knob, brought, outcomes, hand, apart)

    rows = (*(row for pair in swings for row in pair), *lifted)
    screen = 1.0 / (1.0 - required) if required < 1.0 else None
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows, trial, screen)


def _turn_on(view: View, part: Part) -> float:
    base_voltage = view.bench(part.ref).base_voltage
    assert base_voltage is not None
    return float(base_voltage(view.circuit.nominal(), TRIP_CURRENT)[0])


def _diodes(latch: Latch) -> list[Part]:
    """The diodes that lead to a base of the latch."""
    bases = {latch.npn.pins["base"], latch.pnp.pins["base"]}
    return [part for _, part in latch.view.parts_of("diode", "schottky") if bases & set(part.pins.values())]


def _hand(latch: Latch, part: Part, seen: Seen, swing: Floats, between: Floats) -> Floats | None:
    """1 - D/C with D = C_node V_BE + (V_BE/R_BE + I_C/h_FE) t_regeneration and C = C_t (dV - V_BE - V_D).

    I_C turns the pnp on through its resistor; t_regeneration is read from the sequence: from one transistor's turning
    on to the other's.
    """
    view, npn = latch.view, latch.npn
    resistors = [view.base_emitter_resistor(latch.stage, role) for role in ("latch_npn", "latch_pnp")]
    gain = view.bench(npn.ref).gain
    if gain is None or resistors[0] is None or SUPPLY not in seen.lanes:
        return None
    npn_on, pnp_on = latch.turn_on(seen.lanes)
    base = npn.pins["base"]
    held = held_by(view, seen.lanes, base, part.ref)
    collector = 0.0 if resistors[1] is None else pnp_on / seen.lanes[resistors[1].ref, "value"]
    drained = npn_on / seen.lanes[resistors[0].ref, "value"] + collector / np.asarray(gain(seen.lanes))
    series = [d for d in _diodes(latch) if base in d.pins.values() and set(d.pins.values()) & set(part.pins.values())]
    drop = sum(view.forward(diode, "forward_low", seen.lanes) for diode in series)
    demand = held * npn_on + drained * between
    capability = seen.lanes[part.ref, "value"] * (swing - npn_on - drop)
    safe = np.where(capability > 0.0, capability, 1.0)
    return np.where(capability > 0.0, 1.0 - demand / safe, -1.0)


CHECKS = (
    Check(
        number=4,
        slug="trigger_charge",
        title="trigger charge",
        unit="C",
        required=0.5,
        formula="D = charge of the smallest trigger capacitor that fires the latch, C = charge of the one there is",
        asks=asks,
        reads={"of": "C2", "from": "LS1 on", "settle": "0.1 s"},
        words={"always": "never fired: not with thirty times the capacitor either"},
        worst="cold, low supply, small trigger capacitor",
        by_hand="1 - (C_node V_BE + (V_BE/R_BE + I_C/h_FE) t_regeneration) / (C_t (dV - V_BE - V_D))",
        accuracy=0.1,
        leaves_out="other drains, a slow edge",
    ),
)
