"""The lane table: parameters of all primitives, one row per lane, as the kernel reads them."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from ..kernel import layout
from ..kernel.layout import Floats
from .builder import Builder, Constant, Law, Laws
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


class LanePlan:
    """Where each law goes in a row, laid out from the left; what is the same in every lane is written down once."""

    def __init__(self) -> None:
        self._row: list[float] = []
        self._laws: list[tuple[int, Law]] = []
        self._junctions: list[int] = []

    def law(self, law: Law | float) -> None:
        """Add one parameter."""
        self._row.append(0.0)
        self._set(len(self._row) - 1, law)

    def laws(self, laws: Laws, places: Mapping[str, np.uint32], width: int, prefix: str = "") -> None:
        """Add those that are named in ``places``, and 0 or a default for one that is not given."""
        begin = len(self._row)
        self._row += [0.0] * width
        for name, place in places.items():
            law = laws.get(prefix + name, DEFAULTS.get(name))
            if law is not None:
                self._set(begin + int(place), law)

    def junction(self, laws: Laws, prefix: str = "") -> None:
        """Add the parameters of a junction."""
        self._junctions.append(len(self._row))
        self.laws(laws, JUNCTION, layout.JUNCTION_WIDTH, prefix)

    def _set(self, place: int, law: Law | float) -> None:
        if isinstance(law, Constant):
            self._row[place] = law.value
        elif callable(law):
            self._laws.append((place, law))
        else:
            self._row[place] = law

    def table(self, lanes: Lanes) -> Floats:
        """Parameters of all laws, (lanes, parameters)."""
        table = np.repeat(np.array([self._row]), lanes.count, axis=0)
        for place, law in self._laws:
            table[:, place] = law(lanes)
        derive_junctions(table, self._junctions)
        return table


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
    plan = LanePlan()
    plan.junction(laws)
    return plan.table(lanes)


def lane_plan(made: Builder) -> LanePlan:
    """The parameters of all primitives in the order of their families."""
    plan = LanePlan()
    for *_, law in (*made.conductances, *made.capacitances):
        plan.law(law)
    for *_, inductance, resistance, _ in made.branches:
        plan.law(inductance)
        plan.law(resistance)
    for *_, laws in made.junctions:
        plan.junction(laws)
    for *_, laws in made.transports:
        plan.laws(laws, TRANSPORT, int(layout.T_EMITTER_JUNCTION))
        plan.junction(laws, "emitter_")
        plan.junction(laws, "collector_")
    for *_, laws in made.channels:
        plan.laws(laws, CHANNEL, layout.CHANNEL_WIDTH)
    for *_, laws in made.warms:
        plan.laws(laws, WARM, layout.WARM_WIDTH)
    for guard in made.guards.values():
        for law in (guard.on, guard.off, guard.on_delay, guard.off_delay):
            plan.law(law)
    for each in made.operated:
        for moved in (each.closed, each.opened, each.delay, each.bounce_for, float(each.bounce_times)):
            plan.law(moved)
    return plan
