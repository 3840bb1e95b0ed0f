"""Long RC timer: a capacitor charged through a resistor against a share of the rail, with a pnp that watches it."""

from __future__ import annotations

import math

from ..quantity import write
from .kind import (
    IN_PORT,
    OUT_PORT,
    QUIET_PORT,
    RETURN_PORT,
    WORD,
    Drive,
    Intake,
    Json,
    Made,
    Place,
    Port,
    Sense,
    Setting,
    StageKind,
    Wire,
)
from .output import LEAST_OUTPUT, Output, add_output, sized
from .plan import OVERDRIVE, RETURN, V_BE, V_REVERSE, Plan

DELAY, INTERVAL, RESET = "delay", "interval", "reset"
V_LEAST = 0.5  # V, base-emitter voltage of the threshold transistor at a few microampere, from memory
EMITTER_BLEED = 470e3  # ohm, keeps the emitter at the base while its diode blocks
DIVIDER = 330e3  # ohm, both resistors of the threshold together
FIRE_BLEED = 1e6  # ohm, base-emitter resistor of the firing transistor
SNAP = 10.0  # times the upper divider resistor: how much of a fired timer's swing goes back into the threshold
MOST = 1e6  # ohm, a timing resistor above it is at the mercy of the board's leakage (common practice)
FALL = 0.1  # of the rail that the output of an interval may lose in its pull-up
HOLDS = 1.0  # s that what starts it stays on after the latest end of its time
QUIET = 10e-9  # F across the output's base: 1 ms with its resistor (common practice)
SINK = 0.2e-3  # A that a timer must be able to draw from a latch's base


def _output(plan: Plan) -> Output:
    """What the firing transistor has to draw, and the resistor that feeds its collector."""
    wanted = max(plan.next.current, LEAST_OUTPUT)
    low = plan.rail.min
    mode = plan.text("mode")
    if mode == DELAY:
        return sized(plan)
    if mode == INTERVAL:
        ohms = min(FALL * low * plan.gain("npn", wanted) / wanted, 100e3)
        return Output(plan.rail.max / ohms, ohms, 0.0)
    return Output(SINK, 0.0, 0.0)


def _intake(plan: Plan) -> Intake:
    needed = plan.rail.max / DIVIDER + (plan.rail.max / _output(plan).ohms if plan.text("mode") == INTERVAL else 0.0)
    return Intake(needed, passes=plan.text("mode") == RESET)


def _make(plan: Plan) -> Made:
    mode, time, share = plan.text("mode"), plan.above_zero("time"), plan.share("threshold")
    window = plan.share("window")
    if mode == INTERVAL and plan.drive is None:
        raise plan.refused(
            "mode", "an interval needs something that starts it; put a contact or a latch before it, or write delay"
        )
    if mode == RESET and not plan.has_latch:
        raise plan.refused("mode", "there is no latch before it to reset; put one there, or write delay")
    output = _output(plan)
    feed, charge, ref, fire = plan.port("in"), plan.net("charge"), plan.net("ref"), plan.net("fire")
    # What fires must come through the timing resistor: it bounds the resistor, and with it the capacitor from below.
    needed = OVERDRIVE * output.current / plan.gain("npn") + V_BE / FIRE_BLEED
    left = plan.arriving * (1.0 - share) - 2 * V_LEAST
    if left <= 0.0:
        raise plan.refused("threshold", f"{share:g} of {plan.arriving:.3g} V leaves nothing to fire with; write less")
    volts = plan.rail.nominal - (0.0 if plan.drive is None else plan.drive.drop)
    # While the capacitor is empty the base stands a share of the rail above the emitter, in reverse.
    guarded = share * plan.rail.max > V_REVERSE
    threshold = (share * volts + V_LEAST * (2 if guarded else 1)) / volts
    tau = time / math.log(1.0 / (1.0 - threshold))
    most = min(left / needed, MOST)
    low_drift = plan.text("capacitor") == "low drift"
    farads = plan.capacitor(tau / most, charge, RETURN, "timing_capacitor", snap="up", low_drift=low_drift)
    plan.resistor(tau / farads, feed, charge, "timing_resistor", tolerance="1 %")
    plan.diode(charge, feed, "discharge_diode")
    upper, lower = (1.0 - share) * DIVIDER, share * DIVIDER
    if mode == INTERVAL:
        # At rest the feedback lies beside the upper resistor.
        upper *= 1.0 + 1.0 / SNAP
    upper = plan.resistor(upper, feed, ref, "threshold_upper_resistor", tolerance="1 %")
    plan.resistor(lower, ref, RETURN, "threshold_lower_resistor", tolerance="1 %")
    watched = charge
    if guarded:
        watched = plan.net("watched")
        plan.diode(charge, watched, "emitter_diode")
        plan.resistor(EMITTER_BLEED, watched, ref, "emitter_bleed_resistor")
    plan.transistor(fire, ref, watched, "threshold_device", kind="pnp")
    plan.resistor(FIRE_BLEED, fire, RETURN, "base_emitter_resistor_reset_device")
    made = _fired(plan, mode, output, upper)
    capacitor = plan.roles["timing_capacitor"]
    first, last = ("begins", "{load} on") if mode == DELAY else ("{load} on", "{load} off")
    spans = {"from": first, "to": last}
    duration: Json = {
        "check": "duration",
        "of": capacitor,
        "sequence": "alarm",
        **spans,
        "min": write(time * (1.0 - window), "s", digits=6),
        "max": write(time * (1.0 + window), "s", digits=6),
    }
    arrival: Json = {"check": "arrival", "of": capacitor, "sequence": "alarm", **spans}
    return Made(
        output=made,
        lasts=time * (1.0 + window) * 1.6,
        active=None if mode == DELAY else time,
        holds=0.0 if mode == RESET else time * (1.0 + window) + HOLDS,
        standby=0.3 * time if mode == DELAY else None,
        requirements=(duration, arrival),
    )


def _fired(plan: Plan, mode: str, output: Output, upper: float) -> Drive | None:
    """What the firing transistor does when the time is over."""
    fire, ref, feed = plan.net("fire"), plan.net("ref"), plan.port("in")
    if mode == RESET:
        plan.transistor(plan.port("base"), fire, RETURN, "reset_device")
        return None
    low = plan.net("low")
    plan.transistor(low, fire, RETURN, "reset_device")
    if mode == DELAY:
        # At rest no current may go through the output's base: a diode keeps it out of the feedback. A delay that is
        # started by an edge must not give a pulse then: what its transistors couple is short against the capacitor's.
        back = plan.net("back")
        plan.diode(ref, back, "feedback_diode")
        plan.resistor(SNAP * upper, low, back, "feedback_resistor")
        drive = add_output(plan, output, low, feed)
        plan.capacitor(QUIET, feed, plan.net("drive"), "base_capacitor_output_device", film=True)
        return drive
    plan.resistor(SNAP * upper, low, ref, "feedback_resistor")
    ohms = plan.resistor(output.ohms, feed, low, "pull_up_resistor", snap="down")
    plan.transistor(plan.port("rail"), low, plan.port("out"), "output_device", current=plan.next.current)
    drop = V_BE + ohms * max(plan.next.current, LEAST_OUTPUT) / plan.gain("npn", plan.next.current)
    return Drive(Sense.LEVEL, drop=drop + (0.0 if plan.drive is None else plan.drive.drop))


KIND = StageKind(
    name="long_timer",
    called="timer",
    title="long RC timer",
    place=Place.TIME,
    help=(
        "A capacitor is charged through a resistor; a pnp transistor conducts when it is V_EB above a share of the rail"
        " and fires an npn. T = R C ln(V / (V - V_th)) with V_th = share x V + V_EB (and a diode more where the empty"
        " capacitor would drive the junction into reverse). R is at most what still fires at the"
        " lowest supply, (V_min - V_th) / (3 I_C/h_FE,min + V_BE/R_BE); C follows, next higher preferred value, and R"
        " then from C. It gets there only while the leakage of C stays below (V - V_th)/R, which grows with T alone:"
        " with 0.01 C V, R C beyond some 40 s fails when hot. delay: out goes high after T; interval: out is high for T"
        " from when in goes high; reset: lets the latch before it go after T. Source: RC charging law; common practice."
    ),
    ports=(
        IN_PORT,
        QUIET_PORT,
        OUT_PORT,
        Port("base", Wire.BASE, "of the latch that it resets"),
        RETURN_PORT,
    ),
    settings=(
        Setting("mode", WORD, DELAY, "delay, interval, or reset of the latch before it", (DELAY, INTERVAL, RESET)),
        Setting("time", "s", "60 s", "nominal time"),
        Setting("window", "%", "40 %", "how far the time may be off, both ways"),
        Setting("threshold", "", "0.3", "share of the rail at which it fires"),
        Setting("capacitor", WORD, "low drift", "class of a large timing capacitor", ("low drift", "electrolytic")),
    ),
    make=_make,
    intake=_intake,
)
