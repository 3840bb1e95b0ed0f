"""End-of-line loop: a supervised line that tells open and short from sound, by two thresholds."""

from __future__ import annotations

from ..quantity import write
from .contact import LEAD_INSULATION, PER_METRE
from .held import HELD, held, held_setting
from .kind import OUT_PORT, QUIET_PORT, RETURN_PORT, Json, Made, Place, Setting, StageKind
from .output import HELP, add_output, sized
from .plan import OVERDRIVE, RETURN, V_BE, Plan

V_LEAST = 0.5  # V, base-emitter voltage and diode each at some microampere, from memory
WETTING = {"minimum_current": {"typical": "0.1 mA", "source": "memory"}}
DRIFT = "3 %"  # of the rail, each threshold: two junctions over temperature and supply
DIVIDER = 47e3  # ohm, of each of the two references
WATCHING = 47e3  # ohm between the line and the transistor that sees it open
BLEED = 470e3  # ohm, keeps a base-emitter junction at 0 V while its diode blocks


def _make(plan: Plan) -> Made:
    rail, volts = plan.port("rail"), plan.rail.nominal
    line, far, trip, low = plan.net("line"), plan.net("far"), plan.net("trip"), plan.net("low")
    ohms = plan.above_zero("end_resistor")
    lower, upper = plan.share("lower"), plan.share("upper")
    if not lower < 0.5 < upper:
        raise plan.refused("lower", "the two thresholds must lie on both sides of 0.5, where a sound line stands")
    plan.resistor(ohms, rail, line, "pull_up", tolerance="1 %")
    metres = plan.number("lead")
    end = plan.net("end")
    if metres > 0.0:
        pins = {"from": line, "to": far}
        plan.part("W", "lead", pins, "lead", length=write(metres, "m"), insulation=LEAD_INSULATION, **PER_METRE)
    contact_end = far if metres > 0.0 else line
    contact = plan.part("S", "contact", {"a": contact_end, "b": end}, "contact", form="break", data=WETTING)
    plan.resistor(ohms, end, RETURN, "end_of_line", tolerance="1 %")
    short = plan.part("S", "contact", {"a": contact_end, "b": RETURN}, "short_contact", form="make")
    # Each threshold is its reference and two junctions: V_EB and the diode that keeps the reverse away.
    for name, volts_at, words in (
        ("high", upper * volts - 2 * V_LEAST, "upper"),
        ("low", lower * volts + 2 * V_LEAST, "lower"),
    ):
        share = volts_at / volts
        if not 0.05 < share < 0.95:
            raise plan.refused(words, f"of {volts:.3g} V no reference is left for it; feed it more")
        ref, emitter = plan.net(f"ref_{name}"), plan.net(f"emitter_{name}")
        plan.resistor((1.0 - share) * DIVIDER, rail, ref, f"{name}_upper_resistor", tolerance="1 %")
        plan.resistor(share * DIVIDER, ref, RETURN, f"{name}_lower_resistor", tolerance="1 %")
        base, source = (ref, line) if name == "high" else (line, ref)
        if name == "high":
            # The threshold must not hold the opened line down.
            source = plan.net("watched")
            plan.resistor(WATCHING, line, source, "high_series_resistor")
        plan.diode(source, emitter, f"{name}_diode")
        plan.resistor(BLEED, emitter, base, f"{name}_bleed_resistor")
        plan.transistor(trip, base, emitter, f"{name}_device", kind="pnp")
    output = sized(plan)
    bleed = min(V_BE / (0.3 * OVERDRIVE * output.current / plan.gain()), 220e3)
    plan.resistor(bleed, trip, RETURN, "base_emitter_resistor")
    plan.transistor(low, trip, RETURN, "trip_device")
    # The line jumps by the whole rail, and the transistor that watches it for a short takes this base along.
    plan.capacitor(plan.quieting(("pnp", 0.0, plan.rail.max)), trip, RETURN, "base_capacitor_trip_device", snap="up")
    event = held(plan, HELD)
    acts = ((0.0, {"event": "open", "part": contact}), (event.time, {"event": "close", "part": contact}))
    loop: Json = {
        "events": [
            {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
            {"at": "1 s", "event": "open", "part": contact},
            {"at": "2 s", "event": "close", "part": contact},
            {"at": "3 s", "event": "close", "part": short},
        ],
        "ends": "4 s",
        "moments": {"standby": "0.9 s", "normal": "0.9 s", "open": "1.9 s", "short": "3.9 s"},
    }
    supervised: Json = {
        "check": "supervised_loop",
        "of": line,
        "sequence": "loop",
        "rail": rail,
        "low": write(lower, "%"),
        "high": write(upper, "%"),
        "drift": DRIFT,
    }
    return Made(
        output=add_output(plan, output, low, rail),
        acts=acts,
        lasts=event.lasts,
        doubts=event.doubts,
        sequences={"loop": loop},
        requirements=(supervised,),
    )


KIND = StageKind(
    name="end_of_line_loop",
    called="loop",
    title="end-of-line loop",
    place=Place.SENSE,
    help=(
        "A line is pulled up by as many ohms as stand at its end, so that it rests at half of the rail; open it goes"
        " up, shorted it goes down, and each passes a threshold. Upper threshold = reference + V_EB + V_D, lower ="
        " reference - V_EB - V_D; both references are dividers of the same rail, so that supply cancels. The gaps that"
        " remain after"
        " line resistance and leakage are the margin. " + HELP + " Source: common practice (1-10 k), from memory."
    ),
    ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
    settings=(
        Setting("end_resistor", "ohm", "4k7", "at the end of the line, and as its pull-up"),
        Setting("lower", "", "0.35", "share of the rail below which the line counts as shorted"),
        Setting("upper", "", "0.65", "share of the rail above which it counts as open"),
        Setting("lead", "m", "20 m", "length of the line; 0 for none"),
        held_setting(HELD, "how long the contact stays open"),
    ),
    make=_make,
    takes=(),
)
