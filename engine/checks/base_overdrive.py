"""Check 1: does a switching transistor get more base current than its load needs?"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..primitives.builder import Bench
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, Row, level, voltage
from ..quantity import write
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .driven import OVER, driven, ends, first_seen, over, own_current
from .seen import Seen
from .view import View, polarity

CLOSE = 0.01  # share by which a current is still that of a figure
UNDRIVEN = "no base_resistor of the stage leads to the base of {part}"
SATURATED = 0.2  # V across a transistor that is fully on, from memory


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every driver with a load."""
    for stage, role, part in view.with_role("driver"):
        loads = driven(view, stage, role, part)
        if not loads or view.bench(part.ref).gain is None:
            continue
        load = first_seen(view, loads)
        if view.bench(load.ref).on is None:
            requirement = view.requirement(check.slug, part.ref, stage.name)
            required = view.required(check.slug, check.required, requirement)
            missing = f"operating_minimum of {load.ref}"
            yield unknown(check, stage.name, part.ref, view.sequence(requirement), required, missing)
        else:
            yield _ask(check, view, stage, part, loads)


def _ask(check: Check, view: View, stage: Stage, part: Part, loads: tuple[Part, ...]) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    sequence = view.sequence(requirement)
    bench, load = view.bench(part.ref), first_seen(view, loads)
    at = view.while_on(sequence, load)
    base = level(bench.currents["base"], at)
    told = [(draw, level(voltage(*ends(view, each)), at)) for each in loads if (draw := view.bench(each.ref).draw)]
    silent = [row for each in loads if view.bench(each.ref).draw is None for row in own_current(view, each, at)]
    drop = level(voltage(part.pins["collector"], part.pins["emitter"]), at)
    driving = base_drive(view, stage, part, at)
    telling, gone = over(view, load, at)

    def judge(seen: Seen) -> Judged:
        fallen = np.abs(seen.value(drop, sequence))
        saturated = view.customary("drop of a transistor that is fully on", SATURATED, "V")
        more = np.maximum(0.0, fallen - saturated)
        parts = [draw(seen.lanes, np.abs(seen.value(row, sequence)) + more) for draw, row in told]
        wanted = np.sum([*parts, *(np.abs(seen.value(row, sequence)) for row in silent)], axis=0)
        gain = guaranteed_gain(bench, seen.lanes, wanted)
        never = ~seen.seen(base, sequence)
        hand = None
        if driving is not None:
            i_b = driving.current(seen, sequence, wanted)
            hand = 1.0 - wanted / gain / np.where(i_b > 0.0, i_b, np.nan)
        supplied = np.abs(seen.value(base, sequence))
        words = [
            (never, check.words["never"].format(load=load.ref)),
            (gone(seen, sequence), OVER.format(load=load.ref)),
        ]
        judged = ratio(wanted / gain, supplied, words, hand, UNDRIVEN.format(part=part.ref) if hand is None else "")
        return replace(judged, extrapolated=gain_beyond(part, bench, wanted))

    required = view.required(check.slug, check.required, requirement)
    rows = (base, drop, *telling, *(row for _, row in told), *silent, *(() if driving is None else (driving.row,)))
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)


@dataclass(frozen=True)
class BaseDrive:
    """What drives a base through its resistor, against the emitter: the hand formula of the base current."""

    row: Row
    resistor: Part
    leak: Part | None
    bench: Bench

    def current(self, seen: Seen, sequence: str, collector: Floats) -> Floats:
        """(V_drive - V_BE)/R_B - V_BE/R_BE with V_BE at a collector current in A."""
        assert self.bench.base_voltage is not None
        v_be = self.bench.base_voltage(seen.lanes, collector)
        current = (seen.value(self.row, sequence) - v_be) / seen.lanes[self.resistor.ref, "value"]
        return current if self.leak is None else current - v_be / seen.lanes[self.leak.ref, "value"]


def guaranteed_gain(bench: Bench, lanes: Lanes, current: Floats) -> Floats:
    """The gain at a collector current in A, beyond where it is given no larger than at the nearest current given."""
    if bench.gain_at is None:
        return np.ones(lanes.count)
    found = bench.gain_at(lanes, current)
    if bench.gain_given is None:
        return found
    return np.minimum(found, bench.gain_at(lanes, np.clip(current, *bench.gain_given)))


def gain_beyond(part: Part, bench: Bench, current: Floats) -> tuple[tuple[Mask, str], ...]:
    """In which lanes a gain is used at a collector current beyond those at which it is given, and what to say."""
    if bench.gain_given is None:
        return ()
    least, most = bench.gain_given
    given = write(least, "A", 3) if least == most else f"{write(least, 'A', 3)} .. {write(most, 'A', 3)}"
    far = np.asarray((current < least * (1.0 - CLOSE)) | (current > most * (1.0 + CLOSE)))
    return ((far, f"h_FE of {part.ref} extrapolated, given at {given}"),)


def base_drive(view: View, stage: Stage, part: Part, at: Anchor) -> BaseDrive | None:
    """The drive of a transistor at an instant; None where the stage's base resistor is not at its base."""
    resistor, bench = view.role(stage, "base_resistor"), view.bench(part.ref)
    if resistor is None or part.pins["base"] not in resistor.pins.values() or bench.base_voltage is None:
        return None
    far = next((net for net in resistor.pins.values() if net != part.pins["base"]), part.pins["base"])
    row = level(voltage(far, part.pins["emitter"]).scaled(polarity(part)), at)
    return BaseDrive(row, resistor, view.base_emitter_resistor(stage, "driver"), bench)


CHECKS = (
    Check(
        number=1,
        slug="base_overdrive",
        title="base overdrive",
        unit="A",
        required=0.5,
        formula="D = load current / h_FE of the lane, C = base current of the driver while the load is on",
        asks=asks,
        worst="cold, low supply, weak h_FE",
        by_hand="(I_L / h_FE) / ((V_drive - V_BE) / R_B - V_BE / R_BE)",
        accuracy=0.05,
        leaves_out="what else feeds the base",
        words={"never": "{load} never came on"},
    ),
)
