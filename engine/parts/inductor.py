"""Inductor: one branch with inductance and winding resistance, and the winding's capacitance across it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from .figures import figure, needed
from .kind import TEXT, Entry, Kind
from .physics import copper_factor

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def expand(part: Part, build: Builder) -> None:
    """Add the winding; its resistance is given at 20 C and follows ambient as copper does."""
    a, b = part.pins["a"], part.pins["b"]
    henry = needed(part, "inductance", "H", "1 mH")
    if henry.low <= 0.0:
        raise CircuitError(f'part {part.ref}, inductance: it must be above zero; write it like "inductance": "1 mH"')
    inductance = build.column(part.ref, "inductance", *henry.limits)
    ohms = figure(part, "resistance", "ohm")
    bench = build.bench(part.ref)
    if ohms is None:
        coil = build.branch(a, b, lambda lanes: lanes[inductance], lambda lanes: 0.0)
    else:
        resistance = build.column(part.ref, "resistance", *ohms.limits)
        coil = build.branch(
            a,
            b,
            lambda lanes: lanes[inductance],
            lambda lanes: np.asarray(lanes[resistance] * copper_factor(lanes.ambient)),
        )
    bench.currents["a"] = coil.current
    farads = figure(part, "capacitance", "F")
    if farads is not None:
        capacitance = build.column(part.ref, "capacitance", *farads.limits)
        build.capacitance(a, b, lambda lanes: lanes[capacitance])


KIND = Kind(
    name="inductor",
    letters=("L",),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "inductance": Entry("H", about="of the winding"),
        "resistance": Entry("ohm", about="of the winding at 20 C; none where it is not written"),
        "capacitance": Entry("F", about="across the winding"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={"i_max": Entry("A", about="rated current")},
)
