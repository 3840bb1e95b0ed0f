"""Contacts and probes: conductances that the events of a sequence set."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import typical, valued
from .kind import TEXT, Entry, Kind
from .levels import ohmic, reading_above_zero

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder, Law

CLOSED = 0.1  # ohm, from memory
INSULATION = 1e9  # ohm, from memory


def expand_contact(part: Part, build: Builder) -> None:
    """Add a contact: open at the start, closed when it is a break contact."""
    closed = 1.0 / typical(part, "resistance", "ohm", CLOSED)
    insulated = 1.0 / typical(part, "insulation", "ohm", INSULATION)

    def reading(state: str) -> Law:
        if state not in ("open", "closed"):
            raise CircuitError(f"part {part.ref}: a contact cannot be set to '{state}'; use the events close and open")
        return lambda lanes: closed if state == "closed" else insulated

    start = reading("closed" if part.form == "break" else "open")
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
