"""RC filter: a quiet rail for the small stages that follow."""

from __future__ import annotations

from ..quantity import write
from .entry import SPARE, add_filter_capacitor
from .kind import RETURN_PORT, Json, Made, Place, Port, Setting, StageKind, Wire
from .plan import Plan


def _make(plan: Plan) -> Made:
    current, drop = plan.above_zero("small_current"), plan.above_zero("drop")
    ohms = plan.resistor(
        drop / current, plan.port("feed"), plan.port("quiet"), "filter_resistor", snap="down", volts=SPARE * drop
    )
    bridged = current * plan.above_zero("bridge") / (plan.share("sag") * plan.rail.min)
    slewed = plan.supply.max / (ohms * plan.above_zero("slew"))
    farads = add_filter_capacitor(plan, max(bridged, slewed), plan.port("quiet"))
    settles = 5.0 * ohms * farads
    begins = max(1.0, settles)
    dip: Json = {
        "events": [
            {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
            {"at": write(begins, "s"), "event": "dip", "to": "0 V", "for": plan.text("bridge")},
        ],
        "ends": write(begins + 2.0, "s"),
        "moments": {"standby": write(0.9 * begins, "s")},
    }
    return Made(quiet_drop=ohms * current, settles=settles, sequences={"dip": dip})


KIND = StageKind(
    name="rc_filter",
    called="filter",
    title="RC filter",
    place=Place.FEED,
    help=(
        "A resistor and a capacitor between the rail and the small stages. R = drop / I. C is the larger of two:"
        " V_max / (R x slew), so that a supply that is snapped on rises no faster behind it, and I t / dV, so that it"
        " bridges a dip of length t. It does so only for stages behind it, and only where nothing drains it backwards:"
        " a diode before it (supply entry) keeps the charge. Source: RC step response; capacitor charge."
    ),
    ports=(
        Port("feed", Wire.QUIET, "the rail before it"),
        Port("quiet", Wire.NEW_QUIET, "the rail of small stages, behind it"),
        RETURN_PORT,
    ),
    settings=(
        Setting("small_current", "A", "3 mA", "what all small stages draw together"),
        Setting("drop", "V", "0.3 V", "what the filter may lose at that current"),
        Setting("slew", "V/s", "5 V/ms", "how fast the filtered rail may rise when the supply is snapped on"),
        Setting("bridge", "s", "10 ms", "longest dip that it should bridge"),
        Setting("sag", "", "0.2", "share of the rail that it may lose meanwhile"),
    ),
    make=_make,
    takes=(),
)
