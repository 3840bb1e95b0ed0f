"""Water front end: a probe whose resistance falls when it is wet."""

from __future__ import annotations

from ..quantity import write
from .held import HELD, held, held_setting
from .kind import OUT_PORT, QUIET_PORT, RETURN_PORT, Made, Place, Setting, StageKind
from .plan import Plan
from .sensor_divider import add_divider, trip_sequence, trip_window

PROTECTION = 10e3  # ohm in series with the probe: bounds its current, against corrosion and what the lead brings
DRY = 10.0  # times the resistance at which it must not trip, at rest


def _make(plan: Plan) -> Made:
    wet, dry = plan.above_zero("wet"), plan.above_zero("dry")
    if wet >= dry:
        raise plan.refused("wet", f"{plan.text('wet')} is not below the dry {plan.text('dry')}; write a smaller one")
    # Trips in the geometric middle of wet and dry, so that both have the same factor to spare.
    one, other, drive = add_divider(plan, (wet * dry) ** 0.5, rising=False)
    tip = plan.net("tip")
    plan.resistor(PROTECTION, tip, other, "protection_resistor")
    rest = write(DRY * dry, "ohm")
    ref = plan.part("B", "probe", {"a": one, "b": tip}, "sensor", value=rest)
    event = held(plan, HELD)
    acts = tuple(
        (at, {"event": "set", "part": ref, "to": to}) for at, to in ((0.0, plan.text("wet")), (event.time, rest))
    )
    return Made(
        output=drive,
        acts=acts,
        lasts=event.lasts,
        doubts=event.doubts,
        sequences={"trip": trip_sequence(ref, rest, write(wet / DRY, "ohm"))},
        requirements=(
            trip_window(ref, plan.text("wet"), plan.text("dry")),
            {
                "check": "wet_lead",
                "of": ref,
                "sequence": "trip",
                "at": "{trips}",
                "insulation": plan.text("dry"),
            },
        ),
    )


KIND = StageKind(
    name="water_front_end",
    called="probe",
    title="water front end",
    place=Place.SENSE,
    help=(
        "A probe from the rail and a resistor to 0V, so that the net passes the threshold p of what follows where the"
        " probe has the geometric middle of its wet and dry limits: R = sqrt(R_wet R_dry) p/(1-p). What follows must"
        " take far less current than V/R_dry. Direct current corrodes the electrodes: keep it small. Source: bridge at"
        " the trip point; common practice, from memory."
    ),
    ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("wet", "ohm", "50k", "resistance at which it must trip"),
        Setting("dry", "ohm", "1M", "resistance at which it must not"),
        held_setting(HELD, "how long it is wet in the sequence"),
    ),
    make=_make,
    takes=(),
)
