"""Battery backup: a battery behind a diode that takes over when the supply goes, kept charged by a trickle."""

from __future__ import annotations

from ..parts.battery import CURVES
from ..quantity import write
from .entry import LOADS, SMALL, rated_fuse
from .kind import RETURN_PORT, WORD, Json, Made, Place, Port, Setting, StageKind, Wire
from .plan import RETURN, Plan, class_figure

CELLS = {"lead-acid 12 V": ("lead-acid 7 Ah", 1, 13.6), "lead-acid 24 V": ("lead-acid 7 Ah", 2, 27.2)}
"""Class, batteries in series and float voltage in V (2.27 V a cell, from memory)."""
FOR_EVER = {"max": "70 mA", "source": "memory"}
"""What a battery of 7 Ah bears without end: C/100."""
_RESISTANCES = ("resistance", "aged_resistance", "cold_resistance")
V_SUPPLY_DIODE, V_BATTERY_DIODE, V_TRICKLE_DIODE = 0.85, 0.45, 0.65


def _battery(generic: str, count: int) -> Json:
    """The fields of ``count`` batteries of a class in series, as one part: between two of them is no net of its own."""
    fields: Json = {"class": generic, "charge_limits": {"current": FOR_EVER}}
    if count > 1:
        rows = [[write(share, "%"), write(count * volts, "V")] for share, volts in CURVES[generic]]
        ohms = {key: class_figure("battery", generic, key, "ohm").typical for key in _RESISTANCES}
        entries = {key: {"typical": write(count * each, "ohm"), "source": "memory"} for key, each in ohms.items()}
        fields |= {"voltage": rows, "resistance": entries.pop("resistance"), "data": entries}
    return fields


def _make(plan: Plan) -> Made:
    generic, count, full = CELLS[plan.text("battery")]
    feed, rail, plus, charge = plan.port("feed"), plan.port("rail"), plan.net("plus"), plan.net("charge")
    trickle = plan.above_zero("trickle")
    room = plan.supply.nominal - V_TRICKLE_DIODE - full
    if room <= 0.2:
        raise plan.refused(
            "battery", f"{plan.supply.nominal:.3g} V cannot charge it to {full:g} V; write a smaller battery"
        )
    plan.diode(feed, rail, "reverse_diode", name="1 A rectifier")
    plan.diode(plus, rail, "battery_diode", kind="schottky", name="1 A Schottky")
    plan.resistor(room / trickle, feed, charge, "charge_resistor", snap="up")
    plan.diode(charge, plus, "charge_diode")
    # What a battery can drive through a short sets a wire on fire: the fuse stands at its terminal.
    amps = (plan.beyond.loads or LOADS) + (plan.beyond.small or SMALL)
    if rated_fuse(plan, amps, plan.net("terminal"), plus) is None:
        raise plan.refused("battery", f"no usual fuse carries the {amps:.3g} A that follow; write a smaller load")
    plan.part(
        "BT", "battery", {"plus": plan.net("terminal"), "minus": RETURN}, "standby_battery", **_battery(generic, count)
    )
    low = min(plan.supply.min - V_SUPPLY_DIODE, count * CURVES[generic][1][1] - V_BATTERY_DIODE)
    lost = {
        "events": [
            {"at": "0 s", "event": "connect supply", "rise": "20 ms"},
            {"at": "2 s", "event": "disconnect supply"},
        ],
        "ends": "4 s",
        "moments": {"standby": "1.9 s", "on_battery": "3.5 s"},
    }
    return Made(rail_drop=max(V_SUPPLY_DIODE, plan.supply.min - low), sequences={"supply_lost": lost})


KIND = StageKind(
    name="battery_backup",
    called="backup",
    title="battery backup",
    place=Place.FEED,
    help=(
        "Supply and battery feed one rail through a diode each, so that the higher one does; a resistor and a diode"
        " keep the battery charged, and a fuse of at least 1.33 I stands at its terminal. R = (V_supply -"
        " V_D - V_float)/I_trickle, next higher value; the trickle must"
        " outweigh self-discharge (lead-acid 3 % a month: 0.3 mA of 7 Ah) and stay below what the battery bears for"
        " ever (C/100). Hours come from stand-by and alarm current, age and cold. Source: common practice, from"
        " memory."
    ),
    ports=(
        Port("feed", Wire.RAIL, "the supply as it arrives"),
        Port("rail", Wire.NEW_RAIL, "the rail that goes on when the supply is gone"),
        RETURN_PORT,
    ),
    settings=(
        Setting("battery", WORD, "lead-acid 12 V", "what stands by", tuple(CELLS)),
        Setting("trickle", "A", "5 mA", "charging current when the battery is full"),
    ),
    make=_make,
    takes=(),
)
