"""Resistor: one conductance, with a temperature coefficient when it is given."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from .figures import Figure, figure, valued
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder
    from ..primitives.columns import Lanes

TOLERANCE = 0.05  # customary where none is written, from memory


def expand(part: Part, build: Builder) -> None:
    """Add the resistor; a value of 0R was joined into one net before and adds nothing."""
    value = valued(part, "ohm", TOLERANCE)
    if value.typical == 0.0:
        return
    key = build.column(part.ref, "value", *value.limits)
    drift = figure(part, "tempco", "1/K")

    def conductance(lanes: Lanes) -> Floats:
        if drift is None:
            return 1.0 / lanes[key]
        return 1.0 / (lanes[key] * (1.0 + _drifted(drift, value, lanes[key], lanes.ambient - 25.0)))

    handle = build.conductance(part.pins["a"], part.pins["b"], conductance)
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


def _drifted(drift: Figure, value: Figure, ohms: Floats, kelvin: Floats) -> Floats:
    """Share by which the resistance has moved at ``kelvin`` above 25 C.

    A resistor that is out of tolerance to one side drifts to that side too, hot and cold: the ends of the value are
    those over temperature, without lanes for the drift alone.
    """
    half = np.maximum(0.5 * (value.high - value.low), 1e-12 * value.typical)
    # Trials vary the value far beyond its tolerance.
    side = np.clip((ohms - value.typical) / half, -1.0, 1.0)
    spread = np.where(side > 0.0, drift.high - drift.typical, drift.typical - drift.low)
    return np.asarray(drift.typical * kelvin + side * spread * np.abs(kelvin))


KIND = Kind(
    name="resistor",
    letters=("R",),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "value": Entry("ohm", needed=True, about="resistance"),
        "tolerance": Entry("%", about="largest deviation of the value; 5 % where none is written"),
        "rating": Entry("W", about="power up to 70 C"),
        "tempco": Entry("1/K", about="temperature coefficient"),
        "class": Entry(TEXT, about="generic class"),
    },
)
