"""High-side driver: a pnp that switches the load to the rail, turned on by an npn."""

from __future__ import annotations

from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Drive, Intake, Made, Place, Port, Sense, Setting, StageKind, Wire
from .loads import LOAD_SETTINGS, NONE, add_load, carried, doubtful, drawn, load_requirements, peak
from .plan import OVERDRIVE, RETURN, V_BE, V_SATURATED, Plan

BLEED = 0.1  # share of a base current that its base-emitter resistor may take (common practice)
SATURATED = 0.3  # V across the pnp at its full current, from memory
V_FULL = 0.9  # V, base-emitter voltage of a driver at its full current, from memory


def _base(plan: Plan) -> tuple[float, float, float]:
    """Base current of the pnp in A, that of the npn, and the npn's base-emitter resistor in ohm."""
    upper = carried(plan) / plan.gain("pnp", peak(plan))
    lower = OVERDRIVE * upper / plan.gain("npn", upper)
    return upper, lower, min(max(V_BE / (BLEED * lower), 1e3), 100e3)


def _intake(plan: Plan) -> Intake:
    _, lower, bleed = _base(plan)
    return Intake(lower + V_BE / bleed)


def _make(plan: Plan) -> Made:
    upper, lower, bleed = _base(plan)
    rail, out, base, top, pull = (plan.port("rail"), plan.port("high"), *map(plan.net, ("base", "top", "pull")))
    ohms = (plan.arriving - V_BE) / (lower + V_BE / bleed) - plan.arriving_ohms
    if ohms < 1.0:
        raise plan.refused(
            "current", "its base current does not come through the stage before; write a smaller current"
        )
    plan.resistor(ohms, plan.port("in"), base, "npn_base_resistor", snap="down")
    plan.resistor(bleed, base, RETURN, "base_emitter_resistor_npn_device")
    plan.transistor(pull, base, RETURN, "npn_device", current=upper)
    plan.capacitor(plan.quieting(("npn", upper, plan.supply.max)), base, RETURN, "base_capacitor_npn_device", snap="up")
    upper_bleed = max(V_BE / (BLEED * upper), 100.0)
    plan.resistor(
        (plan.rail.min - V_FULL - V_SATURATED) / (upper + V_FULL / upper_bleed), top, pull, "base_resistor", snap="down"
    )
    plan.resistor(upper_bleed, rail, top, "base_emitter_resistor_driver")
    plan.transistor(out, top, rail, "driver", kind="pnp", current=peak(plan))
    plan.capacitor(plan.quieting(("npn", upper, plan.supply.max)), rail, top, "base_capacitor_driver", snap="up")
    if plan.text("load") != NONE:
        add_load(plan, plan.text("load"), out, RETURN)
    doubts = doubtful(plan, SATURATED) if plan.text("load") != NONE else ()
    return Made(output=Drive(Sense.HIGH_SIDE, drop=SATURATED), requirements=load_requirements(plan), doubts=doubts)


KIND = StageKind(
    name="high_side_driver",
    called="driver",
    title="high-side driver",
    place=Place.SWITCH,
    help=(
        "A pnp that switches the load to the rail, with an npn that draws its base current: for loads whose other end"
        " is at 0V. I_B = overdrive x I_load / h_FE,min; R_B = (V_min - V_BE - V_sat)/(I_B + V_BE/R_BE), next lower"
        " value; the npn is sized alike for that current. Each base-emitter resistor takes about a tenth. Source:"
        " common practice (overdrive 2 to 5); the class is from memory."
    ),
    ports=(IN_PORT, RAIL_PORT, Port("high", Wire.OUT, "the switched end of the load"), RETURN_PORT),
    settings=(*LOAD_SETTINGS, Setting("overdrive", "", "3", "times the least base current")),
    make=_make,
    intake=_intake,
    draws=drawn,
)
