"""What astable, monostable and bistable share: a cross-coupled pair and how its resistors follow from the output."""

from __future__ import annotations

from dataclasses import dataclass

from .kind import Drive
from .output import add_output, sized
from .plan import OVERDRIVE, RETURN, V_BE, V_DIODE, V_REVERSE, V_SATURATED, Plan

COLLECTOR = 10e3  # ohm, collector resistor where the output does not ask for a smaller one
BLEED = 100e3  # ohm, across a base-emitter junction behind a diode
MOST_TIMING = 1e6  # ohm
LEAST_BASE = 10e-6  # A, so that no base hangs on megohms (common practice)
V_ON, V_BEGINS = 0.60, 0.48  # V, base-emitter voltage while on, and at V_T/R_C where switching begins (class)
V_DIODE_ON, V_DIODE_BEGINS = 0.42, 0.33  # V, of the diode before a base at the same instants (class)


@dataclass(frozen=True)
class Half:
    """One transistor of a pair: its collector current in A, and the least base current that saturates it threefold."""

    collector: float
    base: float


def half(plan: Plan, ohms: float, extra: float = 0.0) -> Half:
    """The transistor that draws the rail through ``ohms`` and ``extra`` A beside it."""
    collector = plan.rail.max / ohms + extra
    return Half(collector, OVERDRIVE * collector / plan.gain())


def guarded(plan: Plan) -> bool:
    """Whether the swing of a timing capacitor would drive a base beyond what it bears in reverse."""
    return plan.rail.max - V_BE > V_REVERSE


def threshold(plan: Plan) -> float:
    """The voltage in V that a timing node has while its transistor is on, with some current to spare."""
    return V_BE + (V_DIODE if guarded(plan) else 0.0)


def most_timing(plan: Plan, base: float) -> float:
    """The largest timing resistor in ohm that still gives a base its current at the lowest rail."""
    drained = V_BE / BLEED if guarded(plan) else 0.0
    return min((plan.arriving - threshold(plan)) / (base + drained), MOST_TIMING)


def add_base(plan: Plan, node: str, name: str) -> str:
    """The base behind a timing node: the node itself, or a diode and a bleed resistor. Returns the base's net."""
    if not guarded(plan):
        return node
    base = plan.net(name)
    plan.diode(node, base, f"base_diode_{name}")
    plan.resistor(BLEED, base, RETURN, f"base_emitter_resistor_{name}")
    return base


def swing(plan: Plan) -> float:
    """(2V - V_on - V_sat)/(V - V_th) at the nominal rail: what the logarithm of a timed half is taken of.

    A transistor begins to switch where g_m R_C = 1, at V_T/R_C: its V_th is below the V_on of the conducting one.
    """
    volts = plan.rail.nominal - (0.0 if plan.drive is None else plan.drive.drop)
    on, begins = (a + (b if guarded(plan) else 0.0) for a, b in ((V_ON, V_DIODE_ON), (V_BEGINS, V_DIODE_BEGINS)))
    return (2.0 * volts - on - V_SATURATED) / (volts - begins)


def output_base(plan: Plan) -> float:
    """Base current in A of the npn that turns the output on."""
    return max(OVERDRIVE * sized(plan).current / plan.gain(), LEAST_BASE)


def add_separate_output(plan: Plan, collector: str, rail: str) -> Drive:
    """The pnp output with an npn of its own, which is on while ``collector`` is high.

    A collector with a timing capacitor rises slowly: the output would hang on it while the capacitor recovers.
    """
    base, low = plan.net("output_base"), plan.net("output_low")
    plan.resistor((plan.arriving - V_BE) / output_base(plan), collector, base, "output_npn_base_resistor", snap="down")
    plan.transistor(low, base, RETURN, "output_npn")
    plan.capacitor(plan.quieting(("npn", 0.0, plan.rail.max)), base, RETURN, "base_capacitor_output_npn", snap="up")
    return add_output(plan, sized(plan), low, rail)
