"""Schmitt trigger: two npn transistors on one emitter resistor, with two thresholds that are shares of the rail."""

from __future__ import annotations

from .kind import IN_PORT, OUT_PORT, QUIET_PORT, RETURN_PORT, Drive, Intake, Made, Place, Sense, Setting, StageKind
from .output import sized
from .plan import COUPLED, RETURN, V_BE, V_REVERSE, V_SATURATED, Plan, class_figure

LEAST_CURRENT = 0.3e-3  # A in the emitter resistor, so that base currents do not count
OFF = 0.1e-6  # A that the output may let through at rest, hot, at the highest supply
ABOVE = 1.1  # times: the current of the divider with what the second base takes, and the resistor's tolerance
LEAST_IDLE, MOST_LOST = 0.05, 0.9  # V, and of the current: beyond 100 C neither can be had
DIVIDER_SHARE = 20.0  # times its base current that flows in the divider
V_EARLY = 0.1  # V before both bases are equal it goes over: the one that takes over needs a part of the current only
V_DIODE_LEAST = 0.35  # V of the diode before the base at some microampere (class)
V_HELD = 1.0  # V by which a base may be drawn below its emitter by an edge
SHIFTED = 0.02  # of the upper threshold that its base current may lose in the resistor before the base
LEAST_LIMITED = 1e3  # ohm, what comes in through as little more than that needs none
BLEED = 1e6  # ohm, keeps the base at the emitter while its diode blocks


def _idle(plan: Plan) -> float:
    """V across the output's base-emitter resistor at rest, at the nominal supply."""
    volts = plan.off_volts("pnp", plan.next.current, OFF)
    return max(volts, LEAST_IDLE) * plan.rail.nominal / plan.rail.max / ABOVE


def _current(plan: Plan) -> float:
    """Current in the emitter resistor, A: what the output takes, with what its base-emitter resistor takes of it."""
    lost = V_BE * DIVIDER_SHARE / (plan.gain() * _idle(plan))
    return max(3.0 * sized(plan).current / (1.0 - min(lost, MOST_LOST)), LEAST_CURRENT)


def _make(plan: Plan) -> Made:
    rail, signal = plan.port("rail"), plan.port("in")
    left, emitter, tap = plan.net("left"), plan.net("emitter"), plan.net("tap")
    volts = plan.rail.nominal
    upper, hysteresis = plan.share("threshold"), plan.share("hysteresis")
    # With its input at 0 V the emitter stands at the upper threshold less V_BE above its base, in reverse, and with a
    # high input that of the second transistor is as far above the divider. Two diodes shift both thresholds alike.
    guarded = upper * plan.rail.max - V_BE > V_REVERSE
    at_base = upper * volts + V_EARLY
    junctions = V_BE + (V_DIODE_LEAST if guarded else 0.0)
    lower = at_base - hysteresis * volts - 2.0 * V_EARLY
    if lower <= junctions + 0.2:
        raise plan.refused("hysteresis", f"{hysteresis:.3g} of {volts:.3g} V leaves no lower threshold; write less")
    current = _current(plan)
    emitter_ohms = plan.resistor((at_base - junctions) / current, emitter, RETURN, "emitter_resistor", tolerance="1 %")
    divider = DIVIDER_SHARE * current / plan.gain()
    output = sized(plan)
    bleed = min(_idle(plan) / divider, output.bleed)
    # Lower threshold: V_L = k (V - V_BE,out - I_1 R_b), with the ratio k that gives the upper one.
    ratio = at_base / (volts - divider * bleed)
    drawn = (lower - junctions) / emitter_ohms
    ohms = (volts - V_BE - lower / ratio) / drawn
    if ohms < 0.0:
        least = (at_base - 2.0 * V_EARLY - (volts - V_BE) * ratio) / volts
        raise plan.refused("hysteresis", f"the output alone makes {least:.2g} of the rail; write more than that")
    base = plan.net("drive")
    plan.resistor(bleed, rail, base, "base_emitter_resistor_output_device")
    plan.resistor(ohms, base, left, "collector_resistor", tolerance="1 %")
    plan.transistor(plan.port("out"), base, rail, "output_device", kind="pnp", current=plan.next.current)
    # An input that jumps takes the collector along through the first transistor, and that the output's base.
    farads = plan.quieting(("npn", 0.0, plan.rail.max))
    plan.capacitor(farads, rail, base, "base_capacitor_output_device", snap="up")
    lower_ohms = at_base / divider
    plan.resistor((volts - at_base) / divider - bleed - ohms, left, tap, "divider_upper_resistor", tolerance="1 %")
    plan.resistor(lower_ohms, tap, RETURN, "divider_lower_resistor", tolerance="1 %")
    # An input at the rail would take the emitter along through the base, and leave the collector nothing to turn the
    # output on with.
    limited = SHIFTED * at_base * plan.gain() / current - plan.arriving_ohms
    if limited > LEAST_LIMITED:
        plan.resistor(limited, signal, plan.net("limited"), "input_resistor", snap="down")
        signal = plan.net("limited")
    second = tap
    if guarded:
        node = plan.net("base")
        plan.diode(signal, node, "base_diode")
        plan.resistor(BLEED, node, emitter, "base_emitter_resistor_trip_device")
        signal = node
        second = plan.net("second")
        plan.diode(tap, second, "second_base_diode")
        plan.resistor(BLEED, second, emitter, "base_emitter_resistor_second_device")
        # Where the input jumps, a base that hangs on a blocking diode must go with its emitter.
        hangs = class_figure("diode", "signal diode", "capacitance", "F").high * plan.rail.max / V_HELD
        farads = hangs + plan.quieting(("npn", 0.0, plan.rail.max)) * COUPLED * V_BE / V_HELD
        for base_net, name in ((node, "trip_device"), (second, "second_device")):
            plan.capacitor(farads, base_net, emitter, f"base_emitter_capacitor_{name}", snap="up")
    plan.transistor(left, signal, emitter, "trip_device")
    plan.transistor(rail, second, emitter, "second_device")
    return Made(output=Drive(Sense.LEVEL, drop=V_SATURATED))


KIND = StageKind(
    name="schmitt_trigger",
    called="trigger",
    title="Schmitt trigger",
    place=Place.SHAPE,
    help=(
        "Two npn transistors share an emitter resistor. Upper threshold: V_U = V R2/(R_a + R_b + R1 + R2), what the"
        " divider gives the second transistor; R_E = (V_U - V_BE)/I. Lower: V_L = k (V - V_BE,out - I_1 R_b) with I_1"
        " = (V_L - V_BE)/R_E, which gives R_b. The divider carries 20 times its base current, and R_a leaves the output"
        " off when hot: V_EB at 0.1 uA. Hysteresis must be larger than the ripple of what comes in. R_in = 2 % of V_U /"
        " I_B keeps an input at the rail from lifting the emitter to it, which would leave the output no base current."
        " Where the emitter stands more than 3.5 V above an input at 0 V, a diode keeps the reverse from the base."
        " Source: emitter-coupled trigger as in Millman, Taub (1965), from memory."
    ),
    ports=(QUIET_PORT, IN_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("threshold", "", "0.4", "share of the rail at which it trips"),
        Setting("hysteresis", "", "0.06", "share of the rail that the input must fall back by"),
    ),
    make=_make,
    intake=lambda plan: Intake(_current(plan) / plan.gain(), threshold=plan.share("threshold")),
    supply_starts=False,
)
