"""The highest voltage that can stand in a circuit without coils, for the bounds by hand."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..design.sequence import Surge
from ..kernel.layout import Floats
from ..primitives.columns import SUPPLY
from ..quantity import read
from .seen import Seen
from .view import View


def top_voltage(view: View, seen: Seen, sequences: Sequence[str]) -> Floats | None:
    """The supply or, where one of these sequences has a surge, what it rises to and its clamp lets through at the rated
    current, V per lane; None where the conditions name no supply."""
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
    return np.asarray(found)


def beside(view: View) -> str:
    """Why the supply does not bound what stands in the circuit; '' where it does."""
    if view.design.conditions.supply is None:
        return "the conditions name no supply"
    generator = next((part.ref for _, part in view.parts_of("generator")), None)
    return "" if generator is None else f"{generator} is a source beside the supply"
