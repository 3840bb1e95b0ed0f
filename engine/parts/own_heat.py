"""Parts that heat themselves: a thermal resistance to their surroundings and one time constant."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import CircuitError
from .figures import figure, typical
from .kind import Entry

if TYPE_CHECKING:
    from ..design.document import Part
    from ..primitives.builder import Builder

OWN_HEAT = {
    "thermal_resistance": Entry("K/W", about="to the surroundings; it stays as warm as they are if not written"),
    "thermal_time": Entry("s", about="in which its own heat comes to 63 % of what it will be"),
}


def own_heat(part: Part, build: Builder, customary: float) -> str | None:
    """Add the temperature of a part that says its thermal resistance, and return its name; None where it says none.

    ``customary`` is the time constant in s where none is written.
    """
    found = figure(part, "thermal_resistance", "K/W")
    if found is None:
        return None
    lasts = typical(part, "thermal_time", "s", customary)
    for key, value, example in (("thermal_resistance", found.low, "60 K/W"), ("thermal_time", lasts, "5 min")):
        if value <= 0.0:
            raise CircuitError(f'part {part.ref}, {key}: it must be above zero; write it like "{key}": "{example}"')
    kelvin = build.column(part.ref, "thermal_resistance", *found.limits)
    return build.temperature(part.ref, lambda lanes: 1.0 / lanes[kelvin], lambda lanes: lasts / lanes[kelvin])
