"""Check 10: can a transistor, bipolar or field-effect, carry the inrush of its load, of all that it drives in parallel?

The inrush is taken from the load's data and not from the simulation, in which the transistor itself limits it. Loads on
one switched net come on at once, so that their inrushes add (Kirchhoff's current law).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..parts import kinds
from ..primitives.builder import Bench
from ..primitives.columns import SUPPLY, Lanes
from ..primitives.signals import Anchor, Row, level, maximum, voltage
from .base_overdrive import SATURATED, UNDRIVEN, base_drive, gain_beyond, guaranteed_gain
from .check import Ask, Check, Judged, ratio, unknown
from .driven import OVER, driven, ends, first_seen, over, own_current
from .peak_collector_emitter import MOSFETS, gate_by_hand, gate_divider
from .seen import Seen
from .view import View, polarity

RATINGS = ("i_cm", "i_c_max", "i_d_max")
Inrush = Callable[[Lanes, Floats], Floats]


def asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every driver with a load."""
    for stage, role, part in view.with_role("driver"):
        loads, bench = driven(view, stage, role, part), view.bench(part.ref)
        if loads and (bench.gain is not None or bench.lets_through is not None):
            yield _ask(check, view, stage, part, loads)


def _ask(check: Check, view: View, stage: Stage, part: Part, loads: tuple[Part, ...]) -> Ask:
    requirement = view.requirement(check.slug, part.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    sequence = view.sequence(requirement)
    rating = next((found for key in RATINGS if (found := view.datum(part, key, "A")) is not None), None)
    if rating is None:
        return unknown(
            check,
            stage.name,
            part.ref,
            sequence,
            required,
            f"{RATINGS[-1 if part.kind in MOSFETS else 1]} of {part.ref}",
        )
    bench, load = view.bench(part.ref), first_seen(view, loads)
    told: list[tuple[Part, Inrush]] = []
    for each in loads:
        inrush = _inrush(view, each)
        if isinstance(inrush, str):
            return unknown(check, stage.name, part.ref, sequence, required, inrush)
        if inrush is not None:
            told.append((each, inrush))
    starts = view.bench(load.ref).on is not None
    if not starts and told:
        return unknown(check, stage.name, part.ref, sequence, required, f"operating_minimum of {load.ref}")
    allowed = view.derating("i_c_max", requirement) * rating.low
    at = view.moment(sequence, "sounding", "on")
    if view.rests_on(load):
        at = view.while_on(sequence, load)
    elif at is None:
        at = Anchor(0.5 * view.ends(sequence)) if not starts else Anchor(1e-2, view.event(f"{load.ref} on"))
    control = _control(part, bench, at)
    drop, peak = _of_driver(view, part, at)
    across = [level(voltage(*ends(view, each)), at) for each, _ in told]
    telling, gone = over(view, load, at)
    # What says nothing of its inrush beside what does: the simulation shows it apart.
    silent = [own_current(view, each) for each in loads if told and _inrush(view, each) is None]
    driving = base_drive(view, stage, part, at) if bench.lets_through is None else None
    divided = None if bench.lets_through is None else gate_divider(view, stage, part)

    def judge(seen: Seen) -> Judged:
        if not told:
            wanted = np.abs(seen.value(peak, sequence))
        else:
            saturated = view.customary("drop of a transistor that is fully on", SATURATED, "V")
            more = np.maximum(0.0, np.abs(seen.value(drop, sequence)) - saturated)
            parts = [
                inrush(seen.lanes, np.abs(seen.value(row, sequence)) + more)
                for row, (_, inrush) in zip(across, told, strict=True)
            ]
            parts += [np.max([seen.value(row, sequence) for row in rows], axis=0) for rows in silent if rows]
            wanted = np.sum(parts, axis=0)
        given = seen.value(control, sequence)
        never = ~seen.seen(control, sequence)
        words = [
            (never, check.words["never"].format(load=load.ref)),
            (gone(seen, sequence), OVER.format(load=load.ref)),
        ]
        if bench.lets_through is not None:
            carried = np.minimum(allowed, bench.lets_through(seen.lanes, given))
            hand = None
            if SUPPLY in seen.lanes:
                gate = gate_by_hand(seen, seen.lanes[SUPPLY], divided)
                hand = 1.0 - wanted / np.minimum(allowed, bench.lets_through(seen.lanes, gate))
            return ratio(wanted, carried, words, hand, "the conditions name no supply" if hand is None else "")
        gain = guaranteed_gain(bench, seen.lanes, wanted)
        carried = np.minimum(allowed, gain * np.abs(given))
        hand = None
        if driving is not None:
            by_hand = np.minimum(allowed, gain * driving.current(seen, sequence, wanted))
            hand = 1.0 - wanted / np.where(by_hand > 0.0, by_hand, np.nan)
        apart = UNDRIVEN.format(part=part.ref) if hand is None else ""
        return replace(ratio(wanted, carried, words, hand, apart), extrapolated=gain_beyond(part, bench, wanted))

    apart = (row for rows in silent for row in rows)
    rows = (control, drop, peak, *telling, *across, *apart, *(() if driving is None else (driving.row,)))
    return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)


def _of_driver(view: View, part: Part, at: Anchor) -> tuple[Row, Row]:
    """The voltage across a driver at an instant, and the most that it carries."""
    upper, lower = ("drain", "source") if part.kind in MOSFETS else ("collector", "emitter")
    drop = voltage(part.pins[upper], part.pins[lower])
    current = view.bench(part.ref).currents[upper]
    return level(drop, at), maximum(current.scaled(polarity(part)))


def _control(part: Part, bench: Bench, at: Anchor) -> Row:
    """What decides how much a transistor carries: its base current, or its gate voltage counted as forward."""
    if part.kind in MOSFETS:
        return level(voltage(part.pins["gate"], part.pins["source"]).scaled(polarity(part)), at)
    return level(bench.currents["base"], at)


def _inrush(view: View, load: Part) -> Inrush | str | None:
    """The inrush at a voltage; the datum that is missing; None where the load has no inrush of its own."""
    bench = view.bench(load.ref)
    if bench.inrush is not None:
        return bench.inrush
    kind = kinds()[load.kind]
    if "surge" not in {**kind.fields, **kind.data}:
        # What a coil draws settles from below; of other parts the simulation shows what flows.
        return bench.draw
    surge, rated = view.datum(load, "surge", "A"), view.datum(load, "rated_voltage", "V")
    if surge is None:
        return f"surge of {load.ref}"
    at = view.circuit.builder.supply_nominal if rated is None else rated.typical
    return lambda lanes, volts: surge.high / at * volts


CHECKS = (
    Check(
        number=10,
        slug="peak_current",
        title="peak current",
        unit="A",
        required=0.2,
        formula="D = inrush of the load at its voltage, C = least of derating x I_CM, h_FE I_B or K/2 (V_GS - V_T)^2",
        asks=asks,
        worst="high supply for the rating; cold, low supply, weak h_FE for the base current",
        by_hand="D / min(derating x I_CM, h_FE ((V_drive - V_BE) / R_B - V_BE / R_BE)); K/2 (V_GS - V_T)^2, V_GS = V or"
        " the share of its divider, of a field-effect transistor",
        accuracy=0.05,
        leaves_out="other feeds, drops at gate",
        words={"never": "{load} never came on"},
    ),
)
