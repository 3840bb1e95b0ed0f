"""Complementary latch: an npn and a pnp that feed each other's base until the loop is broken."""

from __future__ import annotations

from ..parts.physics import doubling
from .kind import (
    IN_PORT,
    OUT_PORT,
    QUIET_PORT,
    RETURN_PORT,
    Drive,
    Intake,
    Made,
    Place,
    Port,
    Sense,
    Setting,
    StageKind,
    Wire,
)
from .plan import COUPLED, OVERDRIVE, RETURN, V_BE, V_DIODE, V_SATURATED, Plan, class_figure

LEAST_OUTPUT = 0.2e-3  # A, taken for what follows where it does not say
MOST_BLEED = 470e3  # ohm
V_HOT = 0.4  # V, base-emitter voltage that still counts as off when hot (from memory)
INPUT_DRIVE = 10.0  # times the current of the base-emitter resistor that a level gives to set it


def _bleed(plan: Plan) -> float:
    """The base-emitter resistor in ohm: hot leakage through it stays below half of what begins to turn it on."""
    leak, step = (
        class_figure("npn", "small npn", key, unit) for key, unit in (("i_cbo", "A"), ("i_cbo_doubling", "K"))
    )
    hot = leak.high * float(doubling(plan.ambient.max, step.typical))
    return min(0.5 * V_HOT / hot, MOST_BLEED, plan.above_zero("bleed"))


def _intake(plan: Plan) -> Intake:
    return Intake(INPUT_DRIVE * V_BE / _bleed(plan), threshold=(V_BE + V_DIODE) / plan.rail.min)


def _make(plan: Plan) -> Made:
    if plan.drive is not None and plan.drive.sense is Sense.PULSE:
        plan.ports["base"] = plan.port("in")
    rail, out, base = plan.port("rail"), plan.port("out"), plan.port("base")
    upper, lower = plan.net("upper"), plan.net("lower")
    low = plan.rail.min
    bleed = _bleed(plan)
    wanted = max(plan.next.current, LEAST_OUTPUT)
    if plan.drive is not None and plan.drive.sense is Sense.LEVEL:
        kick = plan.net("kick")
        ohms = (plan.arriving - V_BE - V_DIODE) / _intake(plan).current - plan.arriving_ohms
        if ohms < 1.0:
            raise plan.refused("bleed", "the stage before cannot set it through its own resistance; write a larger one")
        plan.resistor(ohms, plan.port("in"), kick, "input_resistor", snap="down")
        plan.diode(kick, base, "input_diode")
    plan.transistor(out, upper, rail, "latch_pnp", kind="pnp", current=wanted)
    plan.transistor(lower, base, RETURN, "latch_npn")
    upper_base = OVERDRIVE * wanted / plan.gain("pnp", wanted)
    upper_bleed = min(bleed, V_BE / (0.1 * upper_base))
    collector = upper_base + V_BE / upper_bleed
    plan.resistor((low - V_BE - V_SATURATED) / collector, upper, lower, "collector_resistor", snap="down")
    held = OVERDRIVE * (collector / plan.gain("npn") + V_BE / bleed)
    plan.resistor((low - V_SATURATED - V_BE) / held, out, base, "feedback_resistor", snap="down")
    plan.resistor(bleed, base, RETURN, "base_emitter_resistor_npn", snap="down")
    plan.resistor(upper_bleed, rail, upper, "base_emitter_resistor_pnp", snap="down")
    farads = plan.above_zero("strays") * plan.rail.max / (COUPLED * V_BE)
    plan.capacitor(farads, base, RETURN, "base_capacitor", snap="up")
    plan.capacitor(farads, rail, upper, "base_capacitor_pnp", snap="up")
    return Made(
        output=Drive(Sense.LEVEL, drop=V_SATURATED, held=held),
        lasts=2.0,
        moments={"latched": {"after": "{load} on", "by": "100 ms"}},
        sequences={
            "snap": {
                "events": [{"at": "0 s", "event": "connect supply", "rise": "1 us"}],
                "ends": "2 s",
                "moments": {"standby": "1 s"},
            }
        },
    )


KIND = StageKind(
    name="complementary_latch",
    called="latch",
    title="complementary latch",
    place=Place.HOLD,
    help=(
        "An npn and a pnp that feed each other's base: a pulse sets it, and it holds until its current is taken away or"
        " its base is drawn to 0V. R_BE <= half of V_BE,hot / I_CBO,hot; the pnp gets 3 x I_out / h_FE,min, the npn 3 x"
        " (I_C/h_FE,min + V_BE/R_BE), so that it holds at V_min in the cold; both bases get C = C_stray V_max / (0.3"
        " V_BE), so that snapping the supply on divides down and does not trip it. It holds while B1 B2 >= 1. Source:"
        " Ebers 1952; Moll et al. 1956 (from memory); sizing: common practice."
    ),
    ports=(
        QUIET_PORT,
        IN_PORT,
        OUT_PORT,
        Port("base", Wire.NEW_BASE, "base of its npn: set by a pulse, reset by drawing it to 0V"),
        RETURN_PORT,
    ),
    settings=(
        Setting("bleed", "ohm", "100k", "base-emitter resistor, at most"),
        Setting("strays", "F", "15 pF", "from the rail into a base: wiring and collector together"),
    ),
    make=_make,
    takes=(Sense.LEVEL, Sense.PULSE),
    intake=_intake,
    supply_starts=False,
)
