"""Check 26: does a fuse carry its load for ever and its inrush without blowing, and does it blow in a fault?"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace

import numpy as np

from ..design.part import Part, Stage
from ..kernel.layout import Floats
from ..parts.fuse import blown
from ..parts.physics import REFERENCE
from ..primitives.columns import SOURCE_RESISTANCE, SUPPLY, Lanes
from ..primitives.signals import START, Anchor, Row, integral, level
from ..run import Observed
from .check import Ask, Check, Judged, Mask, ratio, unknown
from .driven import drawn, surged, together
from .load_voltage import left_by_hand
from .seen import Seen
from .view import View

BLOWS = 2.0  # times its rated current, at which a fuse blows within minutes, common practice, from memory
DRIFT = 0.003  # 1/K by which the rated current of a slow fuse falls above 25 C, from memory
PULSE = 0.1  # s from the beginning of an inrush in which its I2t is counted
BEFORE = 1e-3  # s before a load counts as on, in which its inrush began

Judge = Callable[[Seen], Judged]


def blown_in(observed: Observed) -> dict[str, Mask]:
    """The fuses that have melted at the end of a run in some lane, and in which lanes."""
    found = {}
    for part in observed.circuit.design.parts:
        if part.kind == "fuse" and blown(part.ref) in observed.circuit.builder.guards:
            gone: Mask = observed.final[:, observed.circuit.index(blown(part.ref))] > 0.5
            if gone.any():
                found[part.ref] = gone
    return found


def with_blown_fuses(judged: Judged, observed: Iterable[Observed]) -> Judged:
    """What was judged, with the fuses that have blown named where a margin is overrun."""
    outcomes = list(judged.outcomes)
    for each in observed:
        for ref, gone in blown_in(each).items():
            told = [(mask & gone, f"{words}; fuse {ref} has blown") for mask, words in outcomes if ref not in words]
            overrun: Mask = gone & (judged.margin < 0.0)
            outcomes = [*told, *outcomes, (overrun, f"fuse {ref} has blown")]
    return judged if len(outcomes) == len(judged.outcomes) else replace(judged, outcomes=tuple(outcomes))


def _asked(
    check: Check, view: View, key: str, unit: str, make: Callable[[Stage, Part, str, float], Ask]
) -> Iterator[Ask]:
    """One ask for every fuse; UNKNOWN where the datum ``key`` is missing."""
    for stage, part in view.parts_of("fuse"):
        requirement = view.requirement(check.slug, part.ref, stage.name)
        required = view.required(check.slug, check.required, requirement)
        sequence = view.sequence(requirement)
        if view.datum(part, key, unit) is None:
            yield unknown(check, stage.name, part.ref, sequence, required, f"{key} of {part.ref}")
        else:
            yield make(stage, part, sequence, required)


IDLE = 0.1  # of what the load draws: a fuse that carries less than that at every moment is not in its way
ELSEWHERE = "at these moments the load is fed another way than through this fuse"


def _rated(view: View, part: Part, lanes: Lanes) -> np.ndarray:
    """Rated current at ambient temperature."""
    rated, drift = view.datum(part, "rated_current", "A"), view.datum(part, "rating_drift", "1/K")
    assert rated is not None
    per_kelvin = view.customary(f"rating drift of {part.ref}", DRIFT, "1/K") if drift is None else drift.typical
    return np.asarray(rated.low * (1.0 - per_kelvin * np.maximum(0.0, lanes.ambient - REFERENCE)))


def load_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every fuse: what it carries at the moments of the sequence."""

    def make(stage: Stage, part: Part, sequence: str, required: float) -> Ask:
        factor = view.derating("fuse", view.requirement(check.slug, part.ref, stage.name))
        moments = [view.anchor(name, sequence) for name in view.design.sequences[sequence].moments]
        instants = moments or [Anchor(0.5 * view.ends(sequence))]
        rows = tuple(level(view.bench(part.ref).currents["a"], at) for at in instants)

        load = view.load(stage)
        draw = None if load is None else drawn(view, together(view, load))

        def judge(seen: Seen) -> Judged:
            found = np.abs(np.array([seen.value(row, sequence) for row in rows]))
            never = np.asarray(np.isnan(found).all(axis=0))
            carried = np.max(np.nan_to_num(found), axis=0)
            allowed = factor * _rated(view, part, seen.lanes)
            hand, apart = None, "no load says what it draws, or no supply is given"
            if draw is not None and SUPPLY in seen.lanes:
                left = None if load is None else left_by_hand(view, view.design.stage_of(load.ref), load, seen.lanes)
                loads = draw(seen.lanes, seen.lanes[SUPPLY] if left is None else left)
                hand = 1.0 - loads / np.where(allowed > 0.0, allowed, np.nan)
                idle = carried < IDLE * loads
                return ratio(carried, allowed, [(never, check.words["never"])], hand, ((idle, ELSEWHERE),))
            return ratio(carried, allowed, [(never, check.words["never"])], hand, apart)

        return Ask(check, stage.name, part.ref, (sequence,), required, judge, rows)

    yield from _asked(check, view, "rated_current", "A", make)


def pulse_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every fuse: the I2t of connecting the supply and of the load's inrush."""

    def make(stage: Stage, part: Part, sequence: str, required: float) -> Ask:
        melting, power = view.datum(part, "melting", "A2s"), view.bench(part.ref).power
        assert melting is not None
        assert power is not None
        allowed = view.derating("fuse_pulse", view.requirement(check.slug, part.ref, stage.name)) * melting.low
        rows: list[Row] = [integral(power, START, Anchor(PULSE))]
        load = view.load(stage)
        if load is not None:
            on = view.event(f"{load.ref} on")
            rows.append(integral(power, Anchor(0.0, on), Anchor(PULSE, on)))

        def judge(seen: Seen) -> Judged:
            never = np.zeros(seen.lanes.count, dtype=bool)
            view.customary("time in which an inrush counts", PULSE, "s")
            joules = np.nan_to_num(np.array([seen.value(row, name) for row in rows for name in names])).max(axis=0)
            outcomes = [
                (blown_in(seen.observed[name]).get(part.ref, never), check.words["blows"].format(sequence=name))
                for name in names
            ]
            hand = None if charged is None else 1.0 - charged(seen) / allowed
            apart = "the supply is not given" if hand is None else ""
            melts = joules / seen.lanes[part.ref, "resistance"]
            return ratio(melts, np.full(seen.lanes.count, allowed), outcomes, hand, apart)

        charged = _charged(view, part, load)
        names = tuple(view.design.sequences)
        return Ask(check, stage.name, part.ref, names, required, judge, tuple(rows))

    yield from _asked(check, view, "melting", "A2s", make)


def _charged(view: View, part: Part, load: Part | None) -> Callable[[Seen], Floats] | None:
    """I2t by hand, A2s: of charging each filter capacitor, C V^2/(2 R) with R all that lies before it, or of the load's
    inrush (else its current) for :data:`PULSE`; the larger counts. None where the supply is not given."""
    if view.design.conditions.supply is None:
        return None
    filters = [resistor for _, _, resistor in view.with_role("filter_resistor")]
    capacitors = [
        (c, next((r for r in filters if set(r.pins.values()) & set(c.pins.values())), None))
        for _, _, c in view.with_role("filter_capacitor", "reservoir_capacitor")
    ]
    benches = view.circuit.benches
    loads = () if load is None else together(view, load)
    drawn_at_once = surged(view, loads, lambda each: benches[each.ref].inrush or benches[each.ref].draw)

    def melts(seen: Seen) -> Floats:
        lanes = seen.lanes
        before = lanes[part.ref, "resistance"]
        if SOURCE_RESISTANCE in lanes:
            before = before + lanes[SOURCE_RESISTANCE]
        total = np.zeros(lanes.count)
        for capacitor, resistor in capacitors:
            ohms = before + (0.0 if resistor is None else lanes[resistor.ref, "value"])
            total = total + 0.5 * lanes[capacitor.ref, "value"] * lanes[SUPPLY] ** 2 / ohms
        return np.asarray(np.maximum(total, drawn_at_once(lanes, lanes[SUPPLY]) ** 2 * PULSE))

    return melts


def fault_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every fuse: what flows when all behind it is shorted."""

    def make(stage: Stage, part: Part, sequence: str, required: float) -> Ask:
        def judge(seen: Seen) -> Judged:
            lanes = seen.lanes
            source = lanes[SOURCE_RESISTANCE] if SOURCE_RESISTANCE in lanes else np.zeros(lanes.count)
            current = lanes[SUPPLY] / (source + lanes[part.ref, "resistance"])
            times = view.customary("times the rated current at which a fuse blows", BLOWS, "")
            demand = times * _rated(view, part, lanes)
            return ratio(demand, current, hand=1.0 - demand / current)

        if view.design.conditions.supply is None:
            return unknown(check, stage.name, part.ref, sequence, required, "supply in the conditions")
        probe = level(view.bench(part.ref).currents["a"], START)
        return Ask(check, stage.name, part.ref, (sequence,), required, judge, (probe,))

    yield from _asked(check, view, "rated_current", "A", make)


CHECKS = (
    Check(
        number=26,
        slug="fuse_load",
        title="fuse load",
        unit="A",
        required=0.0,
        formula="D = largest current at the moments of the sequence, C = derating x rated current at the temperature",
        asks=load_asks,
        worst="hot, high supply",
        by_hand="current of the load at the supply less the drops that load voltage counts",
        accuracy=0.1,
        leaves_out="other loads, drops",
        words={"never": "none of the moments at which its current is read ever came"},
    ),
    Check(
        number=26,
        slug="fuse_pulse",
        title="fuse pulse",
        unit="A2s",
        required=0.0,
        formula="D = I2t within 0.1 s of the supply or the load coming on, C = derating x melting I2t",
        asks=pulse_asks,
        worst="high supply, stiff source",
        words={"blows": "it blows in sequence {sequence}"},
        by_hand="the larger of C V^2 / (2 R) of the filter capacitors and I_inrush^2 x 0.1 s",
        hand_source="energy of a capacitor charged through R; common practice, from memory",
        accuracy=0.1,
        bound=True,
        leaves_out="other capacitors, surges",
    ),
    Check(
        number=26,
        slug="fuse_fault",
        title="fuse in a fault",
        unit="A",
        required=0.0,
        formula="D = twice the rated current, C = supply / (source resistance + fuse): what a short behind it draws",
        asks=fault_asks,
        worst="low supply, soft source, cold",
        by_hand="the same: 2 I_N (R_source + R_fuse) / V; it is not simulated",
        hand_source="Ohm's law",
        accuracy=0.02,
        leaves_out="wires to the fault",
    ),
)
