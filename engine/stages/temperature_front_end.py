"""Temperature front end: a thermistor that trips in the cold or in the heat."""

from __future__ import annotations

import math

from ..parts.physics import REFERENCE, ZERO_CELSIUS
from ..quantity import write
from .held import HELD, held, held_setting
from .kind import OUT_PORT, QUIET_PORT, RETURN_PORT, WORD, Made, Place, Setting, StageKind
from .plan import Plan
from .sensor_divider import add_divider, trip_sequence, trip_window

BETA = 3950.0  # K, class, from memory
BEYOND = 15.0  # K beyond the trip point that the sequence goes, and as far on the other side at rest
BEFORE = -1e6  # s: an act that stands at the beginning of the sequence


def _make(plan: Plan) -> Made:
    trip = plan.number("trip")
    warm = 1.0 / (trip + ZERO_CELSIUS) - 1.0 / (REFERENCE + ZERO_CELSIUS)
    cold = plan.text("active") == "cold"
    one, other, drive = add_divider(plan, plan.above_zero("sensor") * math.exp(BETA * warm), rising=cold)
    # It follows a temperature of its own: the sensor is not where the unit is.
    where = f"{plan.stage} sensor"
    fields = {"value": plan.text("sensor"), "tolerance": "1 %", "class": "ntc", "follows": where}
    ref = plan.part("RT", "thermistor", {"a": one, "b": other}, "sensor", **fields)
    rest, alarm = (trip + BEYOND, trip - BEYOND) if cold else (trip - BEYOND, trip + BEYOND)
    event = held(plan, HELD)
    acts = tuple(
        (at, {"event": "set", "part": where, "to": write(celsius, "degC")})
        for at, celsius in ((BEFORE, rest), (0.0, alarm), (event.time, rest))
    )
    off = plan.above_zero("window")
    ends = (write(each, "degC", digits=4) for each in (rest, alarm))
    return Made(
        output=drive,
        acts=acts,
        lasts=event.lasts,
        doubts=event.doubts,
        sequences={"trip": trip_sequence(where, *ends)},
        requirements=(trip_window(ref, write(trip - off, "degC", digits=4), write(trip + off, "degC", digits=4)),),
    )


KIND = StageKind(
    name="temperature_front_end",
    called="sensor",
    title="temperature front end",
    place=Place.SENSE,
    help=(
        "A thermistor R25 exp(B (1/T - 1/298.15 K)) and a fixed resistor, so that the net passes the threshold p of"
        " what follows at the trip point: R = R_trip (1-p)/p above a sensor that trips in the cold, R_trip p/(1-p)"
        " below one that trips in the heat. 1 % of resistance is about 0.25 K at room temperature. The sensor follows"
        " a temperature of its own, set by events. Source: beta law, bridge at the trip point; class figures from"
        " memory."
    ),
    ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("active", WORD, "cold", "what it trips on", ("cold", "heat")),
        Setting("trip", "degC", "2 C", "temperature at the trip point"),
        Setting("window", "K", "6 K", "how far the trip point may be off, both ways"),
        Setting("sensor", "ohm", "10k", "resistance of the sensor at 25 C"),
        held_setting(HELD, "how long the event of the sequence lasts"),
    ),
    make=_make,
    takes=(),
)
