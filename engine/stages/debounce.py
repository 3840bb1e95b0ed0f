"""Debounce: an RC low-pass between the longest bounce and the shortest true event."""

from __future__ import annotations

import math

from .kind import IN_PORT, OUT_PORT, RETURN_PORT, Drive, Intake, Json, Made, Place, Sense, Setting, StageKind
from .plan import RETURN, Plan

THRESHOLD = 0.5  # of the rail, at which what follows is taken to act where it does not say
MOST = 100e3  # ohm


def _make(plan: Plan) -> Made:
    bounce, event = plan.above_zero("bounce"), plan.above_zero("event")
    if bounce >= event:
        raise plan.refused("event", f"{plan.text('event')} is not longer than the bounce of {plan.text('bounce')}")
    share = plan.next.threshold or THRESHOLD
    # Both sides get the same factor: the time at which it acts is the geometric middle of bounce and event.
    tau = math.sqrt(bounce * event) / math.log(1.0 / (1.0 - share))
    volts = plan.arriving
    # What follows draws its current through the resistor, which may lose a tenth of the rail.
    most = MOST if plan.next.current <= 0.0 else min(MOST, 0.1 * volts / plan.next.current)
    ohms = plan.resistor(most, plan.port("in"), plan.port("out"), "debounce_resistor", snap="down")
    plan.capacitor(tau / (ohms + plan.arriving_ohms), plan.port("out"), RETURN, "debounce_capacitor")
    before = Drive(Sense.LEVEL) if plan.drive is None else plan.drive
    asked: tuple[Json, ...] = (
        {"check": "contact_bounce", "of": "{contact}", "max": plan.text("bounce")},
        {"check": "acceptance", "of": "{contact}", "min": plan.text("event")},
    )
    output = Drive(Sense.LEVEL, before.drop, before.ohms + ohms, slow=True)
    return Made(output=output, settles=5.0 * tau, lasts=5.0 * tau, requirements=asked)


KIND = StageKind(
    name="debounce",
    title="debounce",
    place=Place.SHAPE,
    help=(
        "An RC low-pass that sees through the bounce of a contact and still takes the shortest true event. What follows"
        " acts at a share p of the rail, after tau ln(1/(1-p)); this time is set to the geometric middle of the longest"
        " bounce and the shortest event, so that both have the same factor to spare. Source: RC step response; common"
        " practice (20 to 100 ms)."
    ),
    ports=(IN_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("bounce", "s", "5 ms", "longest bounce that must not count"),
        Setting("event", "s", "200 ms", "shortest event that must count"),
    ),
    make=_make,
    intake=lambda plan: Intake(plan.next.current, plan.next.threshold),
    supply_starts=False,
)
