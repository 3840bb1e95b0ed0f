"""Darlington transistors: two transport elements with the base resistors inside the package when they are given."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from ..primitives.builder import inverse
from .figures import figure
from .kind import Entry, Kind
from .transistor import DATA, FIELDS, LAW, PINS, add_transistor

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def _expand(polarity: int) -> Callable[[Part, Builder], None]:
    def expand(part: Part, build: Builder) -> None:
        collector, base, emitter = (part.pins[pin] for pin in PINS)
        inner = f"{part.ref}/inner"
        first = add_transistor(part, build, f"{part.ref}/1", collector, base, inner, polarity, 0.5)
        second = add_transistor(part, build, f"{part.ref}/2", collector, inner, emitter, polarity, 0.5)
        power = first.power + second.power
        leak = first.base_current
        for key, net, end in (("first_base_resistor", base, inner), ("second_base_resistor", inner, emitter)):
            found = figure(part, key, "ohm")
            if found is not None and found.typical > 0.0:
                column = build.column(part.ref, key, *found.limits)
                handle = build.conductance(net, end, inverse(column))
                power += handle.power
                if net == base:
                    leak += handle.current
        bench = build.bench(part.ref)
        bench.currents["collector"] = first.current + second.current
        bench.currents["base"] = leak
        bench.currents["emitter"] = (first.current + second.current + leak).scaled(-1.0)
        bench.power = power

    return expand


KINDS = tuple(
    Kind(
        name=name,
        letters=("Q",),
        pins=(PINS,),
        paths=(("collector", "emitter"), ("base", "emitter")),
        expand=_expand(polarity),
        fields=FIELDS,
        data={
            **DATA,
            "first_base_resistor": Entry("ohm", about="inside, from the base to the inner base"),
            "second_base_resistor": Entry("ohm", about="inside, from the inner base to the emitter"),
        },
        law=LAW,
    )
    for name, polarity in (("darlington_npn", 1), ("darlington_pnp", -1))
)
