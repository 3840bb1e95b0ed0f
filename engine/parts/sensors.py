"""Thermistors and light-dependent resistors: resistances that follow ambient, or a quantity that events set.

A thermistor with a thermal resistance is warmer than what it follows by its own heat, with one time constant.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..kernel import layout
from ..primitives.builder import Settable
from ..primitives.signals import voltage
from .figures import Figure, figure, needed, typical, valued
from .kind import TEXT, Entry, Kind
from .levels import reading_above_zero, reading_in
from .own_heat import OWN_HEAT, own_heat
from .physics import REFERENCE, ZERO_CELSIUS
from .points import beta_of

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Handle, Laws
    from ..primitives.columns import Lanes

NTC_TOLERANCE, LIGHT_TOLERANCE = 0.05, 0.50  # customary where none is written, from memory
THERMAL_TIME = 15.0  # s, beads of a few millimetres in still air, from memory
COLDEST = -ZERO_CELSIUS
GAMMA = 0.7  # slope of log R over log E, from memory
REFERENCE_LIGHT = 10.0  # lx at which a light-dependent resistor is specified


def _follows(part: Part) -> str | None:
    """The quantity by whose name events set the part; none where it follows ambient."""
    return None if part.follows in (None, "ambient") else part.follows


def _note(part: Part, build: Builder, handle: Handle) -> None:
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


def _beta(part: Part) -> tuple[float, float, float]:
    given = part.law_limits("beta", "K")
    if given is not None and given.typical is not None:
        middle = given.typical
        return middle, middle if given.min is None else given.min, middle if given.max is None else given.max
    hot = figure(part, "hot_resistance", "ohm") if part.entry("hot_resistance") is not None else None
    if hot is None:
        return needed(part, "beta", "K", "3950 K").limits
    at = needed(part, "hot_temperature", "degC", "85 C").typical
    try:
        found = beta_of((REFERENCE, valued(part, "ohm", 0.0).typical), (at, hot.typical))
    except CircuitError as refusal:
        raise CircuitError(f"part {part.ref}, hot_resistance: {refusal}") from refusal
    return found, found, found


def expand_thermistor(part: Part, build: Builder) -> None:
    """Add a thermistor, R25 exp(B (1/T - 1/298.15 K)) (the two-point law of NTC datasheets)."""
    value = build.column(part.ref, "value", *valued(part, "ohm", NTC_TOLERANCE).limits)
    beta = build.column(part.ref, "beta", *_beta(part))
    plain = reading_in(part, "degC")

    def reading(text: str | float) -> float:
        celsius = plain(text)
        if celsius <= COLDEST:
            raise CircuitError(f"part {part.ref}: {text} lies below absolute zero; write a temperature such as 40 C")
        return celsius

    def siemens(lanes: Lanes, celsius: Floats | float) -> Floats:
        warm = np.asarray(celsius) + ZERO_CELSIUS
        return np.asarray(np.exp(lanes[beta] * (1.0 / (REFERENCE + ZERO_CELSIUS) - 1.0 / warm)) / lanes[value])

    a, b = part.pins["a"], part.pins["b"]
    heat = own_heat(part, build, THERMAL_TIME)
    if heat is None:
        handle = build.settable(part.ref, a, b, lambda lanes: lanes.ambient, siemens, reading, _follows(part))
        _note(part, build, handle)
        return
    laws: Laws = {
        "level": lambda lanes: lanes[beta] / (REFERENCE + ZERO_CELSIUS) - np.log(lanes[value]),
        "beta": lambda lanes: -lanes[beta],
        "ambient": lambda lanes: lanes.ambient + ZERO_CELSIUS,
    }
    handle = build.warm(a, b, heat, laws)
    _note(part, build, handle)
    build.bench(part.ref).rise = voltage(heat)
    build.settables[part.ref] = Settable(
        handle.index,
        lambda lanes: lanes.ambient,
        reading,
        siemens,
        _follows(part),
        layout.WARM,
        int(layout.W_AMBIENT),
        lambda lanes, celsius: np.asarray(celsius) + ZERO_CELSIUS,
    )


def expand_light_resistor(part: Part, build: Builder) -> None:
    """Add a light-dependent resistor, R10 (E/10 lx)^-gamma, never above its dark resistance where one is given."""
    if part.follows == "ambient":
        raise CircuitError(
            f"part {part.ref}, follows: the ambient is a temperature; write the name of a light level, such as 'window'"
        )
    value = build.column(part.ref, "value", *valued(part, "ohm", LIGHT_TOLERANCE).limits)
    given = part.law_limits("gamma", "")
    of_law = None if given is None else given.typical
    usual = GAMMA if of_law is None else of_law
    flat = Figure(usual, usual, usual, "class")
    gamma = build.column(part.ref, "gamma", *((figure(part, "gamma", "") if of_law is None else None) or flat).limits)
    dark = figure(part, "dark_resistance", "ohm")
    least = 0.0 if dark is None else 1.0 / dark.typical
    start = typical(part, "light", "lx", REFERENCE_LIGHT)
    if start <= 0.0:
        raise CircuitError(f'part {part.ref}, light: it must be above zero; write it like "light": "10 lx"')

    def siemens(lanes: Lanes, light: Floats | float) -> Floats:
        return np.asarray((np.asarray(light) / REFERENCE_LIGHT) ** lanes[gamma] / lanes[value] + least)

    reading = reading_above_zero(part, "lx", "10 lx")
    a, b = part.pins["a"], part.pins["b"]
    _note(part, build, build.settable(part.ref, a, b, lambda lanes: start, siemens, reading, _follows(part)))


KINDS = (
    Kind(
        "thermistor",
        ("R", "RT", "TH", "B"),
        (("a", "b"),),
        (("a", "b"),),
        expand_thermistor,
        {
            "value": Entry("ohm", needed=True, about="resistance at 25 C"),
            "tolerance": Entry("%", about="of that resistance; 5 % where none is written"),
            "follows": Entry(TEXT, about="ambient, or the name of a temperature that events set"),
            "class": Entry(TEXT, about="generic class"),
        },
        {
            "beta": Entry("K", about="B of the law R25 exp(B (1/T - 1/298.15))"),
            "hot_resistance": Entry("ohm", about="a second point, at hot_temperature, instead of beta"),
            "hot_temperature": Entry("degC"),
            **OWN_HEAT,
        },
        {"beta": Entry("K")},
    ),
    Kind(
        "light_resistor",
        ("R", "LDR", "B"),
        (("a", "b"),),
        (("a", "b"),),
        expand_light_resistor,
        {
            "value": Entry("ohm", needed=True, about="resistance at 10 lx"),
            "tolerance": Entry("%", about="of that resistance; 50 % where none is written"),
            "follows": Entry(TEXT, about="the name of a light level that events set"),
            "class": Entry(TEXT, about="generic class"),
        },
        {
            "gamma": Entry("", about="slope of log R over log light; 0.7 where none is written"),
            "light": Entry("lx", about="level before any event; 10 lx where none is written"),
            "dark_resistance": Entry("ohm", about="never above this"),
        },
        {"gamma": Entry("")},
    ),
)
