"""Fuse: its cold resistance, and a wire in it that melts where it is told at which I2t.

The wire's rise is taken in parts of what melts it. Quick pulses melt it at the stated I2t = heat capacity x rise / R;
for long it bears 1.77 times its rated current (IEC 60127-2 wants 1.5 times carried for an hour and 2.1 times ended
within half an hour, from memory; the middle of both). One time constant joins them, so that it melts sooner than a
slow fuse at small overloads: at 2.1 times within a second where the real one may take minutes. A fuse that has melted
stays open. It is computed at its cold resistance, whose growth is part of the stated figure.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..kernel import layout
from ..primitives.builder import Guard, Operated, constant, inverse
from .figures import Figure, figure, needed
from .kind import TEXT, Entry, Kind
from .physics import ZERO_CELSIUS

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder, Handle

MELTS = 1000.0  # K above its surroundings, so to say: only parts of it count
BEARS = (1.5 * 2.1) ** 0.5  # times its rated current
OPEN = 1e-9  # S
NEVER = -1e9  # K, to which it would have to cool to close again


def blown(ref: str) -> str:
    """The name under which it can be watched whether a fuse has melted: 1 where it has."""
    return f"{ref} blown"


def expand(part: Part, build: Builder) -> None:
    """Add the fuse as a conductance, one that melts where its rated current and I2t are given."""
    ohms = needed(part, "resistance", "ohm", "0R1")
    if ohms.low <= 0.0:
        raise CircuitError(f'part {part.ref}, resistance: it must be above zero; write it like "0R1"')
    resistance = build.column(part.ref, "resistance", *ohms.limits)
    rated, melting = figure(part, "rated_current", "A"), figure(part, "melting", "A2s")
    if rated is None or melting is None:
        handle = build.conductance(part.pins["a"], part.pins["b"], inverse(resistance))
    else:
        for key, found in (("rated_current", rated), ("melting", melting)):
            if found.low <= 0.0:
                raise CircuitError(f"part {part.ref}, {key}: it must be above zero")
        handle = _melting(part, build, resistance, rated.typical, melting)
    bench = build.bench(part.ref)
    bench.currents["a"] = handle.current
    bench.power = handle.power


def _melting(part: Part, build: Builder, resistance: tuple[str, str], rated: float, melting: Figure) -> Handle:
    pulse = build.column(part.ref, "melting", *melting.limits)
    wire = build.temperature(
        part.ref,
        lambda lanes: (BEARS * rated) ** 2 * lanes[resistance] / MELTS,
        lambda lanes: lanes[pulse] * lanes[resistance] / MELTS,
    )
    handle = build.warm(
        part.pins["a"],
        part.pins["b"],
        wire,
        {"level": lambda lanes: -np.log(lanes[resistance]), "ambient": lambda lanes: lanes.ambient + ZERO_CELSIUS},
    )
    build.hidden.add(blown(part.ref))
    build.guards[blown(part.ref)] = Guard(
        blown(part.ref),
        (wire, "0V"),
        None,
        on=constant(MELTS),
        off=constant(NEVER),
        on_delay=constant(0.0),
        off_delay=constant(0.0),
        either_sign=False,
    )
    build.operated.append(
        Operated(
            handle.index,
            blown(part.ref),
            False,
            lambda lanes: -np.log(lanes[resistance]),
            constant(float(np.log(OPEN))),
            constant(0.0),
            family=layout.WARM,
        )
    )
    return handle


KIND = Kind(
    name="fuse",
    letters=("F",),
    pins=(("a", "b"),),
    paths=(("a", "b"),),
    expand=expand,
    fields={
        "rated_current": Entry("A", about="that it carries for ever, at 25 C"),
        "melting": Entry("A2s", about="melting I2t; with the rated current it blows"),
        "resistance": Entry("ohm", needed=True, about="cold"),
        "class": Entry(TEXT, about="generic class"),
    },
    data={"rating_drift": Entry("1/K", about="by which the rated current falls above 25 C; 0.3 %/K if not written")},
)
