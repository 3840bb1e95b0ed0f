"""Heat of a driver: a heat sink where its own case would let the junction become too hot."""

from __future__ import annotations

from ..quantity import write
from .plan import Plan, class_figure

HOTTEST = 150.0  # deg C, silicon in plastic, from memory
SPARE = 0.2  # margin of the junction's rise that is customarily asked for
INRUSH = 0.5  # of the rise that is left for what flows steadily where an inrush heats too, from memory
_SINKS = {25.0: "on a clip-on heat sink", 10.0: "on a finned heat sink"}
"""Junction to ambient in K/W, from memory."""


def cooled(plan: Plan, kind: str, current: float, volts: float, *, inrush: bool) -> tuple[str, ...]:
    """Give the transistor that was put in last the heat sink that it needs; the doubt where none of them is enough."""
    room = (1.0 - SPARE) * (HOTTEST - plan.ambient.max) * (INRUSH if inrush else 1.0)
    most = room / (current * volts)
    if class_figure(kind, plan.transistor_class(kind, current), "thermal_resistance", "K/W").high <= most:
        return ()
    for kelvin, words in _SINKS.items():
        if kelvin <= most:
            entry = {"typical": write(kelvin, "K/W"), "condition": words, "source": "memory"}
            plan.parts[-1]["data"] = {"thermal_resistance": entry}
            return ()
    watts = write(current * volts, "W", digits=2)
    return (f"junction_temperature: {watts} in the driver want less than {most:.2g} K/W; write a smaller current",)
