"""Which bases a capacitor may step beyond the rails, for the hand formula of reverse base-emitter voltages."""

from __future__ import annotations

from ..design.part import Part
from ..primitives.builder import RETURN, SUPPLY_NET
from .view import View

FEEDS = ("fuse", "reverse_diode", "filter_resistor", "filter_capacitor", "battery_diode")
"""Roles of the parts whose nets are rails too."""
LEADING = ("resistor", "preset", "diode", "schottky", "zener", "led", "contact", "lead", "fuse", "inductor")


def rails(view: View) -> frozenset[str]:
    """0V, the supply and what the feed leads on from it: nets that nothing steps."""
    fed = (net for _, _, part in view.with_role(*FEEDS) for net in part.pins.values())
    return frozenset((RETURN, SUPPLY_NET, *fed))


def stepped(view: View, part: Part) -> bool:
    """Whether a capacitor with both ends off the rails leads to a base, directly or through resistors and the like, or
    the emitter stands on no rail: then up to the whole supply may reverse the junction. Else no net lies beyond it."""
    held = rails(view)
    if part.pins["emitter"] not in held:
        return True
    reached, new = {part.pins["base"]}, [part.pins["base"]]
    while new:
        net = new.pop()
        for _, other in view.parts_of(*LEADING):
            ends = set(other.pins.values())
            if net in ends:
                found = ends - reached - held
                reached |= found
                new += found
    floating = (set(c.pins.values()) for _, c in view.parts_of("capacitor") if not held & set(c.pins.values()))
    return any(ends & reached for ends in floating)
