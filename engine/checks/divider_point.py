"""Where a divider of a sensor and a fixed resistor gives a level: the hand formula of trip points."""

from __future__ import annotations

import numpy as np

from ..design.datum import number
from ..design.requirement import Requirement
from ..errors import CircuitError, QuantityError
from ..kernel.layout import Floats
from ..primitives.builder import RETURN
from ..primitives.columns import SUPPLY
from .seen import Seen
from .view import View

HALVINGS = 60


def divider_point(view: View, requirement: Requirement, key: str, ref: str, seen: Seen) -> Floats | None:
    """The quantity of a sensor at which its divider gives the level in a field of the requirement, per lane.

    R_s = R_b s/(1 - s) for a sensor at 0V, R_b (1 - s)/s else, s the share of the rail; then the sensor's own law is
    solved for the quantity between the ends of what the sequences set. None where the field, the role bridge_resistor
    or the rail is missing, NaN in lanes where the level lies outside of those ends.
    """
    text = requirement.extras.get(key)
    part, stage = view.design.part(ref), view.design.stage_of(ref)
    bridge, settable = view.role(stage, "bridge_resistor"), view.circuit.builder.settables.get(ref)
    if text is None or bridge is None or settable is None or SUPPLY not in seen.lanes:
        return None
    share = _share(text, key, requirement, seen)
    lower = RETURN in part.pins.values()
    ratio = share / (1.0 - share) if lower else (1.0 - share) / share
    wanted = 1.0 / (seen.lanes[bridge.ref, "value"] * ratio)
    low, high = _ends(view, ref, seen)
    rising = np.asarray(settable.siemens(seen.lanes, high)) > np.asarray(settable.siemens(seen.lanes, low))
    inside = (np.asarray(settable.siemens(seen.lanes, low)) < wanted) == rising
    inside &= (np.asarray(settable.siemens(seen.lanes, high)) > wanted) == rising
    for _ in range(HALVINGS):
        middle = 0.5 * (low + high)
        below = (np.asarray(settable.siemens(seen.lanes, middle)) < wanted) == rising
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return np.where(inside, 0.5 * (low + high), np.nan)


def _share(text: object, key: str, requirement: Requirement, seen: Seen) -> Floats:
    """The level as a share of the supply, per lane."""
    percent = "%" in str(text)
    try:
        level = number(text, "" if percent else "V")  # type: ignore[arg-type]
    except QuantityError as refusal:
        raise CircuitError(f"requirement {requirement.check}, field {key}: {refusal}") from refusal
    share = np.full(seen.lanes.count, level) if percent else level / seen.lanes[SUPPLY]
    return np.clip(share, 1e-6, 1.0 - 1e-6)


def _ends(view: View, ref: str, seen: Seen) -> tuple[Floats, Floats]:
    """The least and the largest quantity that any sequence sets, and the one at rest."""
    settable = view.circuit.builder.settables[ref]
    rest = np.broadcast_to(np.asarray(settable.start(seen.lanes), dtype=float), (seen.lanes.count,))
    levels = [
        settable.reading(event.to)
        for sequence in view.design.sequences.values()
        for event in sequence.events
        if event.event in ("set", "ramp") and event.part in (ref, settable.follows)
    ]
    found = [rest, *(np.full(seen.lanes.count, level) for level in levels)]
    return np.min(found, axis=0), np.max(found, axis=0)
