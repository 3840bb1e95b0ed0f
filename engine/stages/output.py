"""The output that many stages share: a pnp on the rail that a collector going low turns on."""

from __future__ import annotations

from dataclasses import dataclass

from .kind import Drive, Sense
from .plan import OVERDRIVE, V_BE, V_SATURATED, Plan

LEAST_OUTPUT = 0.2e-3  # A that an output is made for where nothing is known of what follows
MOST_BLEED = 100e3  # ohm
HELP = (
    "The output is a pnp with I_B = 3 x I_out / h_FE,min, so that out reaches the rail; its base has C = C_ob V_max"
    " / (0.3 V_BE), C_ob of both transistors, so that a rail that comes at once does not turn it on."
)


@dataclass(frozen=True)
class Output:
    """The two resistors of the pnp, and the current in A that turns it on."""

    current: float
    ohms: float
    bleed: float


def sized(plan: Plan) -> Output:
    """The output for what the next stage takes."""
    wanted = max(plan.next.current, LEAST_OUTPUT)
    base = OVERDRIVE * wanted / plan.gain("pnp", wanted)
    bleed = min(max(V_BE / (0.2 * base), 1e3), MOST_BLEED)
    current = base + V_BE / bleed
    return Output(current, (plan.arriving - V_BE - V_SATURATED) / current, bleed)


def add_output(plan: Plan, output: Output, low: str, rail: str) -> Drive:
    """The pnp with its resistors: ``low`` turns it on, ``rail`` feeds it, the port ``out`` is its collector."""
    base = plan.net("drive")
    plan.resistor(output.ohms, low, base, "output_base_resistor", snap="down")
    plan.resistor(output.bleed, rail, base, "base_emitter_resistor_output_device")
    plan.transistor(plan.port("out"), base, rail, "output_device", kind="pnp", current=plan.next.current)
    # Where its rail is switched on by an edge, its base hangs on the collector that is to turn it on and on its own:
    # without this, all that follows would see a pulse.
    step = plan.rail.max
    farads = plan.quieting(("npn", 0.0, step), ("pnp", plan.next.current, step))
    plan.capacitor(farads, rail, base, "base_capacitor_output_device", snap="up")
    fed_through = 0.0 if plan.drive is None or rail != plan.port("in") else plan.drive.drop
    return Drive(Sense.LEVEL, drop=V_SATURATED + fed_through)
