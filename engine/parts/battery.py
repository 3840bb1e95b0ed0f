"""Battery: a source whose voltage follows its charge state, behind a resistance that grows with cold and with age.

The charge state stands still during a run.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..quantity import read
from .classes import POINTS
from .curve import Curve, points_of
from .figures import Figure, class_figures, figure, typical
from .kind import TEXT, Entry, Kind
from .physics import REFERENCE
from .points import resistance_of_loads

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder
    from ..primitives.columns import Lanes

COLD = -20.0  # deg C at which the resistance in the cold is given where no temperature is written
CURVES: dict[str, Curve] = {
    name: tuple((read(share, ""), read(volts, "V")) for share, volts in points["voltage"].points)
    for name, points in POINTS.items()
    if "voltage" in points
}
"""Open-circuit volts over charge state, by the names of classes."""


def voltage_curve(part: Part) -> Curve:
    """Open-circuit volts over charge state (0 .. 1), as points to be joined by straight lines."""
    curve = points_of(part, "voltage", ("", "V"), '[["0 %", "6 V"], ["100 %", "9.5 V"]]')
    if curve is not None:
        return curve
    plain = figure(part, "voltage", "V")
    if plain is not None:
        return ((0.0, plain.typical),)
    class_figures(part)
    raise CircuitError(
        f'part {part.ref}, voltage: missing; write it like "voltage": [["0 %", "6 V"], ["100 %", "9.5 V"]]'
    )


def _resistance(part: Part) -> Figure | None:
    """Resistance of a fresh battery in ohm at 25 C: as written, from two loads, or of its class."""
    loads = points_of(part, "loads", ("A", "V"), '[["10 mA", "9.1 V"], ["100 mA", "8.8 V"]]')
    if loads is None or part.entry("resistance") is not None:
        return figure(part, "resistance", "ohm")
    if len(loads) != 2:
        raise CircuitError(f"part {part.ref}, loads: {len(loads)} points are given; write two loads")
    try:
        ohms = resistance_of_loads(loads[0], loads[1])
    except CircuitError as refusal:
        raise CircuitError(f"part {part.ref}, loads: {refusal}") from refusal
    return Figure(ohms, ohms, ohms, "measured")


def _share(part: Part, build: Builder, key: str, default: float) -> tuple[str, str]:
    found = figure(part, key, "")
    limits = (default, default, default) if found is None else found.limits
    if not all(0.0 <= each <= 1.0 for each in limits):
        raise CircuitError(f"part {part.ref}, {key}: it must lie between 0 % and 100 %")
    return build.column(part.ref, key, *limits)


def expand(part: Part, build: Builder) -> None:
    """Add the source. In the cold and with age its resistance grows by a power law between the figures given."""
    curve = np.array(voltage_curve(part))
    state = _share(part, build, "charge_state", 1.0)
    age = _share(part, build, "age", 0.0)
    fresh = _resistance(part)

    def volts(lanes: Lanes) -> Floats:
        return np.asarray(np.interp(lanes[state], curve[:, 0], curve[:, 1]))

    source = f"{part.ref} source"
    bench = build.bench(part.ref)
    if fresh is None or fresh.typical == 0.0:
        handle = build.branch(part.pins["plus"], part.pins["minus"], lambda lanes: 0.0, lambda lanes: 0.0, source)
    else:
        middle = fresh.typical
        key = build.column(part.ref, "resistance", *fresh.limits)
        aged = typical(part, "aged_resistance", "ohm", middle)
        cold = typical(part, "cold_resistance", "ohm", middle)
        coldest = typical(part, "cold_temperature", "degC", COLD)
        if min(aged, cold) <= 0.0 or coldest >= REFERENCE:
            raise CircuitError(
                f"part {part.ref}: aged and cold resistance must be above zero, and the cold below 25 C; write them so"
            )

        def ohms(lanes: Lanes) -> Floats:
            chill = np.maximum(0.0, (REFERENCE - lanes.ambient) / (REFERENCE - coldest))
            return np.asarray(lanes[key] * (aged / middle) ** lanes[age] * (cold / middle) ** chill)

        handle = build.branch(part.pins["plus"], part.pins["minus"], lambda lanes: 0.0, ohms, source)
    build.batteries[source] = volts
    bench.currents["plus"] = handle.current


KIND = Kind(
    name="battery",
    letters=("G", "B", "BT"),
    pins=(("plus", "minus"),),
    paths=(("plus", "minus"),),
    expand=expand,
    fields={
        "voltage": Entry("V", about="open-circuit voltage, or points of charge state and voltage"),
        "resistance": Entry("ohm", about="fresh, at 25 C; an ideal source where neither it nor loads are written"),
        "capacity": Entry("Ah", about="charge it can give"),
        "charge_limits": Entry(TEXT, about="of voltage and current when it is charged"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={
        "self_discharge": Entry("1/s", about="share of the capacity that it loses by itself, such as 3 %/month"),
        "charge_state": Entry("", about="share of the capacity that is left; 100 % where none is written"),
        "age": Entry("", about="0 % fresh, 100 % at the aged resistance"),
        "loads": Entry(TEXT, about="two points of current and voltage, instead of the resistance"),
        "aged_resistance": Entry("ohm", about="at the end of its life"),
        "cold_resistance": Entry("ohm", about="at cold_temperature"),
        "cold_temperature": Entry("degC", about="-20 C where none is written"),
    },
)
