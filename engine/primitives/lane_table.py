"""The lane table: parameters of all primitives, one row per lane, as the kernel reads them."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from ..kernel import layout
from ..kernel.layout import Floats
from .builder import Builder, Law, Laws, constant
from .columns import Lanes

DEFAULTS = {"potential": 0.75, "grading": 0.5, "breakdown_slope": 0.05, "breakdown_current": 1e-3}
JUNCTION = {
    "saturation": layout.J_SATURATION,
    "slope": layout.J_SLOPE,
    "capacitance": layout.J_CAPACITANCE,
    "potential": layout.J_POTENTIAL,
    "grading": layout.J_GRADING,
    "transit": layout.J_TRANSIT,
    "breakdown": layout.J_BREAKDOWN,
    "breakdown_slope": layout.J_BREAKDOWN_SLOPE,
    "breakdown_current": layout.J_BREAKDOWN_CURRENT,
    "leakage": layout.J_LEAKAGE,
}
TRANSPORT = {
    "per_forward_gain": layout.T_GAIN_FORWARD,
    "per_reverse_gain": layout.T_GAIN_REVERSE,
    "per_early_voltage": layout.T_EARLY,
    "collector_junction": layout.T_COLLECTOR,
    "per_knee_current": layout.T_PER_KNEE,
}
CHANNEL = {
    "threshold": layout.C_THRESHOLD,
    "transconductance": layout.C_TRANSCONDUCTANCE,
    "modulation": layout.C_MODULATION,
}
WARM = {
    "level": layout.W_LEVEL,
    "power": layout.W_POWER,
    "beta": layout.W_BETA,
    "offset": layout.W_OFFSET,
    "ambient": layout.W_AMBIENT,
    "radiation": layout.W_RADIATION,
}


class _Filled:
    """A lane table that is filled from the left."""

    def __init__(self, lanes: Lanes, width: int) -> None:
        self.lanes = lanes
        self.table = layout.zeros(lanes.count, width)
        self.place = 0
        self.junctions: list[int] = []

    def law(self, law: Law) -> None:
        self.table[:, self.place] = law(self.lanes)
        self.place += 1

    def laws(self, laws: Laws, places: Mapping[str, np.uint32], width: int, prefix: str = "") -> None:
        """Those that are named in ``places``, and 0 or a default for one that is not given."""
        for name, place in places.items():
            law = laws.get(prefix + name)
            if law is not None:
                self.table[:, self.place + place] = law(self.lanes)
            elif name in DEFAULTS:
                self.table[:, self.place + place] = DEFAULTS[name]
        self.place += width

    def junction(self, laws: Laws, prefix: str = "") -> None:
        self.junctions.append(self.place)
        self.laws(laws, JUNCTION, layout.JUNCTION_WIDTH, prefix)


def derive_junctions(table: Floats, places: list[int]) -> None:
    """Set what the laws of junctions would else compute in every iterate; ``places`` are those of their parameters."""
    first = np.array(places, dtype=np.int64)

    def of(place: np.uint32) -> Floats:
        found: Floats = table[:, first + int(place)]
        return found

    def put(place: np.uint32, values: Floats) -> None:
        table[:, first + int(place)] = values

    slope, potential, grading = of(layout.J_SLOPE), of(layout.J_POTENTIAL), of(layout.J_GRADING)
    breakdown_slope = of(layout.J_BREAKDOWN_SLOPE)
    put(layout.J_PER_SLOPE, 1.0 / slope)
    put(layout.J_PER_BREAKDOWN_SLOPE, 1.0 / breakdown_slope)
    put(layout.J_PER_POTENTIAL, 1.0 / potential)
    put(layout.J_RISE, grading / (0.5 * potential))
    put(layout.J_STORED, of(layout.J_CAPACITANCE) * potential / (1.0 - grading))
    # The voltage at which the exponential bends away: where its conductance equals its slope over 1.4 ohm.
    knee = np.log(slope / (math.sqrt(2.0) * np.maximum(of(layout.J_SATURATION), 1e-300)))
    put(layout.J_KNEE, np.maximum(0.0, slope * knee))
    over = breakdown_slope / (math.sqrt(2.0) * of(layout.J_BREAKDOWN_CURRENT))
    put(layout.J_BREAKDOWN_KNEE, breakdown_slope * np.log(over))


def junction_parameters(laws: Laws, lanes: Lanes) -> Floats:
    """Parameters of one junction, (lanes, JUNCTION_WIDTH)."""
    filled = _Filled(lanes, layout.JUNCTION_WIDTH)
    filled.junction(laws)
    derive_junctions(filled.table, filled.junctions)
    return filled.table


def lane_table(made: Builder, lanes: Lanes) -> Floats:
    """Law parameters of all primitives in the order of their families, (lanes, parameters)."""
    moved: list[Law | float] = []
    for guard in made.guards.values():
        moved += [guard.on, guard.off, guard.on_delay, guard.off_delay]
    for each in made.operated:
        moved += [each.closed, each.opened, each.delay, each.bounce_for, float(each.bounce_times)]
    width = len(made.conductances) + len(made.capacitances) + 2 * len(made.branches) + len(moved)
    width += layout.JUNCTION_WIDTH * len(made.junctions) + layout.TRANSPORT_WIDTH * len(made.transports)
    width += layout.CHANNEL_WIDTH * len(made.channels) + layout.WARM_WIDTH * len(made.warms)
    filled = _Filled(lanes, width)
    for *_, law in (*made.conductances, *made.capacitances):
        filled.law(law)
    for *_, inductance, resistance, _ in made.branches:
        filled.law(inductance)
        filled.law(resistance)
    for *_, laws in made.junctions:
        filled.junction(laws)
    for *_, laws in made.transports:
        filled.laws(laws, TRANSPORT, int(layout.T_EMITTER_JUNCTION))
        filled.junction(laws, "emitter_")
        filled.junction(laws, "collector_")
    for *_, laws in made.channels:
        filled.laws(laws, CHANNEL, layout.CHANNEL_WIDTH)
    for *_, laws in made.warms:
        filled.laws(laws, WARM, layout.WARM_WIDTH)
    for entry in moved:
        filled.law(entry if callable(entry) else constant(entry))
    derive_junctions(filled.table, filled.junctions)
    return filled.table
