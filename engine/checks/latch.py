"""Check 5: does a latch hold in the weakest conditions, and does it let go when it is reset?

The holding current is found by a trial: from the latched state the supply, and with it every battery, is lowered until
the latch lets go.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..circuit.timeline import Timeline
from ..design.part import Stage
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, level, minimum
from ..run import Observed
from .alarm_state import WAIT
from .check import Ask, Check, Judged, Mask, ratio
from .complementary_latch import Latch, latches
from .seen import Seen
from .trial import Trial
from .view import View

LOWERING = 1e-3  # s in which the trial lowers the supply
SETTLE = 0.2  # s until the trial looks whether the latch still holds, where the requirement gives none
DROP = 0.8  # V across a conducting latch, from memory
RESISTIVE = "its transistors drive each other's base through resistors: what it feeds beside is part of its current"
BARE = "the roles of both base-emitter resistors of the latch are not filled"
NEVER_SET = "the latch was never set"
LEAST_SUPPLY = 0.02  # lowest supply of the trial, as a fraction


SET = ("latched", "sounding", "on")
"""Moments at which a latch is set."""


def latched(view: View, stage: Stage, sequence: str) -> Anchor:
    """When the latch is set: a moment of that kind, else soon after the load came on, else in the middle."""
    start = view.moment(sequence, *SET)
    if start is None:
        load = view.load(stage)
        start = Anchor(0.5 * view.ends(sequence)) if load is None else Anchor(1e-2, view.event(f"{load.ref} on"))
    return start


def not_set(view: View, stage: Stage, sequence: str) -> str:
    """What is said where that instant never came: the latch itself may be right, and what tells of it wrong."""
    load = view.load(stage)
    named = next((name for name in SET if name in view.design.sequences[sequence].moments), None)
    event = view.awaited(named, sequence) if named is not None else None if load is None else f"{load.ref} on"
    return NEVER_SET if event is None else f"'{event}' never happened, after which the latch is looked at"


def hold_trial_of(latch: Latch) -> Trial:
    """The trial behind every check that must know when a latch lets go: ``rows`` begin with the latch current and end
    with the voltages at the latch and of the supply, all at the last supply at which it holds."""
    view = latch.view
    requirement = view.requirement("latch_hold", latch.npn.ref, latch.pnp.ref, latch.stage.name)
    return _hold_trial(
        latch, view.sequence(requirement), view.extra(requirement, "settle", "s") or view.customary(WAIT, SETTLE, "s")
    )


def _hold_trial(latch: Latch, sequence: str, settle: float) -> Trial:
    start = latched(latch.view, latch.stage, sequence)
    ends = LOWERING + settle
    current = level(latch.current, Anchor(ends))
    probes = latch.probes(Anchor(ends))

    def drive(line: Timeline, knob: Floats) -> None:
        line.move_supply(0.0, line.lanes[SUPPLY] / knob, LOWERING)
        # A battery that takes over would keep it on, and its holding current unknown.
        line.move_batteries(0.0, knob, LOWERING)

    def gives_in(lanes: Lanes, observed: Observed) -> Mask:
        return ~latch.conducts(lanes, observed, probes)

    return Trial(
        key=f"latch hold {latch.stage.name}",
        sequence=sequence,
        start=start,
        drive=drive,
        ends=ends,
        safe=1.0,
        severe=1.0 / LEAST_SUPPLY,
        rows=(current, *probes, *(level(rail, Anchor(ends)) for rail in latch.rails)),
        gives_in=gives_in,
        resolution=1.01,
    )


def hold_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch."""
    for latch in latches(view):
        yield _hold_ask(check, latch)


def _hold_ask(check: Check, latch: Latch) -> Ask:
    view, stage, npn, pnp = latch.view, latch.stage, latch.npn, latch.pnp
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    trial = hold_trial_of(latch)
    assert trial.start is not None
    current = level(latch.current, trial.start)
    missing = not_set(view, stage, sequence)

    def judge(seen: Seen) -> Judged:
        edge = seen.edges.get(trial.key)
        carried = seen.value(current, sequence)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), capability=carried)
        holding = holding_by_hand(latch, seen.lanes)
        return ratio(
            edge.values[trial.rows[0]],
            carried,
            [(edge.missing, missing), (edge.always, check.words["always"])],
            None if holding is None else 1.0 - holding / np.where(carried > 0.0, carried, np.nan),
            BARE if holding is None else "" if coupled(latch) else RESISTIVE,
        )

    return Ask(
        check, stage.name, pnp.ref, (sequence,), required, judge, (current,), trial,
        screen=1.0 / (1.0 - required) if required < 1.0 else None,
    )  # fmt: skip


def coupled(latch: Latch) -> bool:
    """Whether each transistor of a latch drives the other's base directly, and not through a resistor."""
    npn, pnp = latch.npn.pins, latch.pnp.pins
    return npn["collector"] == pnp["base"] and pnp["collector"] == npn["base"]


def holding_by_hand(latch: Latch, lanes: Lanes) -> Floats | None:
    """V_BE,N / R_N + V_BE,P / R_P with V_BE at 0.1 mA: what both base-emitter resistors take of a latch that just holds
    (common practice, from memory); None where one of them is not given by its role."""
    total = np.zeros(lanes.count)
    for role, part in (("latch_npn", latch.npn), ("latch_pnp", latch.pnp)):
        resistor = latch.view.base_emitter_resistor(latch.stage, role)
        base_voltage = latch.view.bench(part.ref).base_voltage
        if resistor is None or base_voltage is None:
            return None
        total = total + base_voltage(lanes, 1e-4) / lanes[resistor.ref, "value"]
    return total


def holds_down_to(latch: Latch, lanes: Lanes, volts: Floats, carried: Floats) -> Floats | None:
    """The voltage of its feed at which a latch lets go by hand, where it carries a current from ``volts``: that current
    falls in a straight line to nothing at the drop of a latch."""
    holding = holding_by_hand(latch, lanes)
    if holding is None:
        return None
    latch.view.customary("drop of a conducting latch", DROP, "V")
    share = holding / np.where(carried > 0.0, carried, np.nan)
    return np.asarray(DROP + (volts - DROP) * share)


def _leaks(latch: Latch, lanes: Lanes) -> Floats | None:
    """What leaks through a latch that is off: the collector leakage of both."""
    leaks = [latch.view.bench(part.ref).leakage for part in (latch.npn, latch.pnp)]
    known = [np.asarray(leak(lanes)) for leak in leaks if leak is not None]
    return np.asarray(sum(known)) * np.ones(lanes.count) if len(known) == len(leaks) else None


def reset_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every complementary latch that the sequence resets (it has a moment ``silent`` or ``reset``)."""
    for latch in latches(view):
        requirement = view.requirement(check.slug, latch.npn.ref, latch.pnp.ref, latch.stage.name)
        sequence = view.sequence(requirement)
        at = view.moment(sequence, "silent", "reset")
        if at is not None:
            yield _reset_ask(check, latch, sequence, at)


def _reset_ask(check: Check, latch: Latch, sequence: str, at: Anchor) -> Ask:
    view, stage, npn, pnp = latch.view, latch.stage, latch.npn, latch.pnp
    requirement = view.requirement(check.slug, npn.ref, pnp.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    trial = hold_trial_of(latch)
    residual = minimum(latch.current, at, Anchor(at.by + 1e-3, at.row))
    missing = not_set(view, stage, sequence)

    def judge(seen: Seen) -> Judged:
        edge = seen.edges.get(trial.key)
        left = np.maximum(0.0, seen.value(residual, sequence))
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=left)
        held = edge.values[trial.rows[0]]
        never = ~seen.seen(residual, sequence)
        holding, leaks = holding_by_hand(latch, seen.lanes), _leaks(latch, seen.lanes)
        hand = None if holding is None or leaks is None else 1.0 - leaks / holding
        apart = BARE if holding is None else f"i_cbo of {npn.ref} or {pnp.ref} is not given" if leaks is None else ""
        return ratio(
            left,
            held,
            [
                (edge.missing, missing),
                (never, check.words["never"]),
                (left > held, check.words["holds"]),
            ],
            hand,
            apart,
        )

    # An easier hold makes a reset harder, and what leaks through it is nothing that the trial moves.
    return Ask(check, stage.name, pnp.ref, (sequence,), required, judge, (residual,), trial, follows_knob=False)


CHECKS = (
    Check(
        number=5,
        slug="latch_hold",
        title="latch hold",
        unit="A",
        required=0.5,
        formula="D = latch current at which it lets go when what feeds it is lowered, C = latch current while it holds",
        asks=hold_asks,
        reads={"of": "Q4", "settle": "0.2 s"},
        worst="cold, low supply, weak h_FE",
        by_hand="(V_BE,N / R_N + V_BE,P / R_P) / latch current, V_BE at 0.1 mA",
        accuracy=0.2,
        leaves_out="gains, other base feeds",
        words={
            "always": "the latch lets go by itself",
        },
    ),
    Check(
        number=5,
        slug="latch_reset",
        title="latch reset",
        unit="A",
        required=0.5,
        formula="D = latch current left after the reset, C = latch current below which it lets go",
        asks=reset_asks,
        worst="hot, strong h_FE",
        by_hand="(I_CBO,N + I_CBO,P) / (V_BE,N / R_N + V_BE,P / R_P): nothing but leakage is left",
        accuracy=0.1,
        leaves_out="what the reset leaves",
        words={
            "never": "the instant of the reset never came",
            "holds": "did not let go",
        },
    ),
)
