"""Diodes: one junction, from one to three forward points or a given law, with leakage and breakdown.

A light-emitting diode has the band gap of its material; a Schottky diode the barrier of its metal contact and the
temperature law of Richardson, I ~ T^2 exp(-barrier/kT). A surge clamp breaks down along the exponential through its
stand-off point and its clamping point.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from .figures import Figure, figure, needed, typical, valued
from .kind import TEXT, THERMAL, Entry, Kind
from .leakage import kelvin_per_doubling, leakage_entries
from .physics import (
    BAND_GAP,
    REFERENCE,
    SATURATION_EXPONENT,
    doubling,
    saturation_factor,
    saturation_from,
    thermal_voltage,
)
from .points import ForwardLaw, Point, forward_law, forward_law_of_three

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder, Law, Laws

ZENER_TOLERANCE = 0.05
TEST_CURRENT, SLOPE = 5e-3, 10.0  # A, ohm of a zener diode where none is written, from memory
BARRIER = 0.70  # V of a Schottky contact, from memory
RICHARDSON = 2.0  # power of the absolute temperature in the saturation current of a metal contact
EMITTING_GAP = 2.15  # V extrapolated to 0 K, red, from memory
CLAMPING = 1.6  # times the stand-off voltage at the pulse current, common practice, from memory
STANDOFF_CURRENT = 5e-6  # A at the stand-off voltage, from memory
PULSE_POWER = 600.0  # W within 1 ms, from memory


def _law(part: Part, key: str, unit: str) -> float | None:
    found = part.law_limits(key, unit)
    if found is None:
        return None
    return next(v for v in (found.typical, found.min, found.max) if v is not None)


def _forward_law(part: Part) -> ForwardLaw:
    """The law that is given, else the one through one, two or three forward points."""
    if part.law:
        saturation = _law(part, "saturation_current", "A")
        if saturation is None:
            raise CircuitError(
                f'part {part.ref}, law saturation_current: missing; write it like "saturation_current": "1e-14 A"'
            )
        return ForwardLaw(saturation, _law(part, "ideality", "") or 1.0, _law(part, "series_resistance", "ohm") or 0.0)
    low = _point(part, "forward_low", "0.60 V", "1 mA")
    series = typical(part, "series_resistance", "ohm", 0.0)
    if figure(part, "forward_high", "V") is None:
        return ForwardLaw(saturation_from(low[0] - low[1] * series, low[1]), 1.0, series)
    high = _point(part, "forward_high", "0.72 V", "10 mA")
    key = "forward_high" if figure(part, "forward_middle", "V") is None else "forward_middle"
    try:
        if key == "forward_high":
            return forward_law(low, high, series=series)
        return forward_law_of_three(low, _point(part, key, "0.66 V", "3 mA"), high)
    except CircuitError as refusal:
        raise CircuitError(f"part {part.ref}, {key}: {refusal}") from refusal


def _point(part: Part, key: str, volts: str, amperes: str) -> Point:
    return needed(part, key, "V", volts).typical, needed(part, f"{key}_current", "A", amperes).typical


def _forward(part: Part, build: Builder, gap: float = BAND_GAP, power: float = SATURATION_EXPONENT) -> Laws:
    law = _forward_law(part)
    if part.law:
        capacitance = _law(part, "capacitance", "F") or 0.0
        transit = _law(part, "transit_time", "s") or 0.0
    else:
        capacitance = typical(part, "capacitance", "F", 0.0)
        transit = typical(part, "transit_time", "s", 0.0)
    ideality = law.ideality
    saturation = _saturation(part, build, law)
    return {
        "saturation": lambda lanes: (
            np.asarray(saturation(lanes)) * saturation_factor(lanes.ambient, ideality, gap, power)
        ),
        "slope": lambda lanes: ideality * thermal_voltage(lanes.ambient),
        "capacitance": lambda lanes: capacitance,
        "transit": lambda lanes: transit,
    }


def reverse_saturation(part: Part, celsius: float) -> float:
    """The saturation current in A at a temperature: what flows in reverse beside the leakage that is given."""
    law = _forward_law(part)
    return law.saturation * float(saturation_factor(celsius, law.ideality))


def _saturation(part: Part, build: Builder, law: ForwardLaw) -> Law:
    """Saturation current at 25 C. Parts differ in it, so that their forward voltages differ by as much at all currents:
    the spread of the low point moves it."""
    low = None if part.law else figure(part, "forward_low", "V")
    if low is None or low.low == low.high:
        current = build.column(part.ref, "saturation_current", law.saturation)
        return lambda lanes: lanes[current]
    volts = build.column(part.ref, "forward_low", *low.limits)
    slope = law.ideality * float(thermal_voltage(REFERENCE))
    return lambda lanes: np.asarray(law.saturation * np.exp((low.typical - lanes[volts]) / slope))


def _leakage(part: Part, build: Builder) -> Laws:
    found = None if part.law else figure(part, "reverse_current", "A")
    if found is None:
        return {}
    key = build.column(part.ref, "reverse_current", *found.limits, logarithmic=True)
    step = kelvin_per_doubling(part, "reverse", found)
    return {"leakage": lambda lanes: lanes[key] * doubling(lanes.ambient, step)}


def _finish(part: Part, build: Builder, laws: Laws) -> None:
    anode, cathode = part.pins["anode"], part.pins["cathode"]
    series = _forward_law(part).series
    inner = anode
    bench = build.bench(part.ref)
    if series:
        inner = f"{part.ref}/junction"
        resistor = build.conductance(anode, inner, lambda lanes: 1.0 / series)
        bench.power = resistor.power
    handle = build.junction(inner, cathode, laws)
    bench.currents["anode"] = handle.current
    bench.power = handle.power if bench.power is None else bench.power + handle.power


def _with_breakdown(part: Part, build: Builder, laws: Laws) -> None:
    laws |= _leakage(part, build)
    volts = _law(part, "breakdown_voltage", "V")
    if volts is not None:
        laws["breakdown"] = lambda lanes: volts
    _finish(part, build, laws)


def expand_diode(part: Part, build: Builder) -> None:
    """Add a diode."""
    _with_breakdown(part, build, _forward(part, build))


def expand_led(part: Part, build: Builder) -> None:
    """Add a light-emitting diode."""
    _with_breakdown(part, build, _forward(part, build, typical(part, "band_gap", "V", EMITTING_GAP)))


def expand_schottky(part: Part, build: Builder) -> None:
    """Add a Schottky diode."""
    _with_breakdown(part, build, _forward(part, build, typical(part, "barrier", "V", BARRIER), RICHARDSON))


def expand_clamp(part: Part, build: Builder) -> None:
    """Add a surge clamp: i = I_R exp((v - V_R)/slope), the slope from stand-off and clamping point."""
    laws = _forward(part, build)
    standoff = figure(part, "value", "V")
    if standoff is None or standoff.typical <= 0.0:
        raise CircuitError(f'part {part.ref}, value: missing; write the stand-off voltage like "value": "15 V"')
    leak = typical(part, "standoff_current", "A", STANDOFF_CURRENT)
    clamping = figure(part, "clamping_voltage", "V")
    usual = CLAMPING * standoff.typical
    limits = (usual, usual, usual) if clamping is None else clamping.limits
    pulse = typical(part, "pulse_current", "A", typical(part, "pulse_power", "W", PULSE_POWER) / limits[0])
    if limits[1] <= standoff.typical:
        raise CircuitError(
            f"part {part.ref}, clamping_voltage: it must lie above the stand-off voltage; write it higher"
        )
    if pulse <= leak:
        raise CircuitError(f"part {part.ref}, pulse_current: it must lie above the stand-off current; write it higher")
    volts = build.column(part.ref, "clamping_voltage", *limits)
    folds = math.log(pulse / leak)
    laws |= {
        "breakdown": lambda lanes: standoff.typical,
        "breakdown_slope": lambda lanes: (lanes[volts] - standoff.typical) / folds,
        "breakdown_current": lambda lanes: leak,
    }
    _finish(part, build, laws)


def expand_zener(part: Part, build: Builder) -> None:
    """Add a zener diode: its value is the voltage at the test current."""
    laws = _forward(part, build) | _leakage(part, build)
    volts = build.column(part.ref, "value", *valued(part, "V", ZENER_TOLERANCE).limits)
    test = typical(part, "test_current", "A", TEST_CURRENT)
    flat = figure(part, "slope_resistance", "ohm") or Figure(SLOPE, SLOPE, SLOPE, "class")
    slope = build.column(part.ref, "slope_resistance", *flat.limits, logarithmic=True)
    laws |= {
        "breakdown": lambda lanes: lanes[volts],
        "breakdown_slope": lambda lanes: lanes[slope] * test,
        "breakdown_current": lambda lanes: test,
    }
    _finish(part, build, laws)


DATA = {
    "forward_low": Entry("V", about="forward voltage at forward_low_current"),
    "forward_low_current": Entry("A"),
    "forward_high": Entry("V", about="forward voltage at forward_high_current"),
    "forward_high_current": Entry("A"),
    "forward_middle": Entry("V", about="a third point, between them: gives the series resistance"),
    "forward_middle_current": Entry("A"),
    "reverse_current": Entry("A", about="leakage at 25 C"),
    **leakage_entries("reverse"),
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
PINS = (("anode", "cathode"),)
KINDS = (
    Kind("diode", ("D",), PINS, PINS, expand_diode, FIELDS, DATA, LAW),
    Kind(
        "led",
        ("D", "H", "LED"),
        PINS,
        PINS,
        expand_led,
        FIELDS,
        {**DATA, "band_gap": Entry("V", about="of its material, extrapolated to 0 K")},
        LAW,
    ),
    Kind(
        "schottky",
        ("D",),
        PINS,
        PINS,
        expand_schottky,
        FIELDS,
        {**DATA, "barrier": Entry("V", about="of the metal contact")},
        LAW,
    ),
    Kind(
        "clamp",
        ("D", "RV"),
        PINS,
        PINS,
        expand_clamp,
        {**FIELDS, "value": Entry("V", about="stand-off voltage")},
        {
            **DATA,
            "standoff_current": Entry("A", about="leakage at the stand-off voltage"),
            "clamping_voltage": Entry("V", about="at the pulse current; 1.6 times stand-off where none is written"),
            "pulse_current": Entry("A", about="pulse power over clamping voltage where none is written"),
            "pulse_power": Entry("W", about="within 1 ms"),
        },
        LAW,
    ),
    Kind(
        "zener",
        ("D",),
        PINS,
        PINS,
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
            "power": Entry("W", about="rated power at 25 C"),
            **THERMAL,
        },
        LAW,
    ),
)
