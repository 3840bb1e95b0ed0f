"""Generator: an ideal source with a waveform of its own. Against 0V its net is known; elsewhere it is a branch."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .kind import TEXT, Entry, Kind

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder


def expand(part: Part, build: Builder) -> None:
    """Add the source."""
    plus, minus = build.net(part.pins["plus"]), build.net(part.pins["minus"])
    if part.waveform is None:
        raise CircuitError(
            f'part {part.ref}, waveform: missing; write "waveform": {{"steps": [["0 s", "0 V"], ["1 ms", "6 V"]]}}'
        )
    if minus == build.net("0V"):
        build.generators[part.ref] = plus
    else:
        source = f"{part.ref} source"
        build.branch(plus, minus, lambda lanes: 0.0, lambda lanes: 0.0, source)
        build.generators[part.ref] = source


KIND = Kind(
    name="generator",
    letters=("G",),
    pins=(("plus", "minus"),),
    paths=(("plus", "minus"),),
    expand=expand,
    fields={"waveform": Entry(TEXT, needed=True, about="sine or steps")},
)
