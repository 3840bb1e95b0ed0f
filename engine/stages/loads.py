"""Loads that a driver brings along or that stand as a stage of their own: sounder and piezo element."""

from __future__ import annotations

import math

from ..quantity import write
from .kind import WORD, Json, Setting
from .plan import Plan

NONE = "none"
LOAD_SETTINGS = (
    Setting("load", WORD, "sounder", "what it switches; none: the next stage of the row", ("sounder", "piezo", NONE)),
    Setting("current", "A", "150 mA", "largest current of the load at the nominal supply"),
    Setting("works_from", "V", "", "on above it; empty: half of the nominal rail behind an entry"),
    Setting("sound_level", "dB", "95 dB", "of a sounder at 1 m"),
    Setting("heard", "dB", "", "what is needed at the distance; empty: not asked for"),
    Setting("distance", "m", "1 m", "at which it must be heard"),
)
LOUDNESS = 0.3  # margin, in parts of 10 dB, of a sound that is customarily asked for
ROOM = 0.3  # dB that are advised beyond, for what switches it drops a little more in the cold
VOLTAGE = 0.1  # margin of a load's voltage that is customarily asked for
TYPICAL = 0.8  # of the largest current, from memory
SURGE = {"sounder": 2.0, "piezo": 1.2}
"""Inrush in parts of the largest current (from memory)."""


def _own(plan: Plan) -> float:
    """The current in A of a load that the stage brings along, or is asked to switch where none follows."""
    if plan.text("load") == NONE and plan.next.current:
        return 0.0
    return plan.above_zero("current")


def _behind(plan: Plan) -> float:
    """The current in A of loads that are stages of their own and hang on its switched net."""
    return plan.next.current if plan.next.passes or plan.text("load") == NONE else 0.0


def switched(plan: Plan) -> float:
    """The largest current in A of all that it switches, at the nominal supply: its own load and those behind it."""
    return _own(plan) + _behind(plan)


def both(plan: Plan) -> str:
    """What to write where a driver has a load of its own beside those behind it, which may not be meant; else empty."""
    return "write load none, it switches one of its own beside those behind it" if _own(plan) and _behind(plan) else ""


def drawn(plan: Plan) -> float:
    """What a load that a driver brings along draws at the highest supply, A; that of the next stage is its own."""
    if plan.text("load") == NONE:
        return 0.0
    return plan.above_zero("current") * plan.supply.max / plan.supply.nominal


def doubtful(plan: Plan, lost: float) -> tuple[str, ...]:
    """What will not hold of a load that loses ``lost`` V in whatever switches it: its voltage, how loud it is."""
    return starved(plan, lost, works_from(plan)) + _quiet(plan, lost)


def _quiet(plan: Plan, lost: float) -> tuple[str, ...]:
    # An entry reckons with what the source loses; without one it is lost all the same.
    source = plan.source * plan.above_zero("current") if plan.fed == plan.supply.min else 0.0
    left = (plan.fed - lost - source) / plan.supply.nominal
    if not plan.text("heard") or left <= 0.0:
        return ()
    # It is as much quieter as its voltage is lower, and as it is further away.
    there = plan.number("sound_level") + 20.0 * math.log10(left / plan.above_zero("distance"))
    missing = plan.number("heard") + 10.0 * LOUDNESS - there
    if missing <= 0.0:
        return ()
    louder = math.ceil(plan.number("sound_level") + missing + ROOM)
    return (
        f"sound_level: at the lowest supply {there:.1f} dB arrive at {plan.text('distance')}, and with 3 dB to spare"
        f" {plan.number('heard') + 10.0 * LOUDNESS:g} dB must; write sound_level {louder:g} dB or a shorter distance",
    )


def starved(plan: Plan, lost: float, works_from: float) -> tuple[str, ...]:
    """What will not hold of a load's voltage, of which ``lost`` V are lost in whatever switches it."""
    left, needed = plan.fed - lost, works_from / (1.0 - VOLTAGE)
    if left >= needed:
        return ()
    enough = _below((1.0 - VOLTAGE) * left)
    lower = f"write works_from {write(enough, 'V', digits=2)} or less, or " if enough > 0.0 else ""
    return (
        f"load_voltage: of {plan.supply.min:.3g} V {left:.3g} V are left for the load, which needs {needed:.3g} V with"
        f" 10 % to spare; {lower}feed it more",
    )


def _below(value: float) -> float:
    """A value of two digits that is no larger; 0 where it is none above zero."""
    if value <= 0.0:
        return 0.0
    step = 10.0 ** (math.floor(math.log10(value)) - 1)
    return math.floor(value / step + 1e-9) * step


def peak(plan: Plan) -> float:
    """The inrush in A of all that it switches at the highest supply; that of a sounder where it is not known."""
    usual = max(SURGE.values())
    own = SURGE.get(plan.text("load"), usual) * _own(plan)
    return (own + (plan.next.surge or usual) * _behind(plan)) * plan.supply.max / plan.supply.nominal


def carried(plan: Plan) -> float:
    """The collector current in A that a base is driven for: ``overdrive`` times the load's, or a known inrush with
    the customary 20 % to spare if that is more."""
    wanted = plan.above_zero("overdrive") * switched(plan)
    return wanted if plan.next.surge is None or not _behind(plan) else max(wanted, peak(plan) / 0.8)


def works_from(plan: Plan) -> float:
    """The voltage above which the load counts as on."""
    return plan.above_zero("works_from") if plan.text("works_from") else 0.5 * plan.rail.nominal


def add_load(plan: Plan, kind: str, plus: str, minus: str) -> str:
    """The load between two nets, in the role ``load``; returns its designator."""
    current = plan.above_zero("current")
    data: dict[str, object] = {
        "current": {"typical": write(TYPICAL * current, "A"), "max": write(current, "A"), "source": "memory"},
        "rated_voltage": write(plan.supply.nominal, "V"),
        "operating_minimum": write(works_from(plan), "V"),
        "sound_level": {"typical": plan.text("sound_level"), "source": "memory"},
        "surge": {"typical": write(SURGE[kind] * current, "A"), "source": "memory"},
    }
    if kind == "piezo":
        data["capacitance"] = "20 nF"
    return plan.part("LS", kind, {"plus": plus, "minus": minus}, "load", data=data)


def load_requirements(plan: Plan) -> tuple[Json, ...]:
    """What is asked of the load, where something is."""
    if "load" not in plan.roles or not plan.text("heard"):
        return ()
    heard = {"min": plan.text("heard"), "distance": plan.text("distance")}
    return ({"check": "sound_level", "of": plan.roles["load"], "sequence": "alarm", **heard},)
