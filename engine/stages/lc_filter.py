"""LC filter: a quiet rail for stages that draw more than an RC filter could bear."""

from __future__ import annotations

import math

from .entry import LOSS, LOSS_AT, add_filter_capacitor
from .kind import RETURN_PORT, Made, Place, Port, Setting, StageKind, Wire
from .plan import Plan, class_figure

CHOKE = "choke"


def _against_ripple(plan: Plan, henry: float) -> float:
    """C in F whose reactance and series resistance together are the asked share of the choke's reactance."""
    circular = 2.0 * math.pi * plan.above_zero("ripple")
    lossy = math.hypot(1.0, LOSS * plan.above_zero("ripple") / LOSS_AT)
    return plan.above_zero("weaker") * lossy / (circular**2 * henry)


def _against_slew(plan: Plan, henry: float) -> float:
    """C in F with R_series V/L + V/(e sqrt(LC)) = slew, R_series = tan d / (2 pi f C): quadratic in 1/sqrt(C)."""
    volts, slew = plan.supply.max, plan.above_zero("slew")
    lossy, resonant = LOSS * volts / (2.0 * math.pi * LOSS_AT * henry), volts / (math.e * math.sqrt(henry))
    root = (math.sqrt(resonant**2 + 4.0 * lossy * slew) - resonant) / (2.0 * lossy)
    return 1.0 / root**2


def _make(plan: Plan) -> Made:
    current, drop = plan.above_zero("small_current"), plan.above_zero("drop")
    henry = class_figure("inductor", CHOKE, "inductance", "H").high
    winding = class_figure("inductor", CHOKE, "resistance", "ohm").high
    bears = class_figure("inductor", CHOKE, "i_max", "A").low
    if current > bears:
        raise plan.refused("small_current", f"it is more than the {bears:g} A of the choke; write less")
    ohms = drop / current - winding
    if ohms < 0.0:
        raise plan.refused("drop", f"the winding alone, {winding:g} ohm, loses more; write more volts")
    feed, quiet, middle = plan.port("feed"), plan.port("quiet"), plan.net("damped")
    ohms = plan.resistor(ohms, feed, middle, "filter_resistor", snap="down", volts=2.0 * drop)
    plan.part("L", "inductor", {"a": middle, "b": quiet}, "choke", **{"class": CHOKE})
    damping = ohms + winding
    wanted = max(4.0 * henry / damping**2, _against_ripple(plan, henry), _against_slew(plan, henry))
    farads = add_filter_capacitor(plan, wanted, quiet)
    return Made(quiet_drop=damping * current, settles=5.0 * damping * farads)


KIND = StageKind(
    name="lc_filter",
    called="filter",
    title="LC filter",
    place=Place.FEED,
    help=(
        "A choke and a capacitor between the rail and the small stages, with a resistor that damps them. R = drop / I,"
        " the winding counted in. C is the largest of three: 4 L / R^2, so that R >= 2 sqrt(L/C) and nothing"
        " overshoots towards twice the supply; k / ((2 pi f)^2 L), more by the capacitor's losses, so that a ripple"
        " of frequency f gets k times smaller; and that with V_max R_C/L + V_max/(e sqrt(LC)) = slew, the steepest that"
        " a damped filter whose capacitor has R_C lets a step rise. Source: step and frequency response of the series"
        " resonant circuit; choke and tan d from memory."
    ),
    ports=(
        Port("feed", Wire.QUIET, "the rail before it"),
        Port("quiet", Wire.NEW_QUIET, "the rail of small stages, behind it"),
        RETURN_PORT,
    ),
    settings=(
        Setting("small_current", "A", "50 mA", "what the stages behind it draw together"),
        Setting("drop", "V", "0.5 V", "what the filter may lose at that current"),
        Setting("ripple", "Hz", "1 kHz", "frequency that it is to keep away"),
        Setting("weaker", "", "10", "times smaller behind it"),
        Setting("slew", "V/s", "20 V/ms", "how fast the filtered rail may rise when the supply is snapped on"),
    ),
    make=_make,
    takes=(),
)
