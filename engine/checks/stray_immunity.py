"""Check 31: does the charge that strays bring into a net stay below what trips an alarm?

A stray capacitance C between a net that swings by V within V/slew and another one injects C V into that one. The trial
puts ever larger pulses of that width, up and down, into the net in stand-by.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from ..circuit.timeline import Timeline
from ..design.part import Stage
from ..design.requirement import Requirement, Stray
from ..kernel.layout import Floats
from ..primitives.builder import RETURN
from ..primitives.columns import SUPPLY
from ..primitives.signals import maximum, minimum, voltage
from ..quantity import read
from .alarm_state import TOLD_BY, AlarmState, alarm_states, settling, standby
from .base_capacitance import held_by
from .charge_trial import SETTLE, Put, charge_trial
from .check import Apart, Ask, Check, Judged, ratio, unknown
from .seen import Seen
from .view import View

LEAST, MOST = 1e-3, 300.0  # charges of the trial, in what the strays inject at the nominal supply
AT_ONCE = 0.2  # of R C at the base: as long a pulse is over at once
WIDTH = 1e-6  # s, where a requirement gives a charge without its width


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every net that a stray of a stated slew reaches, or that a requirement names."""
    nets: dict[str, None] = {s.between[1]: None for s in view.design.strays if s.slew is not None}
    nets |= {r.of: None for r in view.design.requirements if r.check == check.slug and r.of in view.design.nets}
    for net in nets:
        if net != RETURN:
            yield _ask(check, view, net)


def _stage(view: View, net: str) -> Stage:
    """The stage whose latch has a pin on the net, else the first one with a part on it."""
    on_it = [stage for stage in view.design.stages if any(net in part.pins.values() for part in stage.parts)]
    return next((stage for stage in on_it if "latch_npn" in stage.roles), on_it[0])


def _ask(check: Check, view: View, net: str) -> Ask:
    requirement = view.requirement(check.slug, net)
    stage = _stage(view, net)
    sequence = view.sequence(requirement)
    required = view.required(check.slug, check.required, requirement)
    strays = [s for s in view.design.strays if net in s.between]
    stated = view.extra(requirement, "charge", "C")
    missing = _missing(view, net, strays, requirement)
    if missing is not None:
        return unknown(check, stage.name, net, sequence, required, missing)
    states = alarm_states(view, stage)
    if not states:
        return unknown(check, stage.name, net, sequence, required, TOLD_BY)
    others = [next(n for n in s.between if n != net) for s in strays]
    farads = view.strays_at(net)
    supply = view.design.conditions.levels("supply")
    nominal = 1.0 if supply is None else supply.nominal
    width = view.extra(requirement, "width", "s") or view.customary("width of a pulse", WIDTH, "s")
    if stated is None:
        slew = view.noted("fastest slew of the strays", max(_slews(strays)), "V/s", "the strays of the design")
        width = nominal / slew
    tops = [maximum(voltage(other)) for other in others]
    bottoms = [minimum(voltage(other)) for other in others]
    rows = (*tops, *bottoms) if stated is None else ()
    sequences = tuple(dict.fromkeys((sequence, *view.design.sequences))) if stated is None else (sequence,)
    usual = nominal * sum(farads) if stated is None else abs(stated)
    settle = view.extra(requirement, "settle", "s") or settling(view, states, sequence, SETTLE)

    trial = charge_trial(
        f"charge {net}",
        sequence,
        standby(view, sequence),
        states,
        [_put(net, width, sign) for sign in (1.0, -1.0)],
        LEAST * usual,
        MOST * usual,
        settle,
    )

    def demand(seen: Seen) -> Floats:
        if stated is not None:
            return np.full(seen.lanes.count, abs(stated))
        total = np.zeros(seen.lanes.count)
        for value, top, bottom in zip(farads, tops, bottoms, strict=True):
            swings = [seen.value(top, name) - seen.value(bottom, name) for name in sequences]
            total = total + value * np.max(swings, axis=0)
        return total

    def judge(seen: Seen) -> Judged:
        brought = demand(seen)
        edge = seen.edges.get(trial.key)
        if edge is None:
            return Judged(np.full(seen.lanes.count, np.nan), demand=brought)
        words = check.words
        outcomes = [(edge.missing, words["missing"]), (edge.always, words["always"])]
        hand, apart = _hand(view, states[0], net, seen, brought, width)
        judged = ratio(brought, edge.knob, outcomes, hand, apart)
        margin = np.where(edge.never, 1.0, judged.margin)
        return replace(judged, margin=margin, outcomes=(*judged.outcomes, (edge.never, words["immune"])))

    highest = usual if stated is not None or supply is None else usual * supply.max / nominal
    screen = min(highest / (1.0 - required), MOST * usual) if required < 1.0 else None
    return Ask(check, stage.name, net, sequences, required, judge, rows, trial, screen)


def _slews(strays: list[Stray]) -> list[float]:
    return [read(stray.slew, "V/s") for stray in strays if stray.slew is not None]


def _missing(view: View, net: str, strays: list[Stray], requirement: Requirement | None) -> str | None:
    if view.circuit.index(net) >= int(view.circuit.topology.size[0]):
        return f"a net that no source holds in place of {net}"
    if view.extra(requirement, "charge", "C") is not None:
        return None
    if not strays:
        return f"a stray with its slew to net {net}, or charge in the requirement stray_immunity of {net}"
    if not any(_slews(strays)):
        return f"slew of the stray between {' and '.join(strays[0].between)}"
    return None


def _put(net: str, width: float, sign: float) -> Put:
    def put(line: Timeline, at: float, knob: Floats) -> None:
        line.inject(at, net, sign * knob, width)

    return put


def _hand(
    view: View, state: AlarmState, net: str, seen: Seen, demand: Floats, width: float
) -> tuple[Floats | None, str | Apart]:
    """1 - D/(C V_BE) at the npn's base, C all that hangs on it: what a pulse must bring that is over at once; and where
    it is not to be compared, with why."""
    latch = state.latch
    if latch is None or net != latch.npn.pins["base"] or SUPPLY not in seen.lanes:
        return None, "the formula is that of the base of a latch's npn"
    held = held_by(view, seen.lanes, net)
    resistor = view.base_emitter_resistor(latch.stage, "latch_npn")
    drained = np.inf if resistor is None else seen.lanes[resistor.ref, "value"] * held
    slow = np.asarray(width > AT_ONCE * drained) & np.ones(seen.lanes.count, dtype=bool)
    hand = np.asarray(1.0 - demand / (held * latch.turn_on(seen.lanes)[0]))
    return hand, ((slow, "the pulse lasts so long that the base resistor drains it meanwhile"),)


CHECKS = (
    Check(
        number=31,
        slug="stray_immunity",
        title="stray immunity",
        unit="C",
        required=0.5,
        formula="D = stray capacitance x largest swing of the net it comes from, C = least charge that trips an alarm",
        worst="hot, high supply",
        by_hand="D / (C_base V_BE), for a pulse that is over at once",
        accuracy=0.1,
        leaves_out="drains, other transistor",
        asks=asks,
        reads={"of": "base", "charge": "20 pC", "width": "100 ns", "settle": "0.1 s"},
        words={
            "missing": "stand-by never came",
            "always": "trips at a thousandth of that charge or less",
            "immune": "immune to any charge that strays can bring",
        },
    ),
)
