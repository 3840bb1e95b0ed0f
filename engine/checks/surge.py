"""Check 24: does the clamp keep a surge or load dump below every rating behind it, and does it survive that itself?"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ..design.part import Part, Stage
from ..design.sequence import Surge
from ..primitives.columns import SUPPLY
from ..primitives.signals import integral, maximum, voltage
from ..quantity import read
from .check import Ask, Check, Judged, ratio, unknown
from .peak_collector_emitter import MOSFETS
from .reverse_base_emitter import BIPOLAR
from .seen import Seen
from .view import View

PULSE = 1e-3  # s, of the pulse that the rated power of a clamp is for
LONGEST = 10e-3  # s up to which the energy that a clamp bears grows with the root of the time (from memory)

_RATINGS: tuple[tuple[tuple[str, ...], tuple[str, ...], str, str], ...] = (
    (BIPOLAR, ("collector", "emitter"), "v_ceo", "v_ceo"),
    (MOSFETS, ("drain", "source"), "v_dss", "v_ceo"),
    (("diode", "schottky"), ("cathode",), "v_rrm", "v_rrm"),
    (("capacitor",), ("a", "b"), "voltage", "capacitor_film"),
    (("capacitor",), ("plus",), "voltage", "capacitor_electrolytic"),
)
"""Kinds, their pins that may stand on the clamped net, the rating, and its derating factor."""


def voltage_asks(check: Check, view: View) -> Iterator[Ask]:
    """One ask for every surge clamp, where a sequence has a surge or the clamp has its role."""
    for stage, part, sequences in _clamps(view):
        yield _voltage_ask(check, view, stage, part, sequences)


def energy_asks(check: Check, view: View) -> Iterator[Ask]:
    """As :func:`voltage_asks`."""
    for stage, part, sequences in _clamps(view):
        yield _energy_ask(check, view, stage, part, sequences)


def _clamps(view: View) -> Iterator[tuple[Stage, Part, tuple[str, ...]]]:
    surges = tuple(n for n, s in view.design.sequences.items() if any(isinstance(e, Surge) for e in s.events))
    for stage, part in view.parts_of("clamp"):
        if surges or part.ref in stage.roles.values():
            yield stage, part, surges


def _behind(view: View, clamp: Part) -> Iterator[tuple[Part, str, str]]:
    """Parts that stand on the clamped net with their rating and its factor."""
    for kinds, pins, rating, factor in _RATINGS:
        for _, part in view.parts_of(*kinds):
            if any(part.pins.get(pin) == clamp.pins["cathode"] for pin in pins):
                yield part, rating, factor


def _voltage_ask(check: Check, view: View, stage: Stage, clamp: Part, sequences: tuple[str, ...]) -> Ask:
    requirement = view.requirement(check.slug, clamp.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    if not sequences:
        missing = "an event surge in a sequence"
        return unknown(check, stage.name, clamp.ref, view.sequence(requirement), required, missing)
    allowed = view.extra(requirement, "rating", "V")
    if allowed is None:
        found = []
        for part, rating, factor in _behind(view, clamp):
            figure = view.datum(part, rating, "V")
            if figure is None:
                missing = f"{rating} of {part.ref}"
                return unknown(check, stage.name, clamp.ref, sequences[0], required, missing)
            found.append(view.derating(factor, requirement) * figure.low)
        if not found:
            missing = f"a rated part on net {clamp.pins['cathode']}, or rating in the requirement surge_voltage"
            return unknown(check, stage.name, clamp.ref, sequences[0], required, missing)
        allowed = min(found)
    lowest = allowed
    across = maximum(voltage(clamp.pins["cathode"], clamp.pins["anode"]))
    column = clamp.ref, "clamping_voltage"

    def judge(seen: Seen) -> Judged:
        peaks = np.max([seen.value(across, sequence) for sequence in sequences], axis=0)
        hand = 1.0 - seen.lanes[column] / lowest if column in seen.lanes else None
        apart = "" if column in seen.lanes else f"clamping_voltage of {clamp.ref} is not given"
        return ratio(np.maximum(0.0, peaks), np.full(seen.lanes.count, lowest), hand=hand, apart=apart)

    return Ask(check, stage.name, clamp.ref, sequences, required, judge, rows=(across,))


def _energy_ask(check: Check, view: View, stage: Stage, clamp: Part, sequences: tuple[str, ...]) -> Ask:
    requirement = view.requirement(check.slug, clamp.ref, stage.name)
    required = view.required(check.slug, check.required, requirement)
    if not sequences:
        missing = "an event surge in a sequence"
        return unknown(check, stage.name, clamp.ref, view.sequence(requirement), required, missing)
    power = view.datum(clamp, "pulse_power", "W")
    heat = view.bench(clamp.ref).power
    if power is None or heat is None:
        return unknown(check, stage.name, clamp.ref, sequences[0], required, f"pulse_power of {clamp.ref}")
    events = [e for name in sequences for e in view.design.sequences[name].events if isinstance(e, Surge)]
    lasts = view.noted("length of the surge", min(read(e.for_, "s") for e in events), "s", "the event of the sequence")
    view.customary("pulse of the rated power", PULSE, "s")
    lasts = min(lasts, LONGEST)
    bears = power.low * float(np.sqrt(PULSE * max(lasts, PULSE)))
    taken = integral(heat)
    peak = view.noted("voltage of the surge", max(read(e.to, "V") for e in events), "V", "the event of the sequence")
    ohms = [None if e.impedance is None else read(e.impedance, "ohm") for e in events]
    column = clamp.ref, "clamping_voltage"

    def judge(seen: Seen) -> Judged:
        energy = np.max([seen.value(taken, sequence) for sequence in sequences], axis=0)
        hand, apart = None, "more than one surge, or its impedance is not given: the formula is that of one"
        if len(events) == 1 and ohms[0] and column in seen.lanes and SUPPLY in seen.lanes:
            clamped = seen.lanes[column]
            current = np.maximum(0.0, (peak - clamped) / ohms[0])
            hand, apart = 1.0 - clamped * current * read(events[0].for_, "s") / bears, ""
        return ratio(np.maximum(0.0, energy), np.full(seen.lanes.count, bears), hand=hand, apart=apart)

    return Ask(check, stage.name, clamp.ref, sequences, required, judge, rows=(taken,))


CHECKS = (
    Check(
        number=24,
        slug="surge_voltage",
        title="surge voltage",
        unit="V",
        required=0.0,
        formula="D = largest voltage across the clamp in a surge, C = lowest derated rating on the clamped net",
        asks=voltage_asks,
        reads={"of": "Q1", "rating": "45 V"},
        worst="high clamping voltage, stiff source",
        by_hand="clamping voltage at the rated pulse current / C: the surge drives no more than that",
        accuracy=0.05,
        bound=True,
        leaves_out="more than rated current",
    ),
    Check(
        number=24,
        slug="surge_energy",
        title="surge energy",
        unit="J",
        required=0.0,
        formula="D = energy that the clamp takes, C = rated power x root of (1 ms x length of the surge, up to 10 ms)",
        asks=energy_asks,
        worst="low clamping voltage, stiff source",
        by_hand="V_clamp (V_surge - V_clamp)/R_impedance t / C",
        accuracy=0.05,
        leaves_out="other takers, its edges",
    ),
)
