"""Check 2: does a load get the voltage it needs, and is it let go of when it is off?

A relay's voltage to pick up is given at 20 C and grows with its copper, V20 (234.5 + T)/254.5 (common form), whose own
heat counts where its thermal resistance is given.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..design.sequence import Dip, DisconnectSupply, ReverseSupply, Surge
from ..kernel.layout import Floats
from ..parts import kinds
from ..parts.physics import copper_factor
from ..primitives.columns import SOURCE_RESISTANCE, SUPPLY, Lanes
from ..primitives.signals import Anchor, level, maximum, voltage
from .check import Ask, Check, Judged, ratio, unknown
from .driven import OFF, OVER, drawn, lifted, together
from .seen import Seen
from .view import View

NOTHING = 1e-3  # V left across a load that are none: the solver knows a voltage to a tenth of it
FED_OTHERWISE = "the sequence moves the supply, or supply or draw of the load are not given"
REACHED = 0.5  # of what it needs: a load that never saw as much was not switched on at all


def on_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every load that has a level at which it works."""
    for stage, load in _loads(view):
        requirement = view.requirement(check.slug, load.ref, stage.name)
        required = view.required(check.slug, check.required, requirement)
        sequence = view.sequence(requirement)
        key = need_key(load)
        least = view.datum(load, key, "V")
        if least is None or view.bench(load.ref).on is None:
            yield unknown(check, stage.name, load.ref, sequence, required, f"{key} of {load.ref}")
        else:
            yield _on_ask(check, view, stage, load, sequence, required, least.high)


def _loads(view: View) -> Iterator[tuple[Stage, Part]]:
    for stage, _, load in view.with_role("load"):
        kind = kinds()[load.kind]
        if need_key(load) in {**kind.fields, **kind.data}:
            yield stage, load


def need_key(load: Part) -> str:
    """The datum that says from which voltage on a load works."""
    return "pick_up" if load.kind == "coil" else "operating_minimum"


def _with_copper(load: Part, volts: float, lanes: Lanes, rise: Floats | float) -> Floats:
    """A voltage at 20 C as it is now: that of a coil grows with the resistance of its copper."""
    if load.kind == "coil":
        return np.asarray(volts * copper_factor(lanes.ambient + rise))
    return np.full(lanes.count, volts)


def _on_ask(
    check: Check,
    view: View,
    stage: Stage,
    load: Part,
    sequence: str,
    required: float,
    volts: float,
) -> Ask:
    bench = view.bench(load.ref)
    plus, minus, _ = bench.on or ("", "", 0.0)
    at = view.while_on(sequence, load)
    across = voltage(plus, minus)
    steady, most = level(across, at), maximum(across)
    warm = None if bench.rise is None or load.kind != "coil" else level(bench.rise, at)

    def judge(seen: Seen) -> Judged:
        rise = 0.0 if warm is None else np.nan_to_num(seen.value(warm, sequence))
        wanted = _with_copper(load, volts, seen.lanes, rise)
        given = seen.value(steady, sequence)
        given = np.where(np.isfinite(given), given, seen.value(most, sequence))
        never = given < REACHED * wanted
        was = (seen.value(most, sequence) >= REACHED * wanted) & (given < OFF * wanted)
        words = [
            (never & was, OVER.format(load=load.ref)),
            (never & ~was, check.words["never"].format(load=load.ref)),
        ]
        left = None if fed_otherwise(view, sequence) else left_by_hand(view, stage, load, seen.lanes)
        hand = None if left is None else 1.0 - wanted / np.where(left > 0.0, left, np.nan)
        return ratio(wanted, given, words, hand, FED_OTHERWISE if hand is None else "")

    return Ask(
        check, stage.name, load.ref, (sequence,), required, judge, (steady, most, *(() if warm is None else (warm,)))
    )


def fed_otherwise(view: View, sequence: str) -> bool:
    """Whether a sequence takes the supply away or moves it: what feeds the load then is not the supply's level."""
    events = view.design.sequences[sequence].events
    return any(isinstance(event, DisconnectSupply | ReverseSupply | Dip | Surge) for event in events)


def left_by_hand(view: View, stage: Stage, load: Part, lanes: Lanes) -> Floats | None:
    """The supply less the drops that the data tell: saturation (and half of the V_BE of a Darlington), entry diode,
    source and lead resistance, V per lane; None where supply or load are not given."""
    loads = together(view, load)
    draw = drawn(view, loads)
    if draw is None or SUPPLY not in lanes:
        return None
    supply = lanes[SUPPLY]
    driver = view.role(stage, "driver")
    saturated = None if driver is None else view.datum(driver, "v_ce_sat", "V")
    drop = view.forward(view.role(stage, "reverse_diode"), "forward_high", lanes)
    drop = drop + (0.0 if saturated is None else saturated.typical)
    current = draw(lanes, supply - drop)
    if driver is not None:
        drop = drop + lifted(view, driver, lanes, current)
    ohms = lanes[SOURCE_RESISTANCE] if SOURCE_RESISTANCE in lanes else np.zeros(lanes.count)
    for _, lead in view.parts_of("lead"):
        if set(lead.pins.values()) & set(load.pins.values()) - {"0V", "supply"}:
            ohms = ohms + lanes[lead.ref, "resistance"]
    return np.asarray(supply - drop - current * ohms)


def off_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every load, where the sequence has a moment at which it must be off."""
    for stage, load in _loads(view):
        requirement = view.requirement(check.slug, load.ref, stage.name)
        sequence = view.sequence(requirement)
        off = view.while_off(sequence, load)
        if off:
            yield _off_ask(check, view, stage, load, sequence, off)


def _off_ask(check: Check, view: View, stage: Stage, load: Part, sequence: str, off: tuple[Anchor, ...]) -> Ask:
    requirement = view.requirement(check.slug, load.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    key = "drop_out" if load.kind == "coil" else "operating_minimum"
    least = view.datum(load, key, "V")
    if least is None or view.bench(load.ref).on is None:
        return unknown(check, stage.name, load.ref, sequence, required, f"{key} of {load.ref}")
    plus, minus, _ = view.bench(load.ref).on or ("", "", 0.0)
    rows = tuple(level(voltage(plus, minus), at) for at in off)
    driver = view.role(stage, "driver")
    bench = view.bench(load.ref)
    leakage, draw = None if driver is None else view.bench(driver.ref).leakage, bench.inrush or bench.draw

    def judge(seen: Seen) -> Judged:
        left = np.array([seen.value(row, sequence) for row in rows])
        never = np.asarray(np.isnan(left).all(axis=0))
        largest = np.max(np.nan_to_num(left), axis=0)
        largest = np.where(largest < NOTHING, 0.0, largest)
        lets_go = _with_copper(load, least.low, seen.lanes, 0.0)
        hand = None
        if leakage is not None and draw is not None:
            # What leaks through the driver flows through the load, whose conductance is its draw at one volt, cold.
            leak = np.asarray(leakage(seen.lanes)) / draw(seen.lanes, np.ones(seen.lanes.count))
            hand = 1.0 - leak / lets_go
        apart = "nothing in the role driver says what leaks through it" if hand is None else ""
        return ratio(largest, lets_go, [(never, check.words["never"])], hand, apart)

    return Ask(check, stage.name, load.ref, (sequence,), required, judge, rows)


CHECKS = (
    Check(
        number=2,
        slug="load_voltage",
        title="load voltage",
        unit="V",
        required=0.1,
        formula="D = voltage that the load needs, a coil's with its copper, C = voltage across it while it is on",
        asks=on_asks,
        worst="low supply; hot for a coil, cold for a transistor's drop",
        by_hand="D / (supply - V_CE(sat) - entry diode - I (R_source + R_lead)); of a Darlington its V_BE/2 more",
        accuracy=0.05,
        leaves_out="other drops",
        words={"never": "{load} was never switched on"},
    ),
    Check(
        number=2,
        slug="load_off",
        title="load off",
        unit="V",
        required=0.1,
        formula="D = voltage left across the load in stand-by and after the alarm, C = voltage at which it lets go",
        asks=off_asks,
        worst="hot, high supply",
        by_hand="I_CBO of the driver x resistance of the load over what it lets go at",
        accuracy=0.05,
        leaves_out="a driver not quite off",
        words={"never": "none of the moments at which it must be off ever came"},
    ),
)
