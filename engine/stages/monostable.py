"""Monostable: an edge at its input makes one pulse of a fixed length."""

from __future__ import annotations

import math

from ..quantity import write
from .kind import IN_PORT, OUT_PORT, QUIET_PORT, RETURN_PORT, Intake, Json, Made, Place, Setting, StageKind
from .multivibrator import (
    BLEED,
    COLLECTOR,
    add_base,
    add_separate_output,
    half,
    most_timing,
    output_base,
    swing,
)
from .plan import RETURN, V_BE, Plan

TRIGGER = 10e-9  # F (common practice: 10 to 100 nF)
TRIGGER_OHMS = 1e3
TRIGGER_RETURN = 100e3


def _make(plan: Plan) -> Made:
    time, window = plan.above_zero("time"), plan.share("window")
    rail, first, second, base = plan.port("rail"), plan.net("first"), plan.net("second"), plan.net("base")
    # While the pulse lasts the first base is fed from the second collector, through both resistors of the second,
    # and so is the base of the output.
    ring = (plan.rail.min - V_BE) / (half(plan, COLLECTOR).base + output_base(plan) + V_BE / BLEED)
    collector = plan.resistor(ring / 3.0, rail, second, "collector_resistor_two", snap="down")
    plan.resistor(2.0 * ring / 3.0, second, base, "base_resistor", snap="down")
    plan.resistor(BLEED, base, RETURN, "base_emitter_resistor_one")
    plan.resistor(COLLECTOR, rail, first, "collector_resistor_one")
    plan.transistor(first, base, RETURN, "pulse_device")
    node = plan.net("node")
    most = most_timing(plan, half(plan, collector).base)
    farads = plan.capacitor(
        time / (most * math.log(swing(plan))), first, node, "timing_capacitor", snap="up", film=True, times="time"
    )
    plan.resistor(time / (farads * math.log(swing(plan))), rail, node, "timing_resistor", tolerance="1 %")
    plan.transistor(second, add_base(plan, node, "two"), RETURN, "rest_device")
    edge, kick = plan.net("edge"), plan.net("kick")
    plan.capacitor(TRIGGER, plan.port("in"), edge, "trigger_capacitor")
    plan.resistor(TRIGGER_RETURN, plan.port("in"), RETURN, "discharge_resistor")
    plan.diode(RETURN, edge, "clamp_diode")
    plan.diode(edge, kick, "trigger_diode")
    plan.resistor(TRIGGER_OHMS, kick, base, "trigger_resistor")
    duration: Json = {
        "check": "duration",
        "of": plan.roles["timing_capacitor"],
        "sequence": "alarm",
        "from": "{load} on",
        "to": "{load} off",
        "min": write(time * (1.0 - window), "s", digits=6),
        "max": write(time * (1.0 + window), "s", digits=6),
    }
    return Made(
        output=add_separate_output(plan, second, rail),
        settles=5.0 * COLLECTOR * farads,
        lasts=time * (1.0 + window) * 1.3,
        active=time,
        requirements=(duration,),
    )


KIND = StageKind(
    name="monostable",
    called="pulse",
    title="monostable",
    place=Place.TIME,
    help=(
        "One transistor rests on, held by the timing resistor; an edge turns the other on, whose collector takes the"
        " capacitor and with it the first base down by the whole rail. T = R C ln((2V - V_th - V_sat)/(V - V_th)),"
        " about 0.69 R C. R <= (V_min - V_th) / (3 I_C/h_FE,min). From about 4 V on a diode keeps the reverse swing"
        " from the base; the time is short until C is charged again through its collector resistor (5 R_C C). Source:"
        " Millman, Taub (1965), from memory."
    ),
    ports=(QUIET_PORT, IN_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("time", "s", "2 s", "length of the pulse"),
        Setting("window", "%", "40 %", "how far the time may be off, both ways"),
    ),
    make=_make,
    intake=lambda plan: Intake(plan.rail.max / TRIGGER_RETURN),
    edge=True,
    supply_starts=False,
)
