"""Contacts that start an alarm: normally open or normally closed, at the end of a lead."""

from __future__ import annotations

from functools import partial

from ..quantity import write
from .held import held, held_setting
from .kind import OUT_PORT, QUIET_PORT, RETURN_PORT, Drive, Json, Made, Place, Sense, Setting, StageKind
from .plan import RETURN, Plan

FALL = 0.1  # of the rail that the pull-up may lose to what follows
SPARE = 1.1  # times the wetting current: what the tolerance of the resistor takes
MUCH = 50e-3  # A, more than that is not spent on a contact at rest (from memory)
HELD = 1.0  # s that it is held where nothing else is said or needed
LEAD_INSULATION = "20M"  # of the whole lead against 0V, wet, from memory
PER_METRE = {"resistance": "0.08 ohm/m", "capacitance": "100 pF/m"}
"""A pair of 0.22 mm2, there and back, from memory. Its inductance rings at megahertz, far above what follows hears."""
_SETTINGS = (
    Setting("wetting", "A", "1 mA", "least current through the closed contact: 1 mA silver, 10 uA gold"),
    Setting("bounce", "s", "2 ms", "how long it bounces"),
    held_setting(HELD, "how long the event lasts"),
    Setting("lead", "m", "0 m", "length of the lead to it; 0 for none"),
)


def _make(plan: Plan, normally_open: bool) -> Made:
    rail, out = plan.port("rail"), plan.port("out")
    far = _lead(plan, out)
    fields: Json = {"data": {"minimum_current": {"typical": plan.text("wetting"), "source": "memory"}}}
    if normally_open:
        contact = plan.part("S", "contact", {"a": rail, "b": far}, "contact", form="make", **fields)
        plan.resistor(_wetted(plan), out, RETURN, "pull_down", snap="down")
        drive = Drive(Sense.LEVEL)
    else:
        contact = plan.part("S", "contact", {"a": far, "b": RETURN}, "contact", form="break", **fields)
        value = plan.resistor(_pull_up(plan), rail, out, "pull_up", snap="down")
        drive = Drive(Sense.LEVEL, ohms=value)
    begins, ends = ("close", "open") if normally_open else ("open", "close")
    bounce, event = plan.number("bounce"), held(plan, HELD)
    settles: Json = {"bounce": {"for": write(bounce, "s"), "times": 3}} if bounce > 0.0 else {}
    acts = (
        (0.0, {"event": begins, "part": contact, **settles}),
        (event.time, {"event": ends, "part": contact}),
    )
    doubts = event.doubts if normally_open else (*event.doubts, *_thirsty(plan))
    return Made(output=drive, acts=acts, lasts=event.lasts, doubts=doubts)


def _wetted(plan: Plan) -> float:
    """The resistor in ohm through which the closed contact gets its wetting current."""
    return plan.rail.min / (SPARE * plan.above_zero("wetting"))


def _pull_up(plan: Plan) -> float:
    """The same, so low that what follows can draw its current through it."""
    ohms = _wetted(plan)
    return min(ohms, FALL * plan.rail.min / plan.next.current) if plan.next.current > 0.0 else ohms


def _rests(plan: Plan) -> float:
    """What a contact that is closed at rest draws then, A."""
    return plan.rail.max / _pull_up(plan)


def _thirsty(plan: Plan) -> tuple[str, ...]:
    """The doubt about a contact that is closed at rest and would draw much, to feed what follows once it opens."""
    if _rests(plan) <= MUCH:
        return ()
    taken, rests = (write(each, "A", digits=2) for each in (plan.next.current, _rests(plan)))
    return (
        f"stand-by current: what follows takes {taken} through its pull-up, which draws {rests} while the contact is"
        " closed; put a Schmitt trigger or a latch behind it",
    )


def _lead(plan: Plan, net: str) -> str:
    """The far end of the lead to the contact; ``net`` itself where there is none."""
    metres = plan.number("lead")
    if metres <= 0.0:
        return net
    far = plan.net("far")
    plan.part(
        "W",
        "lead",
        {"from": net, "to": far},
        "lead",
        length=write(metres, "m"),
        insulation=LEAD_INSULATION,
        **PER_METRE,
    )
    return far


KINDS = (
    StageKind(
        name="contact_no",
        called="contact",
        title="contact, normally open",
        place=Place.SENSE,
        help=(
            "A contact that closes to the rail, with a resistor that pulls its net to 0V while it is open. R = V_min /"
            " wetting current, next lower preferred value: an oxide film wants 1 mA on silver, 10 uA on gold; a low R"
            " also outweighs the leakage of a wet lead. Source: common practice, from memory."
        ),
        ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
        settings=_SETTINGS,
        make=partial(_make, normally_open=True),
        takes=(),
    ),
    StageKind(
        name="contact_nc",
        called="contact",
        title="contact, normally closed",
        place=Place.SENSE,
        help=(
            "A contact that holds its net at 0V until it opens, or its lead is cut, and a resistor pulls the net up."
            " R = V_min / wetting current, at most a tenth of V_min over what the next stage draws, next lower"
            " preferred value; it is the source of whatever follows, so the next stage counts it into its own base"
            " resistor. Source: common practice, from memory."
        ),
        ports=(QUIET_PORT, OUT_PORT, RETURN_PORT),
        settings=_SETTINGS,
        make=partial(_make, normally_open=False),
        takes=(),
        rests=_rests,
    ),
)
