"""Light front end: a light-dependent resistor that trips in the dark or in light."""

from __future__ import annotations

from ..quantity import write
from .held import HELD, held, held_setting
from .kind import OUT_PORT, QUIET_PORT, RETURN_PORT, WORD, Made, Place, Setting, StageKind
from .plan import Plan
from .sensor_divider import add_divider, trip_sequence, trip_window

GAMMA, AT = 0.7, 10.0  # slope of log R over log light and the light in lx of the resistance given, class, from memory
GAMMAS = (0.6, 0.8)  # and how far that slope spreads
SPREAD = 0.5  # of its resistance, class, from memory
KEPT = 0.12  # of half of the window
BEYOND = 10.0  # times beyond the trip point that the sequence goes, and as far on the other side at rest


def _aim(trip: float, window: float) -> float:
    """Where the trip point is put, in parts of what is asked for.

    The window counts in lux, of which there are fewer below the trip point than above it: the darkest end of the
    sensor's own spread keeps the customary margin, and a little for the threshold, above the lower limit.
    """
    least = (1.0 / window + KEPT * 0.5 * (window - 1.0 / window)) * trip / AT
    # A low sensor of slope g trips at ``least`` where (1 - spread) least^-g is what a typical one has at the aim.
    aims: list[float] = [(least**gamma / (1.0 - SPREAD)) ** (1.0 / GAMMA) for gamma in GAMMAS]
    return max(1.0, *(aim * AT / trip for aim in aims))


def _make(plan: Plan) -> Made:
    trip, spread = plan.above_zero("trip"), plan.above_zero("window")
    if spread <= 1.0:
        raise plan.refused("window", f"{plan.text('window')} is no factor above 1; write it like 2")
    dark = plan.text("active") == "dark"
    one, other, drive = add_divider(
        plan, plan.above_zero("sensor") * (trip * _aim(trip, spread) / AT) ** -GAMMA, rising=dark
    )
    rest, alarm = (trip * BEYOND, trip / BEYOND) if dark else (trip / BEYOND, trip * BEYOND)
    fields = {"value": plan.text("sensor"), "class": "ldr", "data": {"light": write(rest, "lx")}}
    ref = plan.part("R", "light_resistor", {"a": one, "b": other}, "sensor", **fields)
    event = held(plan, HELD)
    acts = tuple(
        (at, {"event": "set", "part": ref, "to": write(lux, "lx")}) for at, lux in ((0.0, alarm), (event.time, rest))
    )
    return Made(
        output=drive,
        acts=acts,
        lasts=event.lasts,
        doubts=event.doubts,
        sequences={"trip": trip_sequence(ref, write(rest, "lx"), write(alarm, "lx"))},
        requirements=(trip_window(ref, write(trip / spread, "lx"), write(trip * spread, "lx")),),
    )


KIND = StageKind(
    name="light_front_end",
    called="light",
    title="light front end",
    place=Place.SENSE,
    help=(
        "A light-dependent resistor R10 (E/10 lx)^-0.7 and a fixed resistor, so that the net passes the threshold p"
        " of what follows at the trip point: R = R_trip (1-p)/p above a sensor that trips in the dark, R_trip p/(1-p)"
        " below one that trips in light. Such sensors spread by 50 %, which moves the trip point by a factor of two:"
        " put a preset in, or ask little; it is aimed so far above the trip point that a low sensor keeps 12 % of half"
        " the window. Source: bridge at the trip point; class figures from memory."
    ),
    ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("active", WORD, "dark", "what it trips on", ("dark", "light")),
        Setting("trip", "lx", "10 lx", "light at the trip point"),
        Setting("window", "", "5", "factor by which the trip point may be off, both ways"),
        Setting("sensor", "ohm", "10k", "resistance of the sensor at 10 lx"),
        held_setting(HELD, "how long the event of the sequence lasts"),
    ),
    make=_make,
    takes=(),
)
