"""Diodes and zener diodes: one junction, from two forward points or a given law, with leakage and breakdown."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import figure, needed, typical, valued
from .kind import TEXT, Entry, Kind
from .physics import doubling, ideality_from, saturation_factor, saturation_from, thermal_voltage

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder, Laws

ZENER_TOLERANCE = 0.05
TEST_CURRENT = 5e-3


def _law(part: Part, key: str, unit: str) -> float | None:
    found = part.law_limits(key, unit)
    if found is None:
        return None
    return next(v for v in (found.typical, found.min, found.max) if v is not None)


def _forward(part: Part, build: Builder) -> Laws:
    if part.law:
        saturation = _law(part, "saturation_current", "A")
        if saturation is None:
            raise CircuitError(
                f'part {part.ref}, law saturation_current: missing; write it like "saturation_current": "1e-14 A"'
            )
        ideality = _law(part, "ideality", "") or 1.0
        capacitance = _law(part, "capacitance", "F") or 0.0
        transit = _law(part, "transit_time", "s") or 0.0
    else:
        low = (
            needed(part, "forward_low", "V", "0.60 V").typical,
            needed(part, "forward_low_current", "A", "1 mA").typical,
        )
        high = figure(part, "forward_high", "V")
        ideality = 1.0
        if high is not None:
            ideality = ideality_from(low, (high.typical, needed(part, "forward_high_current", "A", "10 mA").typical))
        saturation = saturation_from(*low, ideality)
        capacitance = typical(part, "capacitance", "F", 0.0)
        transit = typical(part, "transit_time", "s", 0.0)
    current = build.column(part.ref, "saturation_current", saturation)
    return {
        "saturation": lambda lanes: lanes[current] * saturation_factor(lanes.ambient, ideality),
        "slope": lambda lanes: ideality * thermal_voltage(lanes.ambient),
        "capacitance": lambda lanes: capacitance,
        "transit": lambda lanes: transit,
    }


def _leakage(part: Part, build: Builder) -> Laws:
    found = None if part.law else figure(part, "reverse_current", "A")
    if found is None:
        return {}
    key = build.column(part.ref, "reverse_current", *found.limits, logarithmic=True)
    step = typical(part, "reverse_doubling", "K", 10.0)
    return {"leakage": lambda lanes: lanes[key] * doubling(lanes.ambient, step)}


def _finish(part: Part, build: Builder, laws: Laws) -> None:
    anode, cathode = part.pins["anode"], part.pins["cathode"]
    series = _law(part, "series_resistance", "ohm") if part.law else typical(part, "series_resistance", "ohm", 0.0)
    inner = anode
    bench = build.bench(part.ref)
    if series:
        inner = f"{part.ref}/junction"
        resistor = build.conductance(anode, inner, lambda lanes: 1.0 / series)
        bench.power = resistor.power
    handle = build.junction(inner, cathode, laws)
    bench.currents["anode"] = handle.current
    bench.power = handle.power if bench.power is None else bench.power + handle.power


def expand_diode(part: Part, build: Builder) -> None:
    """Add a diode."""
    laws = _forward(part, build) | _leakage(part, build)
    volts = _law(part, "breakdown_voltage", "V")
    if volts is not None:
        laws["breakdown"] = lambda lanes: volts
    _finish(part, build, laws)


def expand_zener(part: Part, build: Builder) -> None:
    """Add a zener diode: its value is the voltage at the test current."""
    laws = _forward(part, build) | _leakage(part, build)
    volts = build.column(part.ref, "value", *valued(part, "V", ZENER_TOLERANCE).limits)
    test = typical(part, "test_current", "A", TEST_CURRENT)
    slope = typical(part, "slope_resistance", "ohm", 10.0) * test
    laws |= {
        "breakdown": lambda lanes: lanes[volts],
        "breakdown_slope": lambda lanes: slope,
        "breakdown_current": lambda lanes: test,
    }
    _finish(part, build, laws)


DATA = {
    "forward_low": Entry("V", about="forward voltage at forward_low_current"),
    "forward_low_current": Entry("A"),
    "forward_high": Entry("V", about="forward voltage at forward_high_current"),
    "forward_high_current": Entry("A"),
    "reverse_current": Entry("A", about="leakage at 25 C"),
    "reverse_doubling": Entry("K", about="kelvin per doubling of the leakage"),
    "capacitance": Entry("F", about="at zero bias"),
    "transit_time": Entry("s"),
    "series_resistance": Entry("ohm"),
    "v_rrm": Entry("V", about="rated reverse voltage"),
    "i_f_max": Entry("A", about="rated forward current"),
}
LAW = {
    "saturation_current": Entry("A", needed=True),
    "ideality": Entry(""),
    "series_resistance": Entry("ohm"),
    "capacitance": Entry("F", about="at zero bias"),
    "transit_time": Entry("s"),
    "breakdown_voltage": Entry("V"),
}
FIELDS = {"class": Entry(TEXT, about="generic class")}
KINDS = (
    Kind("diode", ("D",), (("anode", "cathode"),), (("anode", "cathode"),), expand_diode, FIELDS, DATA, LAW),
    Kind(
        "zener",
        ("D",),
        (("anode", "cathode"),),
        (("anode", "cathode"),),
        expand_zener,
        {
            **FIELDS,
            "value": Entry("V", needed=True, about="zener voltage at the test current"),
            "tolerance": Entry("%", about="of the zener voltage; 5 % where none is written"),
        },
        {
            **DATA,
            "test_current": Entry("A", about="current of the zener voltage"),
            "slope_resistance": Entry("ohm", about="at the test current"),
            "power": Entry("W", about="rated power"),
        },
        LAW,
    ),
)
