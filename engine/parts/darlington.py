"""Darlington transistors: two transport elements with the base resistors inside the package when they are given."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from ..primitives.builder import Bench, inverse
from .figures import figure
from .kind import Entry, Kind
from .transistor import DATA, FIELDS, LAW, PINS, add_transistor, note_laws
from .transistor_figures import gain_given

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Laws
    from ..primitives.columns import Lanes


def _note_laws(bench: Bench, first: Laws, second: Laws) -> None:
    """The pair's gain b1 + b2 + b1 b2 and its base-emitter voltage, the sum of both."""
    pair = Bench(), Bench()
    for own, laws in zip(pair, (first, second), strict=True):
        note_laws(own, laws)
    one, two = pair

    def gain(lanes: Lanes) -> Floats:
        assert one.gain is not None
        assert two.gain is not None
        b1, b2 = np.asarray(one.gain(lanes)), np.asarray(two.gain(lanes))
        return np.asarray(b1 + b2 + b1 * b2)

    def base_voltage(lanes: Lanes, current: Floats | float) -> Floats:
        assert one.base_voltage is not None
        assert two.base_voltage is not None
        assert two.gain is not None
        return two.base_voltage(lanes, current) + one.base_voltage(lanes, current / float(np.mean(two.gain(lanes))))

    def gain_at(lanes: Lanes, current: Floats) -> Floats:
        assert one.gain_at is not None
        assert two.gain_at is not None
        b2 = two.gain_at(lanes, current)
        b1 = one.gain_at(lanes, current / b2)
        return np.asarray(b1 + b2 + b1 * b2)

    bench.gain_at = gain_at
    bench.gain, bench.base_voltage, bench.leakage = gain, base_voltage, one.leakage


def _expand(polarity: int) -> Callable[[Part, Builder], None]:
    def expand(part: Part, build: Builder) -> None:
        collector, base, emitter = (part.pins[pin] for pin in PINS)
        inner = f"{part.ref}/inner"
        first = add_transistor(part, build, f"{part.ref}/1", collector, base, inner, polarity, 0.5)
        second = add_transistor(part, build, f"{part.ref}/2", collector, inner, emitter, polarity, 0.5)
        power = first.power + second.power
        leak = first.base
        for key, net, end in (("first_base_resistor", base, inner), ("second_base_resistor", inner, emitter)):
            found = figure(part, key, "ohm")
            if found is not None and found.typical > 0.0:
                column = build.column(part.ref, key, *found.limits)
                handle = build.conductance(net, end, inverse(column))
                power += handle.power
                if net == base:
                    leak += handle.current
        bench = build.bench(part.ref)
        bench.currents["collector"] = first.collector + second.collector
        bench.currents["base"] = leak
        bench.currents["emitter"] = (first.collector + second.collector + leak).scaled(-1.0)
        bench.power = power
        _note_laws(bench, first.laws, second.laws)
        bench.gain_given = gain_given(part)

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
