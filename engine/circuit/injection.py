"""Charge put into nets: which nets of a design need an injector, and the injector as a driven net behind a resistance.

An injector is a current source: a known net at I R feeds the net through R. The net's own voltage over R is all that
this differs from an ideal source by, 1 fA a volt.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from ..design.sequence import Inject
from ..primitives.builder import RETURN, Builder, constant

if TYPE_CHECKING:
    from ..design.document import Design

SIEMENS = 1e-15


def injector(net: str) -> str:
    """The driven net behind the injector of a net."""
    return f"{net} injector"


def injected(design: Design) -> tuple[str, ...]:
    """The nets into which events put charge, or strays of a stated slew, or a requirement of immunity asks for it."""
    return tuple(dict.fromkeys(net for net in _named(design) if net != RETURN))


def _named(design: Design) -> Iterator[str]:
    for sequence in design.sequences.values():
        for event in sequence.events:
            if isinstance(event, Inject):
                yield event.net
    for stray in design.strays:
        if stray.slew is not None:
            yield stray.between[1]
    for requirement in design.requirements:
        if requirement.check == "stray_immunity" and requirement.of is not None and requirement.of in design.nets:
            yield requirement.of


def add_injectors(builder: Builder, nets: Sequence[str]) -> list[str]:
    """Add an injector for every net; return the driven nets that they add."""
    for net in nets:
        place = builder.net(net)
        if injector(place) not in builder.nets:
            builder.conductance(injector(place), place, constant(SIEMENS))
            builder.injectors.append(injector(place))
    return builder.injectors
