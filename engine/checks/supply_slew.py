"""Check 6: does connecting the supply trip a latch?

The trial connects the supply ever faster, from an empty circuit, and looks whether the latch has tripped when all has
settled; demand and capability are slews at the latch's own supply node, behind every filter.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import DEFAULT_RISE, Timeline
from ..design.part import Part
from ..design.sequence import ConnectSupply
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, maximum, slew
from ..quantity import read
from ..run import Observed
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .complementary_latch import TRIP_CURRENT, Latch, latches
from .seen import Seen
from .trial import Trial
from .view import View

SLOWEST, FASTEST = 10.0, 1e-8  # s, rise times of the trial
SETTLED = (0.01, 0.1)  # s after the rise at which the trial looks at the latch: a timed one may let go again
UNCOUPLED = "no base-emitter resistor of the npn in its role, or nothing couples into its base"
WATCHED = 1e-3  # s after the rise during which the node's slew is watched


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch."""
    for latch in latches(view):
        yield _ask(check, latch)


def connection(view: View, sequence: str) -> tuple[float, float]:
    """When the sequence connects the supply, and how fast."""
    for event in view.design.sequences[sequence].events:
        if isinstance(event, ConnectSupply):
            return read(event.at, "s"), DEFAULT_RISE if event.rise is None else read(event.rise, "s")
    return 0.0, DEFAULT_RISE


def _ask(check: Check, latch: Latch) -> Ask:
    view, stage, npn, pnp = latch.view, latch.stage, latch.npn, latch.pnp
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    sequence = view.sequence(requirement, "snap")
    required = view.required(check.slug, check.required, requirement)
    missing = _missing_capacitance(view, npn) or _missing_capacitance(view, pnp)
    if missing is not None:
        return unknown(check, stage.name, npn.ref, sequence, required, missing)
    at, rise = connection(view, sequence)
    steepest = slew(latch.rail, Anchor(at), Anchor(at + rise + WATCHED))

    # The supply is up at the same instant in every lane of the trial, so that all are looked at soon after it.
    looks = [latch.probes(Anchor(SLOWEST + settled)) for settled in SETTLED]
    fastest = slew(latch.rail)
    lifts = tuple(maximum(lift) for lift in latch.lifts)

    def drive(line: Timeline, knob: Floats) -> None:
        line.connect_supply(SLOWEST - 1.0 / knob, 1.0 / knob)

    def spare(lanes: Lanes, observed: Observed) -> Floats:
        """How far the one that is lifted less stays below what turns it on: a latch trips when both conduct."""
        left = [on - observed.value(lift) for lift, on in zip(lifts, latch.turn_on(lanes), strict=True)]
        return np.asarray(np.max(left, axis=0))

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        return np.asarray(np.any([latch.conducts(lanes, observed, probes) for probes in looks], axis=0))

    trial = Trial(
        key=f"supply slew {stage.name}",
        sequence=sequence,
        start=None,
        drive=drive,
        ends=SLOWEST + SETTLED[-1],
        safe=1.0 / SLOWEST,
        severe=1.0 / FASTEST,
        rows=(fastest, *lifts, *(row for probes in looks for row in probes)),
        gives_in=gives_in,
        spare=spare,
    )

    def judge(seen: Seen) -> Judged:
        demand = seen.value(steepest, sequence)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        hand = slew_by_hand(latch, seen, demand)
        apart = UNCOUPLED if hand is None else ""
        judged = ratio(demand, edge.values[fastest], [(edge.always, check.words["always"])], hand, apart)
        margin = np.where(edge.never, 1.0, judged.margin)
        return replace(judged, margin=margin, outcomes=(*judged.outcomes, (edge.never, check.words["immune"])))

    screen = 1.0 / (max(rise, FASTEST) * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, npn.ref, (sequence,), required, judge, (steepest,), trial, screen)


def _missing_capacitance(view: View, part: Part) -> str | None:
    """What is missing to know how the collector couples into the base: nothing would couple without it."""
    if part.law:
        key = "base_collector_capacitance"
        return None if part.law_limits(key, "F") is not None else f"{key} in the law of {part.ref}"
    return None if view.datum(part, "c_ob", "F") is not None else f"c_ob of {part.ref}"


def slew_by_hand(latch: Latch, seen: Seen, demand: Floats, lingers: float = 0.0) -> Floats | None:
    """1 - D/s with s from v = s R C_c (1 - exp(-V/(s R C))), the base voltage at the end of a rise by V through the
    coupling C_c of strays and collector, C being all that hangs on the base; 1 where no slew can reach the trip level.
    ``lingers``: the voltage from which the supply rises.
    """
    view, stage, npn = latch.view, latch.stage, latch.npn
    resistor = view.base_emitter_resistor(stage, "latch_npn")
    base_voltage = view.bench(npn.ref).base_voltage
    if resistor is None or base_voltage is None:
        return None
    base = npn.pins["base"]
    coupling = sum(view.strays_at(base))
    collector, emitter = (view.datum(npn, key, "F") for key in ("c_ob", "c_ib"))
    coupling += 0.0 if collector is None else collector.typical
    if coupling == 0.0:
        return None
    capacitor = view.role(stage, "base_capacitor")
    total = coupling + (0.0 if emitter is None else emitter.typical)
    held = total + (0.0 if capacitor is None else seen.lanes[capacitor.ref, "value"])
    supply, resistance = seen.lanes[SUPPLY] - lingers, seen.lanes[resistor.ref, "value"]
    trip = base_voltage(seen.lanes, TRIP_CURRENT)
    low, high = np.full(seen.lanes.count, np.log(1.0)), np.full(seen.lanes.count, np.log(1e12))
    for _ in range(60):
        middle = 0.5 * (low + high)
        tau = np.exp(middle) * resistance
        below = tau * coupling * -np.expm1(-supply / (tau * held)) < trip
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.where(supply * coupling < trip * held, 1.0, 1.0 - demand / np.exp(high))


CHECKS = (
    Check(
        number=6,
        slug="supply_slew",
        title="supply slew without a false trip",
        unit="V/s",
        required=0.5,
        formula="D = slew of the latch's supply node as the supply comes, C = largest slew that does not trip it",
        asks=asks,
        worst="hot, high supply",
        by_hand="s of V_BE = s R C_c (1 - exp(-V/(s R C))): one base alone",
        hand_source="closed form of R and C",
        accuracy=0.1,
        leaves_out="other base, filters before",
        words={
            "always": "trips however slowly the supply is connected",
            "immune": "immune at any slew",
        },
    ),
)
