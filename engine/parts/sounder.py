"""Sounders: a load that draws its rated current at its rated voltage, and counts as on above its operating minimum."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import figure, needed
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def expand(part: Part, build: Builder) -> None:
    """Add the load as a conductance and, for a piezo element, its capacitance."""
    plus, minus = part.pins["plus"], part.pins["minus"]
    current = needed(part, "current", "A", "150 mA")
    rated = figure(part, "rated_voltage", "V")
    volts = build.supply_nominal if rated is None else rated.typical
    if volts <= 0.0:
        raise CircuitError(f'part {part.ref}, rated_voltage: missing; write it like "rated_voltage": "6 V"')
    key = build.column(part.ref, "current", *current.limits)
    handle = build.conductance(plus, minus, lambda lanes: lanes[key] / volts)
    farads = figure(part, "capacitance", "F")
    if farads is not None:
        value = farads.typical
        build.capacitance(plus, minus, lambda lanes: value)
    bench = build.bench(part.ref)
    bench.currents["plus"] = handle.current
    bench.power = handle.power
    bench.draw = lambda lanes, across: lanes[key] / volts * across
    least = figure(part, "operating_minimum", "V")
    if least is not None:
        bench.on = (plus, minus, least.typical)


FIELDS = {
    "current": Entry("A", needed=True, about="at the rated voltage"),
    "operating_minimum": Entry("V", about="the load counts as on above it"),
    "surge": Entry("A", about="inrush"),
    "sound_level": Entry("dB", about="at 1 m"),
    "capacitance": Entry("F", about="of the element"),
    "class": Entry(TEXT, about="generic class"),
}
DATA = {"rated_voltage": Entry("V", about="voltage of the current figure; nominal supply where none is written")}
KINDS = tuple(
    Kind(name, ("B", "LS", "H"), (("plus", "minus"),), (("plus", "minus"),), expand, FIELDS, DATA)
    for name in ("sounder", "piezo")
)
