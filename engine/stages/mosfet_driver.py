"""Drivers with a field-effect transistor: no current into the gate, but it needs enough voltage, and not too much."""

from __future__ import annotations

from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Drive, Intake, Made, Place, Port, Sense, Setting, StageKind, Wire
from .loads import LOAD_SETTINGS, NONE, add_load, doubtful, drawn, load_requirements, peak
from .plan import OVERDRIVE, RETURN, V_BE, V_SATURATED, Plan, class_figure

LEAST_GATE = 1e3  # ohm in series with the gate, against ringing (common practice)
BLEED = 100e3  # ohm, keeps an n-channel gate at 0V while nothing drives it
PULL = 22e3  # ohm, keeps a p-channel gate at the rail while nothing drives it
OVER = 2.0  # V above its largest threshold from which a gate is fully on, from memory
GATE_SHARE = 0.8  # of the rated gate-source voltage that is used (common practice)
CURRENT_SHARE = 0.8  # of the rated drain current that an inrush may take (common practice)
N_DROP, P_DROP = 0.3, 0.2  # V across them while on, from memory
N_CLASS, P_CLASS = "small n-channel", "p-channel switch"


def _gate(plan: Plan, kind: str, name: str, bleed: float, lost: float) -> float:
    """The resistor in ohm that divides the highest rail to what a gate bears; its tolerance of 5 % is allowed for."""
    most = GATE_SHARE * class_figure(kind, name, "v_gss", "V").low
    ohms = max(1.1 * bleed * (plan.rail.max / most - 1.0), LEAST_GATE)
    volts = (plan.arriving - lost) * bleed / (bleed + 1.1 * ohms + plan.arriving_ohms)
    least = class_figure(kind, name, "threshold", "V").high + OVER
    if volts < least:
        raise plan.refused(
            "current",
            f"a gate of {volts:.2g} V does not turn it fully on, it takes {least:.2g} V; take a driver with a"
            " bipolar transistor",
        )
    load = peak(plan)
    allowed = CURRENT_SHARE * class_figure(kind, name, "i_d_max", "A").low
    if load > allowed:
        raise plan.refused(
            "current", f"an inrush of {load:.2g} A is more than the {allowed:.2g} A it bears; take a Darlington driver"
        )
    return ohms


def _make_n(plan: Plan) -> Made:
    low, gate = plan.port("low"), plan.net("gate")
    ohms = _gate(plan, "mosfet_n", N_CLASS, BLEED, 0.0)
    plan.resistor(ohms, plan.port("in"), gate, "gate_resistor", snap="up")
    plan.resistor(BLEED, gate, RETURN, "gate_bleed_resistor")
    pins = {"drain": low, "gate": gate, "source": RETURN}
    plan.part("Q", "mosfet_n", pins, "driver", **{"class": N_CLASS})
    if plan.text("load") != NONE:
        add_load(plan, plan.text("load"), plan.port("rail"), low)
    return _made(plan, Sense.LOW_SIDE, N_DROP)


def _npn_base(plan: Plan) -> tuple[float, float]:
    """Base current in A of the npn that pulls the gate down, and its base-emitter resistor in ohm."""
    base = OVERDRIVE * plan.rail.max / PULL / plan.gain("npn")
    return base, min(max(V_BE / (0.1 * base), 1e3), 100e3)


def _intake_p(plan: Plan) -> Intake:
    base, bleed = _npn_base(plan)
    return Intake(base + V_BE / bleed)


def _make_p(plan: Plan) -> Made:
    rail, high = plan.port("rail"), plan.port("high")
    node, pull, gate = (plan.net(name) for name in ("base", "pull", "gate"))
    base, bleed = _npn_base(plan)
    below = (plan.arriving - V_BE) / (base + V_BE / bleed) - plan.arriving_ohms
    if below < 1.0:
        raise plan.refused("current", "the stage before it cannot turn its npn on; put a latch or a switch there")
    plan.capacitor(plan.quieting(("npn", 0.0, plan.supply.max)), node, RETURN, "base_capacitor_npn_device", snap="up")
    ohms = _gate(plan, "mosfet_p", P_CLASS, PULL, V_SATURATED)
    plan.resistor(below, plan.port("in"), node, "npn_base_resistor", snap="down")
    plan.resistor(bleed, node, RETURN, "base_emitter_resistor_npn_device")
    plan.transistor(pull, node, RETURN, "npn_device", current=plan.rail.max / PULL)
    plan.resistor(ohms, pull, gate, "gate_resistor", snap="up")
    plan.resistor(PULL, gate, rail, "gate_bleed_resistor")
    plan.part("Q", "mosfet_p", {"drain": high, "gate": gate, "source": rail}, "driver", **{"class": P_CLASS})
    if plan.text("load") != NONE:
        add_load(plan, plan.text("load"), high, RETURN)
    return _made(plan, Sense.HIGH_SIDE, P_DROP)


def _made(plan: Plan, sense: Sense, lost: float) -> Made:
    doubts = doubtful(plan, lost) if plan.text("load") != NONE else ()
    return Made(output=Drive(sense, drop=lost), requirements=load_requirements(plan), doubts=doubts)


def _settings(current: str) -> tuple[Setting, ...]:
    return (*LOAD_SETTINGS[:1], Setting("current", "A", current, LOAD_SETTINGS[1].about), *LOAD_SETTINGS[2:])


KINDS = (
    StageKind(
        name="mosfet_driver",
        called="driver",
        title="n-channel driver",
        place=Place.SWITCH,
        help=(
            "An n-channel transistor that pulls the load to 0V. Its gate takes no current, so a weak stage can drive"
            " it, but V_GS = V_drive,min R_bleed/(R_bleed + R_gate + R_source) must be 2 V above the largest"
            " threshold, and the same at the highest rail below 0.8 V_GSS: R_gate = R_bleed (V_max / (0.8 V_GSS) - 1)"
            " with 10 % for tolerances, at least 1k. Source: common practice; the class (60 V, 2 ohm, 0.3 A, threshold"
            " to 2.5 V) is from memory."
        ),
        ports=(IN_PORT, RAIL_PORT, Port("low", Wire.OUT, "the switched end of the load"), RETURN_PORT),
        settings=_settings("100 mA"),
        make=_make_n,
        intake=lambda plan: Intake(plan.rail.max / BLEED),
        draws=drawn,
    ),
    StageKind(
        name="p_channel_driver",
        called="driver",
        title="p-channel high-side driver",
        place=Place.SWITCH,
        help=(
            "A p-channel transistor that switches the load to the rail, with an npn that pulls its gate down: it drops"
            " I R_on where a pnp drops its saturation voltage. V_GS = (V_min - V_sat) R_pull/(R_pull + R_gate) must be"
            " 2 V above the largest threshold, and at the highest rail below 0.8 V_GSS: R_gate = R_pull (V_max / (0.8"
            " V_GSS) - 1) with 10 % for tolerances, at least 1k. The npn gets 3 x V_max / R_pull / h_FE,min. Source:"
            " common practice; the class (60 V, 0.1 ohm, 2 A, threshold 2 to 4 V) is from memory."
        ),
        ports=(IN_PORT, RAIL_PORT, Port("high", Wire.OUT, "the switched end of the load"), RETURN_PORT),
        settings=_settings("300 mA"),
        make=_make_p,
        intake=_intake_p,
        draws=drawn,
    ),
)
