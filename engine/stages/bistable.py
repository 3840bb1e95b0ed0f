"""Bistable: set by a level, kept until a contact acknowledges it."""

from __future__ import annotations

from .kind import IN_PORT, OUT_PORT, QUIET_PORT, RETURN_PORT, Intake, Made, Place, Setting, StageKind
from .multivibrator import BLEED, half
from .output import add_output, sized
from .plan import RETURN, V_BE, V_DIODE, Plan

COLLECTOR = 22e3  # ohm
PRESET = 100e-9  # F from the base that is set to 0V: it comes up reset (common practice)
SETS = 2.0  # times the base current that keeps it


def _level(plan: Plan) -> float:
    """Current in A that sets it."""
    return SETS * half(plan, COLLECTOR, sized(plan).current).base + V_BE / BLEED


def _make(plan: Plan) -> Made:
    rail, output = plan.port("rail"), sized(plan)
    collectors = {"set": plan.net("set"), "rest": plan.net("rest")}
    bases = {name: plan.net(f"base_{name}") for name in collectors}
    extra = {"set": output.current, "rest": 0.0}
    for name, other in (("set", "rest"), ("rest", "set")):
        ring = (plan.rail.min - V_BE) / (half(plan, COLLECTOR, extra[name]).base + V_BE / BLEED)
        ohms = ring - COLLECTOR
        if ohms < 1e3:
            raise plan.refused(
                "acknowledged",
                "the output takes more than the loop can carry; put a driver with a smaller current behind it",
            )
        plan.resistor(COLLECTOR, rail, collectors[name], f"collector_resistor_{name}")
        plan.resistor(ohms, collectors[other], bases[name], f"base_resistor_{name}", snap="down")
        plan.resistor(BLEED, bases[name], RETURN, f"base_emitter_resistor_{name}_device")
        plan.transistor(collectors[name], bases[name], RETURN, f"{name}_device")
    plan.capacitor(PRESET, bases["set"], RETURN, "preset_capacitor")
    kick = plan.net("kick")
    ohms = (plan.arriving - V_BE - V_DIODE) / _level(plan) - plan.arriving_ohms
    if ohms < 1.0:
        raise plan.refused(
            "acknowledged", "the stage before cannot set it through its own resistance; put a trigger between"
        )
    plan.resistor(ohms, plan.port("in"), kick, "input_resistor", snap="down")
    plan.diode(kick, bases["set"], "input_diode")
    pressed = plan.net("pressed")
    contact = plan.part("S", "contact", {"a": rail, "b": pressed}, "acknowledge_contact", form="make")
    plan.resistor(
        (plan.rail.min - V_BE) / (SETS * _level(plan)), pressed, bases["rest"], "acknowledge_resistor", snap="down"
    )
    after = plan.above_zero("acknowledged")
    acts = ((after, {"event": "close", "part": contact}), (after + 0.5, {"event": "open", "part": contact}))
    return Made(output=add_output(plan, output, collectors["set"], rail), acts=acts, lasts=after + 0.5, active=after)


KIND = StageKind(
    name="bistable",
    title="bistable",
    place=Place.HOLD,
    help=(
        "Two transistors that hold each other; a level sets it, a contact resets it. Loop: R_C + R_B <= (V_min -"
        " V_BE) / (3 I_C/h_FE,min + V_BE/R_BE), so that each saturates threefold with the least gain. A capacitor at"
        " the base that sets it lets it come up reset, unless the supply rises more slowly than R C of that base."
        " Source: loop saturation as in Millman, Taub (1965), from memory; preset: common practice."
    ),
    ports=(QUIET_PORT, IN_PORT, OUT_PORT, RETURN_PORT),
    settings=(Setting("acknowledged", "s", "5 s", "when the sequence presses its contact, after the alarm began"),),
    make=_make,
    intake=lambda plan: Intake(_level(plan), threshold=(V_BE + V_DIODE) / plan.rail.min),
    supply_starts=False,
)
