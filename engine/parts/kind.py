"""What every part kind declares: pins, the fields and data it reads, its columns, and the primitives it becomes."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder

FLAG = "flag"
"""The unit of an entry that is yes or no."""
TEXT = "text"
"""The unit of an entry that is no quantity: a name, a choice, a list of points."""


@dataclass(frozen=True)
class Entry:
    """One field or datum that a kind reads: its unit, whether it must be there, and what it is for."""

    unit: str
    needed: bool = False
    about: str = ""


THERMAL: Mapping[str, Entry] = {
    "thermal_resistance": Entry("K/W", about="junction to ambient; from the rated power where none is written"),
    "thermal_capacity": Entry("J/K", about="heats up with thermal_resistance as one lump, instead of thermal_time"),
    "t_j_max": Entry("degC", about="highest junction temperature; 150 C where none is written"),
    "thermal_time": Entry("s", about="pulse from which on the whole thermal resistance counts; 1 s where not written"),
}
"""What tells how hot a junction becomes; the customary figures are from memory."""


@dataclass(frozen=True)
class Kind:
    """A part kind. ``pins`` lists the accepted pin sets; ``paths`` the pin pairs that conduct direct current.

    ``fields`` are the keys of the part itself (value, tolerance, rating ...), ``data`` the keys of its ``data``
    object, ``law`` the keys of its ``law`` object. ``expand`` adds the part's primitives to a builder.
    """

    name: str
    letters: tuple[str, ...]
    pins: tuple[tuple[str, ...], ...]
    paths: tuple[tuple[str, str], ...]
    expand: Callable[[Part, Builder], None]
    fields: Mapping[str, Entry] = field(default_factory=dict)
    data: Mapping[str, Entry] = field(default_factory=dict)
    law: Mapping[str, Entry] = field(default_factory=dict)
