"""Differentiator trigger: a capacitor that hands the edge of a signal on as charge."""

from __future__ import annotations

from .kind import IN_PORT, RETURN_PORT, Drive, Intake, Made, Place, Port, Sense, Setting, StageKind, Wire
from .plan import RETURN, V_BE, V_DIODE, Plan

REGENERATION = 10e-6  # s until a latch helps itself, from memory
NODE = 2e-9  # F at the base of a latch with its capacitor, from memory
SPARE = 3.0  # times the least charge
LEAST = 10e-9  # F (common practice: 10 to 100 nF)
LASTS = 50e-6  # s, time constant with which the charge comes: that of a latch's bases (simulated: 50 to 130 us)
DISCHARGE = 100e3  # ohm


def _make(plan: Plan) -> Made:
    kick, out = plan.net("kick"), plan.port("out")
    step = plan.arriving - V_BE - V_DIODE
    if step <= 0.1:
        raise plan.refused("draw", f"of {plan.arriving:.2g} V nothing is left to trigger with; feed it more")
    charge = NODE * V_BE + plan.above_zero("draw") * REGENERATION
    limited = plan.net("limited")
    farads = plan.capacitor(max(SPARE * charge / step, LEAST), limited, kick, "trigger_capacitor", snap="up")
    # A contact that closes on a capacitor draws what the supply can give, which dips for all others; what comes within
    # a latch's storage time is lost to it: its upper base is charged through a resistor.
    plan.resistor(LASTS / farads, plan.port("in"), limited, "limiting_resistor", snap="down")
    plan.diode(RETURN, kick, "clamp_diode")
    plan.diode(kick, out, "trigger_diode")
    plan.resistor(DISCHARGE, plan.port("in"), RETURN, "discharge_resistor")
    return Made(output=Drive(Sense.PULSE))


KIND = StageKind(
    name="differentiator",
    called="edge",
    title="differentiator trigger",
    place=Place.SHAPE,
    help=(
        "Only the edge of a signal gets through, so that a contact that stays closed does not hold the latch. The"
        " charge C_t (dV_min - V_BE - V_D) must be three times what the base takes until the latch helps itself:"
        " C_node V_BE + I_draw t_regeneration; it comes through R = 50 us / C_t, so that no"
        " supply dips and the latch has the time. One diode hands it on, the other keeps the falling edge from driving"
        " the base into reverse. Source: common practice, from memory."
    ),
    ports=(IN_PORT, Port("out", Wire.OUT, "a pulse into a base"), RETURN_PORT),
    settings=(Setting("draw", "A", "50 uA", "what base and base-emitter resistor take meanwhile"),),
    make=_make,
    intake=lambda plan: Intake(plan.rail.max / DISCHARGE),
    edge=True,
    supply_starts=False,
)
