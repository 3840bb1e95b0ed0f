"""Sounders: a load that draws its rated current at its rated voltage, and counts as on above its operating minimum.

With the time of its surge the inrush is computed too: a resistance V/surge before a capacitance beside the rest of V/I.
It stands for the smoothing capacitor of an electronic sounder as well as for the inertia of a motor, which is the
same network (electromechanical analogy, textbook). The surge falls to 37 % of its excess within that time, and what is
stored keeps the voltage up for a while after switching off. Without the time only checks read the surge.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from .figures import figure, needed
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Law
    from ..primitives.columns import Lanes


def expand(part: Part, build: Builder) -> None:
    """Add the load as a conductance, its surge where its time is given and, for a piezo element, its capacitance."""
    plus, minus = part.pins["plus"], part.pins["minus"]
    current = needed(part, "current", "A", "150 mA")
    rated = figure(part, "rated_voltage", "V")
    volts = build.supply_nominal if rated is None else rated.typical
    if volts <= 0.0:
        raise CircuitError(f'part {part.ref}, rated_voltage: missing; write it like "rated_voltage": "6 V"')
    key = build.column(part.ref, "current", *current.limits)
    bench = build.bench(part.ref)
    surge = _surge(part, build, key, volts)
    if surge is None:
        handle = build.conductance(plus, minus, lambda lanes: lanes[key] / volts)
        bench.power = handle.power
    else:
        before, beside, farads_beside = surge
        inner = f"{part.ref}/inner"
        handle = build.conductance(plus, inner, before)
        bench.power = handle.power + build.conductance(inner, minus, beside).power
        build.capacitance(inner, minus, farads_beside)
    farads = figure(part, "capacitance", "F")
    if farads is not None:
        value = farads.typical
        build.capacitance(plus, minus, lambda lanes: value)
    bench.currents["plus"] = handle.current
    bench.draw = lambda lanes, across: lanes[key] / volts * across
    least = figure(part, "operating_minimum", "V")
    if least is not None:
        bench.on = (plus, minus, least.typical)


def _surge(part: Part, build: Builder, current: tuple[str, str], volts: float) -> tuple[Law, Law, Law] | None:
    """Conductance before the inner net, conductance and capacitance behind it; None where no time is given."""
    lasts = figure(part, "surge_time", "s")
    if lasts is None:
        return None
    surge, rated = needed(part, "surge", "A", "300 mA"), needed(part, "current", "A", "150 mA")
    if surge.low <= rated.high:
        raise CircuitError(
            f"part {part.ref}, surge: {surge.low:g} A is not above its current of {rated.high:g} A; write a larger "
            "one, or no surge_time"
        )
    if lasts.low <= 0.0:
        raise CircuitError(f'part {part.ref}, surge_time: it must be above zero; write it like "30 ms"')
    peak = build.column(part.ref, "surge", *surge.limits)
    time = build.column(part.ref, "surge_time", *lasts.limits)

    def before(lanes: Lanes) -> Floats:
        return np.asarray(lanes[peak] / volts)

    def beside(lanes: Lanes) -> Floats:
        return np.asarray(1.0 / (volts / lanes[current] - volts / lanes[peak]))

    return before, beside, lambda lanes: lanes[time] * (before(lanes) + beside(lanes))


FIELDS = {
    "current": Entry("A", needed=True, about="at the rated voltage"),
    "operating_minimum": Entry("V", about="the load counts as on above it"),
    "surge": Entry("A", about="inrush at the rated voltage"),
    "sound_level": Entry("dB", about="at 1 m"),
    "capacitance": Entry("F", about="of the element"),
    "class": Entry(TEXT, about="generic class"),
}
DATA = {
    "rated_voltage": Entry("V", about="voltage of the current figure; nominal supply where none is written"),
    "surge_time": Entry("s", about="in which the surge falls to 37 % above the current; not computed if not written"),
}
KINDS = tuple(
    Kind(name, ("B", "LS", "H"), (("plus", "minus"),), (("plus", "minus"),), expand, FIELDS, DATA)
    for name in ("sounder", "piezo")
)
