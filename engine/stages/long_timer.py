"""Long RC timer: a capacitor charged through a resistor against a share of the rail, with a pnp that watches it."""

from __future__ import annotations

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
from .plan import LARGEST_FILM, OVERDRIVE, RETURN, V_BE, V_DIODE, V_REVERSE, Plan, snapped
from .timer_ends import Built, class_of, ends
from .timing_capacitor import (
    DIVIDER,
    ELECTROLYTIC,
    EMITTER_BLEED,
    LOW_DRIFT,
    SELECTED,
    SUITABLE,
    TENTH,
    Threshold,
    Timing,
    add_timing_capacitor,
    chosen,
    class_name,
    doubts,
)

DELAY, INTERVAL, RESET = "delay", "interval", "reset"
FIRE_BLEED = 1e6  # ohm, base-emitter resistor of the firing transistor
SNAP = 10.0  # times the upper divider resistor: how much of a fired timer's swing goes back into the threshold
MOST = 1e6  # ohm, a timing resistor above it is at the mercy of the board's leakage (common practice)
FED_BACK = 0.15  # of what its output draws in the end, at most: with it one that is fed back goes over (simulated: 0.1)
HELPED = (
    0.02  # of the time: by so much a delay whose emitter is guarded is sooner at its late end (simulated: 2.4 to 4 %)
)
FALL = 0.1  # of the rail that the output of an interval may lose in its pull-up
HOLDS = 1.0  # s that what starts it stays on after the latest end of its time
READY, READY_LEAST = 0.1, 1.0  # of its time, and s, in which a timer that reset a latch is empty again
LEAST_DISCHARGE = 10e3  # ohm that empties it, at least: it draws from the latch meanwhile
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
    return Output(max(SINK, 0.0 if plan.drive is None else plan.drive.held), 0.0, 0.0)


def _intake(plan: Plan) -> Intake:
    needed, mode = plan.rail.max / DIVIDER, plan.text("mode")
    if mode == RESET:
        needed += plan.rail.max / LEAST_DISCHARGE
    if mode == INTERVAL:
        needed += plan.rail.max / _output(plan).ohms
    if mode == DELAY:
        # Its output is fed from what starts it, and so is what follows.
        needed += _output(plan).current + plan.next.current
    if mode == RESET:
        return Intake(needed, passes=True)
    time = plan.above_zero("time")
    latest = time * (1.0 + plan.share("window"))
    lasts = f"of {write(time, 's', digits=3)}, which may take {write(latest, 's', digits=3)},"
    cut, instead = f"the delay {lasts} does not run out, and nothing comes on", "put a latch between"
    if mode == INTERVAL:
        cut, instead = f"the interval {lasts} is cut off with it", "put a latch between, with mode reset"
    return Intake(needed, holds=latest + HOLDS, holds_least=latest, cut=cut, instead=instead)


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
    start = plan.port("in")
    feed, charge, ref, fire = (
        plan.net("feed") if mode == RESET else start,
        plan.net("charge"),
        plan.net("ref"),
        plan.net("fire"),
    )
    # What fires must come through the timing resistor: it bounds the resistor, and with it the capacitor from below.
    needed = OVERDRIVE * output.current / plan.gain("npn") + V_BE / FIRE_BLEED
    arriving = plan.arriving - (V_DIODE if mode == RESET else 0.0)
    left = arriving * (1.0 - share) - 2 * V_BE
    if left <= 0.0:
        raise plan.refused("threshold", f"{share:g} of {arriving:.3g} V leaves nothing to fire with; write less")
    # While the capacitor is empty the base stands a share of the rail above the emitter, in reverse.
    guarded = share * plan.rail.max > V_REVERSE
    fires = output.current / plan.gain("npn") + V_BE / FIRE_BLEED
    wanted = Threshold(share, guarded, fires, V_DIODE if mode == RESET else 0.0)
    most = min(left / needed, MOST)

    # A latch is let go by what holds it, which may be less than a timer is made for; an output that is fed back goes
    # over by itself once it has begun to.
    draws = output.current * FED_BACK
    if mode == RESET:
        draws = plan.drive.held if plan.drive is not None and plan.drive.held else output.current

    def built(timed: Timing) -> tuple[float, float]:
        early, late = ends(plan, _built(plan, timed, wanted, most, draws))
        return early, late * (1.0 - HELPED) if mode == DELAY and guarded else late

    timed = chosen(plan, time, window, wanted, built)
    timing = add_timing_capacitor(plan, timed.tau / most, charge, RETURN, timed.kind)
    plan.resistor(timed.tau / timing, feed, charge, "timing_resistor", tolerance="1 %")
    plan.diode(charge, feed, "discharge_diode")
    if mode == RESET:
        # The charge of the capacitor must not keep up what the latch has let go of: it goes to 0V by a way of its own.
        plan.diode(start, feed, "feed_diode")
        ready = max(READY * time, READY_LEAST) / 3.0
        plan.resistor(max(ready / timing, LEAST_DISCHARGE), feed, RETURN, "discharge_resistor", snap="down")
    upper = plan.resistor(_upper(mode, share), feed, ref, "threshold_upper_resistor", tolerance="1 %")
    plan.resistor(share * DIVIDER, ref, RETURN, "threshold_lower_resistor", tolerance="1 %")
    watched = charge
    if guarded:
        watched = plan.net("watched")
        plan.diode(charge, watched, "emitter_diode")
        plan.resistor(EMITTER_BLEED, watched, ref, "emitter_bleed_resistor")
    plan.transistor(fire, ref, watched, "threshold_device", kind="pnp")
    plan.resistor(FIRE_BLEED, fire, RETURN, "base_emitter_resistor_reset_device")
    # When the timer is started its reference jumps, and the collector of a delay with it: their collector-base
    # capacitances take the firing base along. It would reset the latch that has just been set, over and over again, or
    # switch on for some microseconds what is to come on at the end.
    jumps = plan.rail.max if mode == DELAY else 0.0
    farads = plan.quieting(("pnp", 0.0, share * plan.rail.max), ("npn", 0.0, jumps))
    plan.capacitor(farads, fire, RETURN, "base_capacitor_reset_device", snap="up")
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
        standby=0.3 * time if mode == DELAY else None,
        requirements=(duration, arrival),
        doubts=(
            *_unreset(plan),
            *(doubts(plan, timed, time, window, wanted, built) if timing > LARGEST_FILM else ()),
        ),
    )


def _unreset(plan: Plan) -> tuple[str, ...]:
    """That an interval does not let go the latch that starts it; nothing where none does."""
    if plan.text("mode") != INTERVAL or plan.drive is None or plan.drive.held <= 0.0:
        return ()
    return ("latch reset: an interval leaves the latch before it on; write mode reset, or take the latch out",)


def _built(plan: Plan, timed: Timing, wanted: Threshold, most: float, draws: float) -> Built:
    """The parts as they are put in for a class of capacitor, for the ends of its time."""
    farads = snapped(timed.tau / most, "E6", "up")
    upper = snapped(_upper(plan.text("mode"), wanted.share), "E96", "nearest")
    share = TENTH if timed.kind == SELECTED else 1.0
    tolerance, drift, leakage = class_of(plan, farads, class_name(timed.kind), share)
    return Built(
        ohms=snapped(timed.tau / farads, "E96", "nearest"),
        farads=farads,
        # At rest the feedback of an interval lies beside the upper resistor.
        upper=upper / (1.0 + 1.0 / SNAP) if plan.text("mode") == INTERVAL else upper,
        lower=snapped(wanted.share * DIVIDER, "E96", "nearest"),
        emitter_bleed=EMITTER_BLEED,
        fire_bleed=FIRE_BLEED,
        tolerance=tolerance,
        drift=drift,
        leakage=leakage,
        draws=draws,
        gain=plan.gain("npn"),
        lost=wanted.lost + (0.0 if plan.drive is None else plan.drive.drop),
        guarded=wanted.guarded,
        sinks=FALL / (SNAP * upper) if plan.text("mode") == INTERVAL else 0.0,
    )


def _upper(mode: str, share: float) -> float:
    """The upper resistor of the threshold in ohm."""
    return (1.0 - share) * DIVIDER * (1.0 + 1.0 / SNAP if mode == INTERVAL else 1.0)


def _fired(plan: Plan, mode: str, output: Output, upper: float) -> Drive | None:
    """What the firing transistor does when the time is over."""
    fire, ref, feed = plan.net("fire"), plan.net("ref"), plan.port("in")
    if mode == RESET:
        plan.transistor(plan.port("base"), fire, RETURN, "reset_device")
        return None
    low = plan.net("low")
    plan.transistor(low, fire, RETURN, "reset_device")
    if mode == DELAY:
        # At rest no current may go through the output's base: a diode keeps it out of the feedback.
        back = plan.net("back")
        plan.diode(ref, back, "feedback_diode")
        plan.resistor(SNAP * upper, low, back, "feedback_resistor")
        return add_output(plan, output, low, feed)
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
        "A capacitor charges until a pnp is V_EB above a share of the rail and fires an npn. T = R C/(1+g) ln(1/(1 - s"
        " (1+g))), s = V_th/V, V_th = share x V + V_EB (and a diode against reverse), g = R G_leak. R C puts T in the"
        " middle of what tolerances, V_EB and hot leakage make of it; R is at most what still fires at V_min, (V_min -"
        " V_th) / (3 I_C/h_FE,min + V_BE/R_BE). g grows with T alone: a suitable C is low drift, or where that leaks"
        " too much one that is selected; 0.01 C V fails beyond some 40 s of R C. The firing base has C = (C_ob"
        " V_th + C_ob V) / (0.3 V_BE), so that its start does not fire it. delay: out high after T; interval: out high"
        " for T; reset: lets the latch before it go after T. Source: RC charging law; common practice."
    ),
    ports=(
        IN_PORT,
        QUIET_PORT,
        OUT_PORT,
        Port("base", Wire.BASE, "of the latch that it resets"),
        RETURN_PORT,
    ),
    settings=(
        Setting(
            "mode",
            WORD,
            DELAY,
            "delay: on after the time; interval: on for it; reset: latch off then",
            (DELAY, INTERVAL, RESET),
        ),
        Setting("time", "s", "60 s", "nominal time"),
        Setting("window", "%", "40 %", "how far the time may be off, both ways"),
        Setting("threshold", "", "0.3", "share of the rail at which it fires"),
        Setting(
            "capacitor",
            WORD,
            SUITABLE,
            "class of a large one; selected: low drift, each measured to leak a tenth of its limit",
            (SUITABLE, LOW_DRIFT, SELECTED, ELECTROLYTIC),
        ),
    ),
    make=_make,
    intake=_intake,
)
