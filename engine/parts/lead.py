"""Lead: a length of cable, as series resistance and inductance with half of its capacitance and leakage at each end."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import Figure, figure, needed
from .kind import TEXT, Entry, Kind
from .levels import ohmic, reading_above_zero

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def times(figure: Figure, factor: float) -> tuple[float, float, float]:
    """The limits of a figure, multiplied."""
    middle, low, high = figure.limits
    return factor * middle, factor * low, factor * high


def expand(part: Part, build: Builder) -> None:
    """Add the lead; events set its whole resistance."""
    start, end = part.pins["from"], part.pins["to"]
    length = needed(part, "length", "m", "10 m").typical
    per_metre = needed(part, "resistance", "ohm/m", "40 mohm/m")
    if length <= 0.0 or per_metre.low <= 0.0:
        raise CircuitError(f"part {part.ref}: a lead has a length and a resistance; write both above zero")
    ohms = build.column(part.ref, "resistance", *times(per_metre, length))
    inductance = figure(part, "inductance", "H/m")
    inner = end
    if inductance is not None and inductance.typical > 0.0:
        inner = f"{part.ref}/inner"
        henry = length * inductance.typical
        build.branch(inner, end, lambda lanes: henry, lambda lanes: 0.0)
    reading = reading_above_zero(part, "ohm", "1 ohm")
    handle = build.settable(part.ref, start, inner, lambda lanes: lanes[ohms], ohmic, reading)
    farads = figure(part, "capacitance", "F/m")
    if farads is not None and farads.typical > 0.0:
        half = build.column(part.ref, "capacitance", *times(farads, 0.5 * length))
        for net in (start, end):
            build.capacitance(net, "0V", lambda lanes: lanes[half])
    insulation = figure(part, "insulation", "ohm")
    if insulation is not None:
        if insulation.low <= 0.0:
            raise CircuitError(f'part {part.ref}, insulation: it must be above zero; write it like "10M"')
        leak = build.column(part.ref, "insulation", *insulation.limits)
        for net in (start, end):
            build.conductance(net, "0V", lambda lanes: 0.5 / lanes[leak])
    bench = build.bench(part.ref)
    bench.currents["from"] = handle.current
    bench.power = handle.power


KIND = Kind(
    name="lead",
    letters=("W", "X"),
    pins=(("from", "to"),),
    paths=(("from", "to"),),
    expand=expand,
    fields={
        "length": Entry("m", needed=True, about="of the cable, one way"),
        "resistance": Entry("ohm/m", needed=True, about="per metre of the conductor"),
        "inductance": Entry("H/m", about="per metre"),
        "capacitance": Entry("F/m", about="per metre, to 0V"),
        "insulation": Entry("ohm", about="of the whole lead to 0V"),
        "class": Entry(TEXT, about="generic class"),
    },
)
