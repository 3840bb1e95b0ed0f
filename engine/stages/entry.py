"""Supply entry: a diode against reversal for all that follows, and an RC filter for the small stages."""

from __future__ import annotations

from .kind import RETURN_PORT, WORD, Made, Place, Port, Setting, StageKind, Wire
from .plan import RETURN, Plan

SPARE = 3.0  # times its drop that the filter resistor is rated for: small stages draw more while they switch
_DIODES = {"silicon": ("diode", "1 A rectifier", 0.85), "schottky": ("schottky", "1 A Schottky", 0.45)}
"""Kind, class and largest forward voltage in V at 1 A, cold (from memory)."""


def _make(plan: Plan) -> Made:
    name = plan.text("diode")
    rail, quiet = plan.port("feed"), plan.port("quiet")
    lost = 0.0
    if name != "none":
        kind, generic, lost = _DIODES[name]
        plan.diode(plan.port("feed"), plan.port("rail"), "reverse_diode", kind=kind, name=generic)
        rail = plan.port("rail")
    current, drop, slew = plan.above_zero("small_current"), plan.above_zero("drop"), plan.above_zero("slew")
    ohms = plan.resistor(drop / current, rail, quiet, "filter_resistor", snap="down", volts=SPARE * drop)
    farads = plan.capacitor(plan.supply.max / (ohms * slew), quiet, RETURN, "filter_capacitor", snap="up")
    return Made(rail_drop=lost, quiet_drop=lost + ohms * current, settles=5.0 * ohms * farads)


KIND = StageKind(
    name="entry",
    title="supply entry",
    place=Place.FEED,
    help=(
        "A series diode keeps a reversed supply away from all that follows; loads are fed right behind it, small"
        " stages behind an RC filter, so that neither a fast connection nor the surge of the load reaches them. R ="
        " drop / I of the small stages; C = V_max / (R x slew), because an RC filter lets a step of V through no"
        " faster than V/(RC). Source: common practice; RC step response."
    ),
    ports=(
        Port("feed", Wire.RAIL, "the supply as it arrives"),
        Port("rail", Wire.NEW_RAIL, "the rail of loads, behind the diode"),
        Port("quiet", Wire.NEW_QUIET, "the rail of small stages, behind the filter"),
        RETURN_PORT,
    ),
    settings=(
        Setting("diode", WORD, "silicon", "against reversal: a rectifier, or one that drops less", (*_DIODES, "none")),
        Setting("small_current", "A", "3 mA", "what all small stages draw together"),
        Setting("drop", "V", "0.3 V", "what the filter may lose at that current"),
        Setting("slew", "V/s", "5 V/ms", "how fast the filtered rail may rise when the supply is snapped on"),
    ),
    make=_make,
    takes=(),
)
