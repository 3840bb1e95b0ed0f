"""Relay with its driver: coil, flyback clamp, and the contact that it operates."""

from __future__ import annotations

import math

from ..parts.physics import copper_factor
from ..quantity import write
from .kind import (
    IN_PORT,
    RAIL_PORT,
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
from .plan import OVERDRIVE, RETURN, V_BE, Plan, class_figure, snapped

BLEED = 0.1  # share of the base current that the base-emitter resistor may take (common practice)
SPREAD = 0.1  # of the coil's resistance
PICK_UP = (0.67, 0.87, 1.0)  # of the largest voltage to pick up, from memory
SATURATED = 0.3  # V across the driver, from memory
VOLTAGE = 0.1  # margin of the coil's voltage that is customarily asked for
DROP_OUT = ("0.1", "0.2", "0.33")  # of the rated voltage, from memory
TIME_CONSTANT = 2.5e-3  # s, L/R of a small relay: 1 H and 400 ohm, from memory
ARMATURE = ("3 ms", "5 ms", "8 ms")
BOUNCE: Json = {"for": "2 ms", "times": 3}
CLEAN = 1e-3  # A, least current of a silver contact, from memory
_LIMITS = ("min", "typical", "max")
COLLECTOR_SHARE = 0.8  # of the driver's V_CEO that is used (common practice)
LEAST_ZENER = 3.3  # V, below it zeners are soft (from memory)
FAIL_SAFE = "fail-safe"


def _current(plan: Plan) -> float:
    """The largest coil current in A: highest rail, least resistance, coldest copper."""
    cold = float(copper_factor(plan.ambient.min))
    return plan.supply.max / (plan.above_zero("coil") * (1.0 - SPREAD) * cold)


def _base(plan: Plan) -> tuple[float, float]:
    """Base current of the driver in A, and the base-emitter resistor in ohm that takes a tenth of it."""
    current = _current(plan)
    base = plan.above_zero("overdrive") * current / plan.gain("npn", current)
    return base, min(max(V_BE / (BLEED * base), 1e3), 47e3)


def _base_resistor(plan: Plan) -> float:
    base, bleed = _base(plan)
    if plan.text("mode") == FAIL_SAFE:
        return (plan.rail.min - V_BE) / (base + V_BE / bleed)
    return (plan.arriving - V_BE) / (base + V_BE / bleed) - plan.arriving_ohms


def _inverter(plan: Plan) -> tuple[float, float]:
    """Base current in A of the npn that takes the driver's base current away, and its base-emitter resistor."""
    base = OVERDRIVE * plan.rail.max / max(_base_resistor(plan), 1.0) / plan.gain("npn")
    return base, min(max(V_BE / (BLEED * base), 1e3), 100e3)


def _intake(plan: Plan) -> Intake:
    base, bleed = _inverter(plan) if plan.text("mode") == FAIL_SAFE else _base(plan)
    return Intake(base + V_BE / bleed)


def _make(plan: Plan) -> Made:
    _, bleed = _base(plan)
    node, low, rail = plan.net("base"), plan.net("low"), plan.port("rail")
    ohms, fail_safe = _base_resistor(plan), plan.text("mode") == FAIL_SAFE
    feed = plan.port("in")
    if fail_safe:
        base, inner = _inverter(plan)
        feed, turned = rail, plan.net("turned")
        into = (plan.arriving - V_BE) / (base + V_BE / inner) - plan.arriving_ohms
        ohms = ohms if into >= 1.0 else 0.0
        plan.resistor(into, plan.port("in"), turned, "inverter_base_resistor", snap="down")
        plan.resistor(inner, turned, RETURN, "base_emitter_resistor_inverting_device")
        plan.transistor(node, turned, RETURN, "inverting_device")
    if ohms < 1.0:
        raise plan.refused("coil", "the stage before cannot drive a coil of so few ohms; write more ohms")
    plan.resistor(ohms, feed, node, "base_resistor", snap="down")
    plan.resistor(bleed, node, RETURN, "base_emitter_resistor")
    plan.transistor(low, node, RETURN, "driver", current=_current(plan))
    # A coil takes no current at first: a base that is lifted for a microsecond would put the whole supply across it.
    farads = plan.quieting(("npn", _current(plan), plan.supply.max))
    plan.capacitor(farads, node, RETURN, "base_capacitor_driver", snap="up")
    coil = _add_coil(plan, rail, low)
    if plan.text("clamp") == "zener":
        # The zener stands off more than the diode alone, so that the current falls faster.
        middle = plan.net("clamped")
        plan.diode(low, middle, "flyback_diode", name="1 A rectifier")
        least = class_figure("npn", plan.transistor_class("npn", _current(plan)), "v_ceo", "V").low
        room = (COLLECTOR_SHARE * least - plan.supply.max - 1.0) / 1.1
        if room < LEAST_ZENER:
            raise plan.refused(
                "clamp", f"{plan.supply.max:.3g} V leave no room for a zener below what the driver bears"
            )
        volts = write(snapped(min(plan.above_zero("rated"), room), "E24", "down"), "V")
        plan.part("D", "zener", {"anode": rail, "cathode": middle}, "flyback_zener", value=volts, **_ZENER)
    else:
        plan.diode(low, rail, "flyback_diode", name="1 A rectifier")
    pins, form = {"a": rail, "b": plan.port("out")}, "break" if fail_safe else "make"
    fields: Json = {"form": form, "bounce": BOUNCE, "class": "silver contact"}
    plan.part("K", "contact", pins, "relay_contact", operated_by=coil, **fields)
    # A contact that switches next to nothing does not stay clean: this draws its least current, and gives 0V at rest.
    plan.resistor(plan.supply.min / CLEAN, plan.port("out"), RETURN, "pull_down", snap="down")
    asked: tuple[Json, ...] = ()
    if plan.text("release"):
        asked = ({"check": "release", "of": coil, "max": plan.text("release")},)
    return Made(output=Drive(Sense.HIGH_SIDE), requirements=asked, doubts=_starved(plan))


def _starved(plan: Plan) -> tuple[str, ...]:
    """The doubt that the hot coil does not pull in at the lowest supply."""
    hot = float(copper_factor(plan.ambient.max))
    needed = hot * plan.share("pick_up") * plan.above_zero("rated") / (1.0 - VOLTAGE)
    left = plan.fed - SATURATED
    if left >= needed:
        return ()
    share = 100.0 * left * (1.0 - VOLTAGE) / hot / plan.above_zero("rated")
    return (
        f"load_voltage: hot, its coil needs {needed:.3g} V with 10 % to spare, and of {plan.supply.min:.3g} V"
        f" {left:.3g} V are left; write pick_up {math.floor(share):.0f} %, or let the entry lose less (diode schottky)",
    )


_ZENER = {"tolerance": "5 %", "class": "zener 0.5 W"}


def _add_coil(plan: Plan, rail: str, low: str) -> str:
    rated, ohms = plan.above_zero("rated"), plan.above_zero("coil")
    henry = TIME_CONSTANT * ohms

    def limits(unit: str, *figures: float) -> Json:
        texts = (write(figure, unit, digits=3) for figure in figures)
        return {**dict(zip(_LIMITS, texts, strict=True)), "source": "memory"}

    fields: Json = {
        "resistance": limits("ohm", (1.0 - SPREAD) * ohms, ohms, (1.0 + SPREAD) * ohms),
        "inductance": limits("H", 0.8 * henry, henry, 1.2 * henry),
        "pick_up": limits("V", *(share * plan.share("pick_up") * rated for share in PICK_UP)),
        "drop_out": limits("V", *(float(share) * rated for share in DROP_OUT)),
        "armature_delay": {**dict(zip(_LIMITS, ARMATURE, strict=True)), "source": "memory"},
    }
    return plan.part("K", "coil", {"a": rail, "b": low}, "load", **fields)


KIND = StageKind(
    name="relay_driver",
    called="relay",
    title="relay and its driver",
    place=Place.SWITCH,
    help=(
        "A transistor that draws a coil's current, a clamp for the coil's energy, and a contact. I_coil = V_max / (0.9"
        " R20 (234.5 + T_min)/254.5); I_B = overdrive x I_coil / h_FE,min. The hot coil needs V20 (234.5 + T)/254.5 to"
        " pick up: the lowest supply less all drops must reach it. It lets go after L/R ln((I R + V_k)/(I_do R + V_k)):"
        " a plain diode holds it thrice as long as a zener (rated voltage, or what 0.8 V_CEO - V_max leaves)."
        " Fail-safe: pulled in at rest, so that a lost supply alarms. Mains on a contact: isolation, clearances, fuse,"
        " a qualified person. Source: common practice (75 % to pick up, 10 % to drop out); decay in closed form."
    ),
    ports=(IN_PORT, RAIL_PORT, Port("out", Wire.OUT, "what its contact switches to the rail"), RETURN_PORT),
    settings=(
        Setting("coil", "ohm", "400R", "resistance of the coil at 20 C"),
        Setting("rated", "V", "12 V", "rated voltage of the coil"),
        Setting("pick_up", "%", "75 %", "of its rated voltage at which it picks up at 20 C, at most"),
        Setting("mode", WORD, "pulls in", "in an alarm, or it lets go in one", ("pulls in", FAIL_SAFE)),
        Setting("clamp", WORD, "diode", "a plain diode, or a zener in series for a quick release", ("diode", "zener")),
        Setting("release", "s", "", "within which its contact must open; empty: not asked for"),
        Setting("overdrive", "", "3", "times the least base current"),
    ),
    make=_make,
    intake=_intake,
    draws=_current,
)
