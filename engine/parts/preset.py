"""Preset: a resistance between the ends of its range, at a setting that events may move."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from .figures import typical
from .kind import TEXT, Entry, Kind
from .levels import Reading, reading_in

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder
    from ..primitives.columns import Lanes

TOLERANCE = 0.20  # of the track, customary where none is written, from memory
END_RESISTANCE = 2.0  # ohm that remain at the end of the travel, from memory


def _ends(part: Part) -> tuple[float, float]:
    """Resistance at settings 0 and 1: 0 and the range, or the two limits of the range."""
    found = part.limits("range", "ohm") or part.limits("value", "ohm")
    if found is None:
        raise CircuitError(f'part {part.ref}, range: missing; write it like "range": "100k"')
    low = 0.0 if found.min is None else found.min
    high = found.typical if found.max is None else found.max
    if high is None or not 0.0 <= low < high:
        raise CircuitError(f'part {part.ref}, range: it has no upper end; write it like "range": "100k"')
    return low, high


def _setting(part: Part) -> Reading:
    plain = reading_in(part, "")

    def reading(text: str | float) -> float:
        value = plain(text)
        if not 0.0 <= value <= 1.0:
            raise CircuitError(f"part {part.ref}: a setting of {text} cannot be; write one from 0 % to 100 %")
        return value

    return reading


def _start(part: Part, low: float, high: float, reading: Reading) -> float:
    """The setting before any event: as written, or where ``value`` lies within the range; the middle otherwise."""
    if part.setting is not None:
        return reading(part.setting)
    value = part.limits("value", "ohm")
    if value is None or value.typical is None:
        return 0.5
    if not low <= value.typical <= high:
        raise CircuitError(f"part {part.ref}, value: {part.value} lies outside of its range; write one within it")
    return (value.typical - low) / (high - low)


def expand(part: Part, build: Builder) -> None:
    """Add the preset as a conductance that events set by the share of its travel."""
    low, high = _ends(part)
    written = part.limits("tolerance", "%")
    spread = TOLERANCE if written is None or written.typical is None else written.typical
    if not 0.0 <= spread < 1.0:
        raise CircuitError(f'part {part.ref}, tolerance: {spread:.0%} cannot be; write it like "20 %"')
    track = build.column(part.ref, "range", 1.0, 1.0 - spread, 1.0 + spread)
    least = typical(part, "end_resistance", "ohm", END_RESISTANCE)
    if least <= 0.0:
        raise CircuitError(f'part {part.ref}, end_resistance: it must be above zero; write it like "2R"')
    drift = typical(part, "tempco", "1/K", 0.0)
    reading = _setting(part)
    start = _start(part, low, high, reading)

    def siemens(lanes: Lanes, setting: Floats | float) -> Floats:
        ohms = lanes[track] * (low + (high - low) * np.asarray(setting)) * (1.0 + drift * (lanes.ambient - 25.0))
        return np.asarray(1.0 / np.maximum(ohms, least))

    handle = build.settable(part.ref, part.pins["a"], part.pins["b"], lambda lanes: start, siemens, reading)
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


KIND = Kind(
    name="preset",
    letters=("R", "RV", "P"),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "range": Entry("ohm", about="resistance of the whole track, or min and max of what can be set"),
        "setting": Entry("", about="share of the travel; the middle where neither it nor a value is written"),
        "value": Entry("ohm", about="resistance it is set to, or the range where no range is written"),
        "tolerance": Entry("%", about="of the track; 20 % where none is written"),
        "rating": Entry("W", about="power of the whole track"),
        "tempco": Entry("1/K", about="temperature coefficient"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={"end_resistance": Entry("ohm", about="what remains at the end of the travel; 2 ohm where none is written")},
)
