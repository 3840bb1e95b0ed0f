"""Filament lamp on whatever switches it."""

from __future__ import annotations

from ..quantity import write
from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Intake, Made, Place, Sense, Setting, StageKind
from .plan import RETURN, Plan

SPREAD = 0.1  # of its current, from memory
COLD = ("10", "12", "14")  # times the hot current that flows into a cold filament, from memory
GLOWS = 0.5  # of the nominal supply from which a lamp counts as on


def _current(plan: Plan) -> float:
    return plan.above_zero("power") / plan.supply.nominal


def _make(plan: Plan) -> Made:
    if plan.drive is None:
        ends = plan.port("rail"), RETURN
    elif plan.drive.sense is Sense.LOW_SIDE:
        ends = plan.port("rail"), plan.port("in")
    else:
        ends = plan.port("in"), RETURN
    current = _current(plan)
    limits = {"min": 1.0 - SPREAD, "typical": 1.0, "max": 1.0 + SPREAD}
    fields = {
        "current": {**{key: write(share * current, "A") for key, share in limits.items()}, "source": "memory"},
        "operating_minimum": write(GLOWS * plan.supply.nominal, "V"),
        "data": {
            "rated_voltage": write(plan.supply.nominal, "V"),
            "cold_ratio": {**dict(zip(limits, COLD, strict=True)), "source": "memory"},
        },
    }
    plan.part("H", "lamp", dict(zip(("a", "b"), ends, strict=True)), "load", **fields)
    return Made()


KIND = StageKind(
    name="lamp",
    title="filament lamp",
    place=Place.LOAD,
    help=(
        "A filament lamp of its power at the nominal supply, I = P/V. Cold it takes 10 to 14 times that for some tens"
        " of milliseconds: whatever switches it must bear V/R_cold, and so must its base current: I_B = 1.25 x 14 I /"
        " h_FE,min where that is more than the overdrive asks for. It burns who touches it. Source: common practice,"
        " from memory."
    ),
    ports=(IN_PORT, RAIL_PORT, RETURN_PORT),
    settings=(Setting("power", "W", "2 W", "at the nominal supply"),),
    make=_make,
    takes=(Sense.LOW_SIDE, Sense.HIGH_SIDE, Sense.LEVEL),
    intake=lambda plan: Intake((1.0 + SPREAD) * _current(plan), passes=True, surge=float(COLD[-1])),
    draws=lambda plan: (1.0 + SPREAD) * _current(plan) * plan.supply.max / plan.supply.nominal,
)
