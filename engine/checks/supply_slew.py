"""Check 6: does connecting the supply trip a latch?

The trial connects the supply ever faster, from an empty circuit, and looks whether the latch has tripped when all has
settled; demand and capability are slews at the latch's own supply node, behind every filter.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import DEFAULT_RISE, Timeline
from ..design.part import Part, Stage
from ..design.sequence import ConnectSupply
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, level, maximum, slew, voltage
from ..quantity import read
from ..run import Observed
from .check import Ask, Check, Judged, Mask, ratio
from .seen import Seen
from .trial import Trial
from .view import View, forward_base_voltage

SLOWEST, FASTEST = 10.0, 1e-8  # s, rise times of the trial
SETTLE = 0.1  # s after the rise until the trial looks at the latch
WATCHED = 1e-3  # s after the rise during which the node's slew is watched
TRIP_CURRENT = 10e-6  # A, collector current that begins to trip a latch, in the hand formula


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch."""
    for stage in view.design.stages:
        if "latch_npn" in stage.roles and "latch_pnp" in stage.roles:
            npn, pnp = (view.design.part(stage.roles[role]) for role in ("latch_npn", "latch_pnp"))
            yield _ask(check, view, stage, npn, pnp)


def _connection(view: View, sequence: str) -> tuple[float, float]:
    """When the sequence connects the supply, and how fast."""
    for event in view.design.sequences[sequence].events:
        if isinstance(event, ConnectSupply):
            return read(event.at, "s"), DEFAULT_RISE if event.rise is None else read(event.rise, "s")
    return 0.0, DEFAULT_RISE


def _ask(check: Check, view: View, stage: Stage, npn: Part, pnp: Part) -> Ask:
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    sequence = view.sequence(requirement, "snap")
    required = view.required(check.slug, check.required, requirement)
    at, rise = _connection(view, sequence)
    node = voltage(pnp.pins["emitter"], npn.pins["emitter"])
    steepest = slew(node, Anchor(at), Anchor(at + rise + WATCHED))

    # Every lane of the trial is looked at when the slowest supply is up and has settled.
    probe = level(voltage(pnp.pins["emitter"], pnp.pins["collector"]), Anchor(SLOWEST + SETTLE))
    rail = level(node, Anchor(SLOWEST + SETTLE))
    fastest = slew(node)

    def drive(line: Timeline, knob: Floats) -> None:
        line.connect_supply(0.0, 1.0 / knob)

    lifts = tuple(maximum(forward_base_voltage(part)) for part in (npn, pnp))
    turn_on = tuple(view.bench(part.ref).base_voltage for part in (npn, pnp))

    def spare(lanes: Lanes, observed: Observed) -> Floats:
        """How far the one that is lifted less stays below what turns it on: a latch trips when both conduct."""
        left = [
            law(lanes, TRIP_CURRENT) - observed.value(lift)
            for lift, law in zip(lifts, turn_on, strict=True)
            if law is not None
        ]
        return np.max(left, axis=0) if left else np.zeros(lanes.count)

    def gives_in(observed: Observed) -> Mask:
        return np.asarray(observed.value(probe) < 0.5 * observed.value(rail))

    trial = Trial(
        key=f"supply slew {stage.name}",
        sequence=sequence,
        start=None,
        drive=drive,
        ends=SLOWEST + SETTLE,
        safe=1.0 / SLOWEST,
        severe=1.0 / FASTEST,
        rows=(fastest, probe, rail, *lifts),
        gives_in=gives_in,
        spare=spare,
    )

    def judge(seen: Seen) -> Judged:
        demand = seen.value(steepest, sequence)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=demand)
        judged = ratio(
            demand,
            edge.values[fastest],
            [(edge.always, check.words["always"])],
            _hand(view, stage, npn, seen, demand),
        )
        margin = np.where(edge.never, 1.0, judged.margin)
        outcomes = (*judged.outcomes, (edge.never, check.words["immune"]))
        return Judged(margin, demand, judged.capability, outcomes=outcomes, hand=judged.hand)

    screen = 1.0 / (rise * (1.0 - required)) if required < 1.0 else None
    return Ask(check, stage.name, npn.ref, (sequence,), required, judge, (steepest,), trial, screen)


def _hand(view: View, stage: Stage, npn: Part, seen: Seen, demand: Floats) -> Floats | None:
    """1 - D/s with s from v = s R C_c (1 - exp(-V/(s R C))), the base voltage at the end of a rise to V through the
    coupling C_c of strays and collector, C being all that hangs on the base; 1 where no slew can reach the trip level.
    """
    resistor = view.base_emitter_resistor(stage, "latch_npn")
    base_voltage = view.bench(npn.ref).base_voltage
    if resistor is None or base_voltage is None:
        return None
    base = npn.pins["base"]
    coupling = sum(read(s.value, "F") for s in view.design.strays if base in s.between)
    collector, emitter = (view.datum(npn, key, "F") for key in ("c_ob", "c_ib"))
    coupling += 0.0 if collector is None else collector.typical
    if coupling == 0.0:
        return None
    capacitor = view.role(stage, "base_capacitor")
    total = coupling + (0.0 if emitter is None else emitter.typical)
    held = total + (0.0 if capacitor is None else seen.lanes[capacitor.ref, "value"])
    supply, resistance = seen.lanes[SUPPLY], seen.lanes[resistor.ref, "value"]
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
        words={
            "always": "trips however slowly the supply is connected",
            "immune": "immune at any slew",
        },
    ),
)
