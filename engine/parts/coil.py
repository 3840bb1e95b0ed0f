"""Coil of a relay: a winding of copper with inductance, whose current moves an armature and the contacts on it.

The armature answers to the current (ampere-turns), so a pick-up voltage given at 20 C is taken as a current through the
winding's typical resistance at 20 C: with hot copper the same current needs more volts. With a thermal resistance the
copper is as hot as its own heat makes it, with one time constant.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import Guard, constant
from ..primitives.signals import voltage
from .figures import figure, needed
from .kind import TEXT, Entry, Kind
from .own_heat import OWN_HEAT, own_heat
from .physics import COPPER, ZERO_CELSIUS, copper_factor

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Law
    from ..primitives.columns import Lanes

THERMAL_TIME = 300.0  # s, small relays, from memory


def armature_of(ref: str) -> str:
    """The name under which the state of a coil's armature can be watched."""
    return f"{ref} armature"


def expand(part: Part, build: Builder) -> None:
    """Add the winding, and the guard that moves what the coil operates."""
    a, b = part.pins["a"], part.pins["b"]
    ohms = needed(part, "resistance", "ohm", "400R")
    henry = needed(part, "inductance", "H", "1 H")
    for key, found in (("resistance", ohms), ("inductance", henry)):
        if found.low <= 0.0:
            raise CircuitError(f'part {part.ref}, {key}: it must be above zero; write it like "{key}": "400R"')
    resistance = build.column(part.ref, "resistance", *ohms.limits)
    inductance = build.column(part.ref, "inductance", *henry.limits)

    def hot(lanes: Lanes) -> Floats:
        return np.asarray(lanes[resistance] * copper_factor(lanes.ambient))

    bench = build.bench(part.ref)
    heat = own_heat(part, build, THERMAL_TIME)
    if heat is None:
        winding = build.branch(a, b, lambda lanes: lanes[inductance], hot)
    else:
        inner = f"{part.ref}/winding"
        winding = build.branch(a, inner, lambda lanes: lanes[inductance], constant(0.0))
        copper = build.warm(
            inner,
            b,
            heat,
            {
                "level": lambda lanes: np.log((COPPER + 20.0) / lanes[resistance]),
                "power": constant(-1.0),
                "offset": constant(ZERO_CELSIUS - COPPER),
                "ambient": lambda lanes: lanes.ambient + ZERO_CELSIUS,
            },
        )
        bench.power, bench.rise = copper.power, voltage(heat)
    bench.currents["a"] = winding.current
    bench.draw = lambda lanes, volts: volts / hot(lanes)
    farads = figure(part, "capacitance", "F")
    if farads is not None:
        capacitance = build.column(part.ref, "capacitance", *farads.limits)
        build.capacitance(a, b, lambda lanes: lanes[capacitance])
    pick_up, drop_out = needed(part, "pick_up", "V", "9 V"), figure(part, "drop_out", "V")
    if drop_out is None:
        raise CircuitError(f'part {part.ref}, drop_out: missing; write it like "drop_out": "1.2 V"')
    if drop_out.high >= pick_up.low:
        raise CircuitError(
            f"part {part.ref}, drop_out: {drop_out.high:g} V is not below the pick-up of {pick_up.low:g} V; "
            "a coil lets go at less than it pulls in with"
        )
    bench.on = (a, b, pick_up.typical)
    bench.armature = armature_of(part.ref)

    def amperes(datum: str) -> Law:
        key = build.column(part.ref, datum, *(pick_up if datum == "pick_up" else drop_out).limits)
        return lambda lanes: np.asarray(lanes[key] / ohms.typical)

    def seconds(datum: str, otherwise: str | None = None) -> Law:
        found = figure(part, datum, "s")
        if found is None:
            return constant(0.0) if otherwise is None else seconds(otherwise)
        if (part.ref, datum) in {(column.ref, column.datum) for column in build.columns}:
            return lambda lanes: lanes[part.ref, datum]
        key = build.column(part.ref, datum, *found.limits)
        return lambda lanes: lanes[key]

    build.guards[armature_of(part.ref)] = Guard(
        armature_of(part.ref),
        (a, b),
        winding.index,
        on=amperes("pick_up"),
        off=amperes("drop_out"),
        on_delay=seconds("armature_delay"),
        off_delay=seconds("release_delay", "armature_delay"),
    )


KIND = Kind(
    name="coil",
    letters=("K",),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "inductance": Entry("H", needed=True, about="of the winding"),
        "resistance": Entry("ohm", needed=True, about="of the winding at 20 C"),
        "capacitance": Entry("F", about="across the winding"),
        "pick_up": Entry("V", needed=True, about="at which it pulls in, at 20 C"),
        "drop_out": Entry("V", needed=True, about="at which it lets go, at 20 C"),
        "armature_delay": Entry("s", about="from the pick-up current to the contacts' move"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={
        "release_delay": Entry(
            "s", about="from the drop-out current to the contacts' move; the armature's if not written"
        ),
        "v_max": Entry("V", about="largest lasting voltage"),
        **OWN_HEAT,
    },
)
