"""What hangs on a net as capacitance, for hand formulas: capacitors to the rails, strays, junctions."""

from __future__ import annotations

import numpy as np

from ..kernel.layout import Floats
from ..primitives.builder import RETURN, SUPPLY_NET
from ..primitives.columns import Lanes
from .reverse_base_emitter import BIPOLAR
from .view import View


def held_by(view: View, lanes: Lanes, net: str, without: str = "") -> Floats:
    """Farads on a net per lane, junctions at their typical figure; the capacitor ``without`` does not count."""
    fixed = sum(view.strays_at(net))
    for kinds, pin, keys in (
        (BIPOLAR, "base", ("c_ob", "c_ib")),
        (BIPOLAR, "collector", ("c_ob",)),
        (("diode", "schottky"), "anode", ("capacitance",)),
        (("diode", "schottky"), "cathode", ("capacitance",)),
    ):
        for _, part in view.parts_of(*kinds):
            if part.pins[pin] == net:
                fixed += sum(figure.typical for figure in (view.datum(part, key, "F") for key in keys) if figure)
    held = np.full(lanes.count, fixed)
    for _, part in view.parts_of("capacitor"):
        pins = set(part.pins.values())
        if part.ref != without and net in pins and pins & {RETURN, SUPPLY_NET}:
            held = held + lanes[part.ref, "value"]
    return held
