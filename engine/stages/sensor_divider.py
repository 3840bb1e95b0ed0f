"""What sensor front ends share: a resistor that makes a sensor's trip point the threshold of what follows."""

from __future__ import annotations

from ..quantity import write
from .kind import Drive, Json, Sense
from .plan import Plan

RAMP = 5.0  # s of the way to the trip point and beyond: slow against a trigger
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
    return *nets, Drive(Sense.LEVEL, drop=(1.0 - share) * plan.rail.min, ohms=ohms * (1.0 - share), slow=True)


def trip_sequence(subject: str, rest: str, beyond: str) -> Json:
    """A sequence that brings a sensor slowly from rest beyond its trip point."""
    return {
        "events": [
            {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
            {"at": "0 s", "event": "set", "part": subject, "to": rest},
            {"at": "1 s", "event": "ramp", "part": subject, "to": beyond, "for": write(RAMP, "s")},
        ],
        "ends": write(2.0 + RAMP, "s"),
        "moments": {"standby": "900 ms"},
    }


def trip_window(subject: str, low: str, high: str) -> Json:
    """The requirement that a sensor trips between two levels of its own quantity."""
    return {"check": "trip_window", "of": subject, "sequence": "trip", "at": "{trips}", "min": low, "max": high}
