"""What sensor front ends share: a resistor that makes a sensor's trip point the threshold of what follows."""

from __future__ import annotations

from .kind import Drive, Sense
from .plan import Plan

THRESHOLD = 0.5  # share of the rail where what follows does not say


def add_divider(plan: Plan, ohms: float, *, rising: bool) -> tuple[str, str, Drive]:
    """The fixed resistor of a divider whose sensor has ``ohms`` at the trip point.

    ``rising``: the signal becomes high as the sensor's resistance grows, which then lies to 0V. Returns the two nets
    of the sensor and what the divider gives.
    """
    share = plan.next.threshold or THRESHOLD
    rail, out, back = plan.port("rail"), plan.port("out"), plan.port("0V")
    if rising:
        plan.resistor(ohms * (1.0 - share) / share, rail, out, "bridge_resistor", tolerance="1 %")
        nets = out, back
    else:
        plan.resistor(ohms * share / (1.0 - share), out, back, "bridge_resistor", tolerance="1 %")
        nets = rail, out
    return *nets, Drive(Sense.LEVEL, drop=(1.0 - share) * plan.rail.min, ohms=ohms * (1.0 - share))
