"""Symmetric pairs at power-up: which half comes on first must not be left to chance.

With equal halves the state that a bistable falls into, or whether an astable starts, is decided by round-off. Each pair
is run in two mirrored lanes, every part of one half at the end of its tolerance that favours it, then the other way
round. Where they come up in different states, the state at power-up is undefined.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..checks.check import Ask, Judged
from ..circuit.circuit import Circuit
from ..circuit.pairs import Half, Pair, pairs
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Anchor, crossing, level, voltage
from ..quantity import read
from ..run import Observed
from .corner import Corner
from .evaluate import judge, look, observe
from .lanes import Setting
from .stability import BALANCES

LEAST = 0.01  # mismatch of a part that is given without a tolerance
DECIDED = 0.1  # V between the collectors, from which one half is on and the other off
SETTLE = 0.1  # of the time up to the first event: how long an astable may take to start
SWINGS = 3  # rising crossings after that by which an astable is known to run, where another has none

Sides = dict[tuple[str, str], int]


@dataclass(frozen=True)
class Undefined:
    """A pair whose mirrored lanes come up in different states: ``lanes`` are both, ``setting`` each of them."""

    pair: Pair
    lanes: Lanes
    settings: tuple[Setting, Setting]
    words: str


def favoured(pair: Pair, half: Half, circuit: Circuit) -> Sides:
    """Which end every column of a pair is moved to so that ``half`` comes on first: -1 low, +1 high."""
    other = pair.second if half is pair.first else pair.first
    kinds = {part.ref: part.kind for part in circuit.design.parts}
    sides: Sides = {}
    for at, sign in ((half, 1), (other, -1)):
        opposite = pair.second if at is pair.first else pair.first
        for column in circuit.columns:
            # A Darlington pair has two transistors of its own, named after it.
            if column.ref == at.transistor or column.ref.startswith(f"{at.transistor}/"):
                if column.datum == "gain":
                    sides[column.key] = sign
                elif column.datum == "v_be":
                    sides[column.key] = -sign
            elif column.datum == "value":
                capacitor = kinds.get(column.ref) == "capacitor"
                if column.ref in at.coupling:
                    sides[column.key] = sign if capacitor else -sign
                elif column.ref in at.bleed or (capacitor and column.ref in at.bias):
                    sides[column.key] = -sign if capacitor else sign
                elif column.ref in at.bias or column.ref in opposite.load:
                    sides[column.key] = -sign
    return sides


def _mirrored(circuit: Circuit, pair: Pair) -> tuple[Lanes, tuple[Setting, Setting]]:
    """Two lanes, each half favoured in one; parts without a tolerance differ by a little all the same."""
    values: list[Floats] = []
    settings = []
    for half in (pair.first, pair.second):
        sides = favoured(pair, half, circuit)
        column_of = {column.key: column for column in circuit.columns}
        one = circuit.nominal().values[:, 0]
        for n, column in enumerate(circuit.columns):
            side = sides.get(column.key, 0)
            if side:
                end = column.high if side > 0 else column.low
                one[n] = end if column.varies else column.nominal * (1.0 + side * LEAST)
        values.append(one)
        kept = tuple((key, side) for key, side in sides.items() if column_of[key].varies)
        settings.append(Setting((), kept))
    lanes = Lanes(circuit.columns, np.ascontiguousarray(np.stack(values, axis=1)))
    return lanes, (settings[0], settings[1])


def power_up_ends(circuit: Circuit, sequence: str) -> float | None:
    """When the first event comes that is not the supply; None where the sequence does not begin with the supply off."""
    document = circuit.design.sequences[sequence]
    if circuit.design.starts_of(sequence) is not None:
        return None
    later = [read(event.at, "s") for event in document.events if event.event != "connect supply"]
    connected = [read(event.at, "s") for event in document.events if event.event == "connect supply"]
    end = min([read(document.ends, "s"), *(at for at in later if at > min(connected, default=0.0))])
    return end if end > min(connected, default=0.0) else None


def undefined(circuit: Circuit, sequence: str, found: Pair, cancelled: Callable[[], bool]) -> Undefined | None:
    """Whether a pair comes up in different states in its mirrored lanes."""
    end = power_up_ends(circuit, sequence)
    if end is None:
        return None
    lanes, settings = _mirrored(circuit, found)
    between = voltage(found.first.collector, found.second.collector)
    at = Anchor(end * (1.0 - 1e-9))
    last = level(between, at)
    once, often = (crossing(between, 0.0, rising=True, start=Anchor(SETTLE * end), end=at, nth=n) for n in (1, SWINGS))
    observed: Observed = observe(circuit, lanes, sequence, (last, once, often), cancelled=cancelled)
    if observed.failed.any():
        return None
    first, second = found.first.transistor, found.second.transistor
    if found.holds:
        stands = observed.value(last)
        if not (np.abs(stands) > DECIDED).all() or np.sign(stands[0]) == np.sign(stands[1]):
            return None
        words = f"undefined at power-up: {first} or {second} comes on first"
    else:
        if not observed.seen(often).any() or observed.seen(once).all():
            return None
        words = f"undefined at power-up: {first} and {second} may lock, or swing"
    return Undefined(found, lanes, settings, words)


def with_mirrored(
    circuit: Circuit, asks: Sequence[Ask], corners: dict[str, Corner], cancelled: Callable[[], bool]
) -> dict[str, Corner]:
    """The same corners, by id; where the state at power-up is undefined, it is said, and the worse state counts.

    A margin that one state keeps and the other does not is the outcome "undefined at power-up".
    """
    found = dict(corners)
    judged = [ask for ask in asks if ask.missing is None and ask.trial is None and corners[ask.id].broken is None]
    for pair in pairs(circuit):
        for sequence in dict.fromkeys(name for ask in judged for name in ask.sequences):
            state = undefined(circuit, sequence, pair, cancelled)
            if state is None:
                continue
            there = [ask for ask in judged if sequence in ask.sequences]
            seen = look(circuit, there, state.lanes, cancelled=cancelled)
            for ask in there:
                verdicts, broken = judge(ask, seen)
                if not broken:
                    found[ask.id] = _worse(ask, found[ask.id], state, verdicts, f"{sequence}: {state.words}")
    return found


def _worse(ask: Ask, corner: Corner, state: Undefined, judged: Judged, said: str) -> Corner:
    margin = np.nan_to_num(judged.margin, nan=-1.0)
    worst = int(np.argmin(margin))
    setting = state.settings[worst]
    there = replace(
        corner, setting=setting, words=setting.words(), judged=judged, lane=worst, lanes=state.lanes, edge=None
    )  # fmt: skip
    if margin.min() < 0.0 <= margin.max():
        everywhere = np.ones(2, dtype=bool)
        outcomes = ((everywhere, state.words), *judged.outcomes)
        return replace(there, judged=replace(judged, margin=np.full(2, -1.0), outcomes=outcomes))
    # That equal halves balance in the nominal lane is the same thing said twice.
    spoken = None if corner.remark is None or BALANCES in corner.remark else corner.remark
    remark = said if spoken is None else f"{spoken}; {said}"
    return replace(there if margin[worst] < corner.rank else corner, remark=remark)
