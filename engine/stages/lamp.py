"""Filament lamp on whatever switches it."""

from __future__ import annotations

from ..quantity import write
from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Intake, Json, Made, Place, Sense, Setting, StageKind
from .loads import starved
from .plan import RETURN, Plan

SPREAD = 0.1  # of its current, from memory
COLD = ("10", "12", "14")  # times the hot current that flows into a cold filament, from memory
GLOWS = 0.6  # of the nominal rail from which a lamp counts as on: a sixth of its light there (V^3.4; common practice)


def _current(plan: Plan) -> float:
    return plan.above_zero("power") / plan.supply.nominal


def _works_from(plan: Plan) -> float:
    """The voltage above which it counts as on."""
    return plan.above_zero("works_from") if plan.text("works_from") else GLOWS * plan.rail.nominal


def _said(plan: Plan) -> Json:
    """Who says so."""
    if plan.text("works_from"):
        return {"condition": "as asked of the stage"}
    return {"source": "memory", "condition": f"{GLOWS:g} of the nominal rail, common practice"}


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
        "operating_minimum": {"typical": write(_works_from(plan), "V"), **_said(plan)},
        "data": {
            "rated_voltage": write(plan.supply.nominal, "V"),
            "cold_ratio": {**dict(zip(limits, COLD, strict=True)), "source": "memory"},
        },
    }
    plan.part("H", "lamp", dict(zip(("a", "b"), ends, strict=True)), "load", **fields)
    return Made(doubts=starved(plan, 0.0 if plan.drive is None else plan.drive.drop, _works_from(plan)))


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
    settings=(
        Setting("power", "W", "2 W", "at the nominal supply"),
        Setting("works_from", "V", "", f"on above it; empty: {GLOWS:g} of the nominal rail behind an entry"),
    ),
    make=_make,
    takes=(Sense.LOW_SIDE, Sense.HIGH_SIDE, Sense.LEVEL),
    intake=lambda plan: Intake((1.0 + SPREAD) * _current(plan), passes=True, surge=float(COLD[-1])),
    draws=lambda plan: (1.0 + SPREAD) * _current(plan) * plan.supply.max / plan.supply.nominal,
)
