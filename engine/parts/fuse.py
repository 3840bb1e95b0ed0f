"""Fuse: its cold resistance. It carries what flows and does not blow: whether it would is what check 26 says."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from ..primitives.builder import inverse
from .figures import needed
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def expand(part: Part, build: Builder) -> None:
    """Add the fuse as a conductance."""
    ohms = needed(part, "resistance", "ohm", "0R1")
    if ohms.low <= 0.0:
        raise CircuitError(f'part {part.ref}, resistance: it must be above zero; write it like "0R1"')
    handle = build.conductance(
        part.pins["a"], part.pins["b"], inverse(build.column(part.ref, "resistance", *ohms.limits))
    )
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


KIND = Kind(
    name="fuse",
    letters=("F",),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "rated_current": Entry("A", about="that it carries for ever, at 25 C"),
        "melting": Entry("A2s", about="melting I2t"),
        "resistance": Entry("ohm", needed=True, about="cold"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={"rating_drift": Entry("1/K", about="by which the rated current falls above 25 C; 0.3 %/K if not written")},
)
