"""The highest voltage that can stand in a circuit without coils, for the bounds by hand: what its sources give."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..design.datum import number
from ..design.part import Part
from ..design.sequence import RampLevel, SetLevel, Surge
from ..kernel.layout import Floats
from ..primitives.builder import RETURN
from ..primitives.columns import SUPPLY
from ..quantity import read
from .seen import Seen
from .view import View


def top_voltage(view: View, seen: Seen, sequences: Sequence[str]) -> Floats | None:
    """The supply or, where one of these sequences has a surge, what it rises to and its clamp lets through at the rated
    current; and what generators go beyond. V per lane; None where the conditions name no supply."""
    if SUPPLY not in seen.lanes:
        return None
    clamps = [(part.ref, "clamping_voltage") for _, part in view.parts_of("clamp")]
    found = seen.lanes[SUPPLY]
    for name in sequences:
        for event in view.design.sequences[name].events:
            if isinstance(event, Surge):
                rises = np.full(seen.lanes.count, read(event.to, "V"))
                for column in clamps:
                    if column in seen.lanes:
                        rises = np.minimum(rises, seen.lanes[column])
                found = np.maximum(found, rises)
    return np.asarray(found + beyond_rails(view, seen))


def beyond_rails(view: View, seen: Seen) -> Floats:
    """How far generators go below 0V and above the supply, V per lane: all that one not at 0V gives."""
    supply = seen.lanes[SUPPLY] if SUPPLY in seen.lanes else np.zeros(seen.lanes.count)
    total = np.zeros(seen.lanes.count)
    for _, part in view.parts_of("generator"):
        low, high = _gives(view, part)
        if part.pins["minus"] == RETURN:
            total = total + max(0.0, -low) + np.maximum(0.0, high - supply)
        else:
            total = total + max(abs(low), abs(high))
    return total


def _gives(view: View, part: Part) -> tuple[float, float]:
    """The least and the largest voltage of a generator: of its waveform, and about every level that events set."""
    assert part.waveform is not None
    sine, swing = part.waveform.sine, 0.0
    if sine is not None:
        swing = abs(number(sine.amplitude, "V"))
        levels = [0.0 if sine.offset is None else number(sine.offset, "V")]
    else:
        levels = [number(volts, "V") for _, volts in part.waveform.steps or ()]
    for sequence in view.design.sequences.values():
        for event in sequence.events:
            if isinstance(event, SetLevel | RampLevel) and event.part == part.ref:
                levels.append(number(event.to, "V"))
    return min(levels) - swing, max(levels) + swing


def beside(view: View) -> str:
    """Why there is no such voltage; '' where there is."""
    return "the conditions name no supply" if view.design.conditions.supply is None else ""
