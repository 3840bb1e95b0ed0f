"""Contacts and probes: conductances that the events of a sequence set."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..design.part import Bounce
from ..errors import CircuitError
from ..primitives.builder import Operated, constant
from ..quantity import read
from .coil import armature_of
from .figures import typical, valued
from .kind import TEXT, Entry, Kind
from .levels import ohmic, reading_above_zero

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder, Law

CLOSED = 0.1  # ohm, from memory
INSULATION = 1e9  # ohm, from memory
USUAL_BOUNCES = 3  # times that a contact opens again where only the length of its bounce is given, from memory


def expand_contact(part: Part, build: Builder) -> None:
    """Add a contact: open at the start, closed when it is a break contact; moved by events or by a coil."""
    closed = 1.0 / typical(part, "resistance", "ohm", CLOSED)
    insulated = 1.0 / typical(part, "insulation", "ohm", INSULATION)

    def reading(state: str) -> Law:
        if state not in ("open", "closed"):
            raise CircuitError(f"part {part.ref}: a contact cannot be set to '{state}'; use the events close and open")
        return lambda lanes: closed if state == "closed" else insulated

    start = reading("closed" if part.form == "break" else "open")
    if part.operated_by is not None:
        handle = build.conductance(part.pins["a"], part.pins["b"], start)
        bounce = part.bounce
        lasting = read(bounce, "s") if isinstance(bounce, str) else 0.0
        times = USUAL_BOUNCES if lasting > 0.0 else 0
        if isinstance(bounce, Bounce):
            lasting, times = read(bounce.for_, "s"), bounce.times
        build.operated.append(
            Operated(
                handle.index,
                armature_of(part.operated_by),
                part.form != "break",
                reading("closed"),
                reading("open"),
                constant(typical(part, "delay", "s", 0.0)),
                lasting,
                times,
            )
        )
        build.bench(part.ref).currents["a"] = handle.current
        return
    handle = build.switch(part.ref, part.pins["a"], part.pins["b"], start, reading)
    build.bench(part.ref).currents["a"] = handle.current


def expand_probe(part: Part, build: Builder) -> None:
    """Add a probe: a resistance that events set or ramp."""
    key = build.column(part.ref, "value", *valued(part, "ohm", 0.0).limits)

    handle = build.settable(
        part.ref,
        part.pins["a"],
        part.pins["b"],
        lambda lanes: lanes[key],
        ohmic,
        reading_above_zero(part, "ohm", "200k"),
        part.follows,
    )
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


KINDS = (
    Kind(
        "contact",
        ("S", "B", "F", "K"),
        (("a", "b"),),
        (("a", "b"),),
        expand_contact,
        {
            "resistance": Entry("ohm", about="when closed"),
            "form": Entry(TEXT, about="make or break"),
            "operated_by": Entry(TEXT, about="the coil that moves it"),
            "delay": Entry("s", about="from the armature's move to its own"),
            "bounce": Entry("s", about="how long it bounces when it closes, alone or with a count of openings"),
            "class": Entry(TEXT, about="generic class"),
        },
        {
            "insulation": Entry("ohm", about="when open"),
            "minimum_current": Entry("A", about="least current that keeps it clean, when closed"),
        },
    ),
    Kind(
        "probe",
        ("B", "S", "X"),
        (("a", "b"),),
        (("a", "b"),),
        expand_probe,
        {
            "value": Entry("ohm", needed=True, about="resistance before any event"),
            "tolerance": Entry("%", about="of that resistance"),
            "follows": Entry(TEXT, about="a name by which events set all probes that follow it"),
        },
    ),
)
