"""Supply entry: a diode against reversal for all that follows, and an RC filter for the small stages."""

from __future__ import annotations

import math

from ..quantity import write
from .kind import RETURN_PORT, WORD, Made, Place, Port, Setting, StageKind, Wire
from .plan import LARGEST_FILM, RETURN, Plan

RIPPLE = 10e-3  # A at 1 uF, growing with the root of the capacitance: what an electrolytic bears, from memory
LOSS, LOSS_AT = 0.15, 100.0  # tan d and the frequency in Hz that it is given at, class, from memory
SPARE = 3.0  # times its drop that the filter resistor is rated for: small stages draw more while they switch
_DIODES = {"silicon": ("diode", "1 A rectifier", 0.85), "schottky": ("schottky", "1 A Schottky", 0.45)}
"""Kind, class and largest forward voltage in V at 1 A, cold (from memory)."""


def add_filter_capacitor(plan: Plan, farads: float, net: str) -> float:
    """The capacitor of a filter with its ripple rating and series resistance; returns its value in farad."""
    value = plan.capacitor(farads, net, RETURN, "filter_capacitor", snap="up")
    if value > LARGEST_FILM:
        ripple, series = RIPPLE * (value / 1e-6) ** 0.5, LOSS / (2.0 * math.pi * LOSS_AT * value)
        plan.parts[-1] |= {
            "ripple_rating": {"typical": write(ripple, "A", digits=2), "source": "memory"},
            "series_resistance": {"typical": write(series, "ohm", digits=2), "source": "memory"},
        }
    return value


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
    farads = add_filter_capacitor(plan, plan.supply.max / (ohms * slew), quiet)
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
