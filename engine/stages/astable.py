"""Astable flasher: two transistors that switch each other off in turn."""

from __future__ import annotations

import math

from ..quantity import write
from .kind import IN_PORT, OUT_PORT, RETURN_PORT, Intake, Json, Made, Place, Setting, StageKind
from .multivibrator import COLLECTOR, add_base, add_separate_output, half, most_timing, swing
from .output import sized
from .plan import RETURN, Plan

SHOWN = 5.0  # periods that a sequence runs on


def _make(plan: Plan) -> Made:
    period, window = plan.above_zero("period"), plan.share("window")
    feed, first, second = plan.port("in"), plan.net("first"), plan.net("second")
    most = most_timing(plan, half(plan, COLLECTOR).base)
    farads = 0.5 * period / (most * math.log(swing(plan)))
    for name, collector, other in (("one", first, second), ("two", second, first)):
        node = plan.net(f"node_{name}")
        plan.resistor(COLLECTOR, feed, collector, f"collector_resistor_{name}")
        value = plan.capacitor(farads, other, node, f"timing_capacitor_{name}", snap="up", film=True, times="period")
        plan.resistor(
            0.5 * period / (value * math.log(swing(plan))), feed, node, f"timing_resistor_{name}", tolerance="1 %"
        )
        plan.transistor(collector, add_base(plan, node, name), RETURN, f"flasher_{name}")
    drive = add_separate_output(plan, first, feed)
    # The first flashes are short: capacitors begin empty. A base that is driven below 0 V begins a whole half.
    swung = f"{plan.net('node_one')} below {write(-0.5 * plan.rail.min, 'V')}"
    duration: Json = {
        "check": "duration",
        "of": plan.roles["timing_capacitor_one"],
        "sequence": "alarm",
        "from": swung,
        "to": f"{first} below {write(0.25 * plan.rail.min, 'V')}",
        "min": write(0.5 * period * (1.0 - window), "s", digits=6),
        "max": write(0.5 * period * (1.0 + window), "s", digits=6),
    }
    moments = {
        name: {"after": swung, "by": write(at * period, "s")} for name, at in (("sounding", 0.25), ("silent", 0.75))
    }
    return Made(output=drive, lasts=SHOWN * period, active=0.5 * period, moments=moments, requirements=(duration,))


KIND = StageKind(
    name="astable",
    called="flasher",
    title="astable flasher",
    place=Place.TIME,
    help=(
        "Two transistors, each switched off for half of the period by the capacitor from the other's collector. T = 2"
        " R C ln((2V - V_th - V_sat)/(V - V_th)), about 1.386 R C where junctions are small against V. R is at most"
        " what saturates threefold at the lowest rail, (V_min - V_th) / (3 I_C/h_FE,min). From about 4 V on a diode"
        " before each base keeps away the swing of the whole rail in reverse, with V_th = V_BE + V_D. A supply that"
        " rises very slowly can leave both on. Source: Millman, Taub (1965), from memory."
    ),
    ports=(IN_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("period", "s", "1 s", "of one flash and one pause"),
        Setting("window", "%", "40 %", "how far half a period may be off, both ways"),
    ),
    make=_make,
    intake=lambda plan: Intake(2.5 * plan.rail.max / COLLECTOR + sized(plan).current + plan.next.current),
)
