"""Filament lamps: tungsten that its own heat makes 10 to 14 times as resistive.

R ~ T^1.2 (a fit to the resistivity of tungsten, Jones, Langmuir, Gen. Electr. Rev. 30 (1927) 310; exponent from memory)
and radiation s (T^4 - T_a^4) (Stefan, Boltzmann). The rated point gives the hot resistance and s, the inrush or the
cold ratio the hot temperature, and the time of the inrush the one heat capacity. In the steady state the current goes
as V^(1 - 2.4/5.2) = V^0.54; tables of lamps say 0.55.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import constant
from ..primitives.signals import voltage
from .figures import Figure, figure, needed
from .kind import TEXT, Entry, Kind
from .physics import REFERENCE, ZERO_CELSIUS

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Law
    from ..primitives.columns import Lanes

EXPONENT = 1.2
COLD = REFERENCE + ZERO_CELSIUS  # K at which a lamp is cold
FALLEN = 2.0  # times the rated current to which an inrush has fallen when its time is over
MELTS = (3695.0 / COLD) ** EXPONENT  # cold ratio at which tungsten would melt, 20
INRUSH_TIME = 20e-3  # s, small lamps, from memory
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(24)


def hot_temperature(ratio: Floats) -> Floats:
    """Temperature in K at the rated point of a filament whose resistance is ``ratio`` times that at 25 C."""
    return np.asarray(COLD * ratio ** (1.0 / EXPONENT))


def heating(ratio: Floats) -> Floats:
    """Seconds times W/J/K until the current has fallen to twice the rated one, at rated voltage and from cold.

    Per watt of rated power and per J/K: the integral of dT / (V^2/R(T) - radiated), in K.
    """
    hot = hot_temperature(ratio)
    end = hot * FALLEN ** (-1.0 / EXPONENT)
    t = COLD + (end - COLD)[..., None] * 0.5 * (_NODES + 1.0)
    hot = hot[..., None]
    net = (hot / t) ** EXPONENT - (t**4 - COLD**4) / (hot**4 - COLD**4)
    return np.asarray(0.5 * (end - COLD) * (_WEIGHTS / net).sum(axis=-1))


def _ratio(part: Part, build: Builder, current: tuple[str, str]) -> Law:
    """Hot over cold resistance: from the inrush where it is given."""
    surge = figure(part, "surge", "A")
    if surge is not None:
        key, rated = build.column(part.ref, "surge", *surge.limits), needed(part, "current", "A", "150 mA")
        bounds, remedy = (surge.low / rated.high, surge.high / rated.low), "surge"
        law: Law = lambda lanes: np.asarray(lanes[key] / lanes[current])  # noqa: E731
    else:
        cold = needed(part, "cold_ratio", "", "12")
        key = build.column(part.ref, "cold_ratio", *cold.limits)
        bounds, remedy = (cold.low, cold.high), "cold_ratio"
        law = lambda lanes: lanes[key]  # noqa: E731
    if not FALLEN < bounds[0] <= bounds[1] < MELTS:
        raise CircuitError(
            f"part {part.ref}, {remedy}: a cold filament draws 10 to 14 times its rated current, this one "
            f"{bounds[0]:.3g} .. {bounds[1]:.3g} times; write other limits"
        )
    return law


def expand(part: Part, build: Builder) -> None:
    """Add the filament and its temperature."""
    a, b = part.pins["a"], part.pins["b"]
    current = needed(part, "current", "A", "150 mA")
    rated = figure(part, "rated_voltage", "V")
    volts = build.supply_nominal if rated is None else rated.typical
    if volts <= 0.0 or current.low <= 0.0:
        missing = "rated_voltage" if volts <= 0.0 else "current"
        raise CircuitError(f'part {part.ref}, {missing}: it must be above zero; write it like "{missing}": "12"')
    key = build.column(part.ref, "current", *current.limits)
    ratio = _ratio(part, build, key)
    lasts = figure(part, "inrush_time", "s") or Figure(INRUSH_TIME, INRUSH_TIME, INRUSH_TIME, "class")
    if lasts.low <= 0.0:
        raise CircuitError(f'part {part.ref}, inrush_time: it must be above zero; write it like "20 ms"')

    time = build.column(part.ref, "inrush_time", *lasts.limits)

    def hot(lanes: Lanes) -> Floats:
        return hot_temperature(np.asarray(ratio(lanes)))

    def capacity(lanes: Lanes) -> Floats:
        return np.asarray(lanes[time] * volts * lanes[key] / heating(np.asarray(ratio(lanes))))

    temperature = build.temperature(part.ref, constant(0.0), capacity)
    handle = build.warm(
        a,
        b,
        temperature,
        {
            "level": lambda lanes: np.log(lanes[key] / volts) + EXPONENT * np.log(hot(lanes)),
            "power": constant(-EXPONENT),
            "ambient": lambda lanes: lanes.ambient + ZERO_CELSIUS,
            "radiation": lambda lanes: volts * lanes[key] / (hot(lanes) ** 4 - COLD**4),
        },
    )
    steady = 1.0 - 2.0 * EXPONENT / (4.0 + EXPONENT)

    def draw(lanes: Lanes, across: Floats) -> Floats:
        return np.asarray(lanes[key] * np.sign(across) * (np.abs(across) / volts) ** steady)

    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power
    bench.rise = voltage(temperature)
    bench.draw = draw
    bench.inrush = lambda lanes, across: np.asarray(lanes[key] / volts * ratio(lanes) * across)
    least = figure(part, "operating_minimum", "V")
    if least is not None:
        bench.on = (a, b, least.typical)


KIND = Kind(
    name="lamp",
    letters=("E", "H", "LA"),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "current": Entry("A", needed=True, about="at the rated voltage, hot"),
        "operating_minimum": Entry("V", about="the lamp counts as on above it"),
        "surge": Entry("A", about="inrush at the rated voltage, cold; the cold ratio times the current if not written"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={
        "rated_voltage": Entry("V", about="voltage of the current figure; nominal supply where none is written"),
        "cold_ratio": Entry("", about="hot over cold resistance, 10 .. 14"),
        "inrush_time": Entry(
            "s", about="until the inrush has fallen to twice the rated current; 20 ms where none is written"
        ),
    },
)
