"""A transistor's law as the document gives it, and what it shares with one that is made of figures.

Transport law after Ebers, Moll, Proc. IRE 42 (1954) 1761, with the Early effect (Early, Proc. IRE 40 (1952) 1401).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import constant
from ..primitives.columns import Group
from .physics import gain_factor, saturation_factor, thermal_voltage

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Laws

EMITTER_GRADING, COLLECTOR_GRADING = 0.5, 0.5  # abrupt junctions, textbook value
RECOMBINATION = 2.0  # ideality of the base current at the low end (Sah, Noyce, Shockley, Proc. IRE 45 (1957) 1228)
BREAKDOWN_SLOPE = 0.05  # V per e-fold of the emitter junction's breakdown, from memory
BREAKDOWN_CURRENT = 10e-6  # A at the breakdown voltage


def given_law(part: Part, build: Builder, ref: str) -> Laws:
    """The law that the document gives directly: nothing is added to it."""

    def given(key: str, unit: str, default: float | None = None) -> tuple[float, float, float] | None:
        found = part.law_limits(key, unit)
        if found is None:
            return None if default is None else (default, default, default)
        middle = next(v for v in (found.typical, found.min, found.max) if v is not None)
        return middle, middle if found.min is None else found.min, middle if found.max is None else found.max

    saturation = given("saturation_current", "A")
    gain = given("forward_gain", "")
    if saturation is None or gain is None:
        missing, example = ("saturation_current", "10 fA") if saturation is None else ("forward_gain", "100")
        raise CircuitError(f'part {part.ref}, law {missing}: missing; write it like "{missing}": "{example}"')
    saturation_key = build.column(ref, "saturation_current", *saturation)
    gain_key = build.column(ref, "gain", *gain, group=Group.GAIN, logarithmic=True)
    ideality = (given("ideality", "", 1.0) or (1.0,))[0]
    reverse = (given("reverse_gain", "", 1.0) or (1.0,))[0]
    early = given("early_voltage", "V")
    fixed = given("thermal_voltage", "V")
    one_sided = part.law.get("collector_junction") is False

    def slope(celsius: Floats) -> Floats:
        return np.full_like(celsius, fixed[0]) if fixed is not None else ideality * thermal_voltage(celsius)

    def moved(celsius: Floats) -> Floats:
        return np.ones_like(celsius) if fixed is not None else saturation_factor(celsius, ideality)

    def amplification(celsius: Floats) -> Floats:
        return np.ones_like(celsius) if fixed is not None else gain_factor(celsius)

    laws: Laws = {
        "per_forward_gain": lambda lanes: 1.0 / (lanes[gain_key] * amplification(lanes.ambient)),
        "per_reverse_gain": lambda lanes: 1.0 / reverse,
        "per_early_voltage": lambda lanes: 0.0 if early is None else 1.0 / early[0],
        "collector_junction": lambda lanes: 0.0 if one_sided else 1.0,
    }
    for side, capacitance, transit, grading in (
        ("emitter", "base_emitter_capacitance", "forward_transit_time", EMITTER_GRADING),
        ("collector", "base_collector_capacitance", "reverse_transit_time", COLLECTOR_GRADING),
    ):
        farads = (given(capacitance, "F", 0.0) or (0.0,))[0]
        seconds = (given(transit, "s", 0.0) or (0.0,))[0]
        laws |= {
            f"{side}_saturation": lambda lanes: lanes[saturation_key] * moved(lanes.ambient),
            f"{side}_slope": lambda lanes: slope(lanes.ambient),
            f"{side}_capacitance": constant(farads),
            f"{side}_transit": constant(seconds),
            f"{side}_grading": constant(grading),
        }
    breakdown = given("base_emitter_breakdown", "V")
    if breakdown is not None:
        laws |= breaking_down(breakdown[0])
    knee, recombination = given("knee_current", "A"), given("recombination_current", "A")
    if knee is not None:
        laws["per_knee_current"] = constant(1.0 / knee[0])
    if recombination is not None:
        steeper = (given("recombination_ideality", "", RECOMBINATION) or (RECOMBINATION,))[0]
        laws |= {
            "recombination_saturation": lambda lanes: recombination[0] * moved(lanes.ambient) ** (ideality / steeper),
            "recombination_slope": lambda lanes: slope(lanes.ambient) * (steeper / ideality),
        }
    return laws


def breaking_down(volts: float) -> Laws:
    """Breakdown of the emitter junction."""
    return {
        "emitter_breakdown": lambda lanes: volts,
        "emitter_breakdown_slope": lambda lanes: BREAKDOWN_SLOPE,
        "emitter_breakdown_current": lambda lanes: BREAKDOWN_CURRENT,
    }


def given_resistances(part: Part) -> dict[str, float]:
    """Base and collector resistance in ohm that the law gives; nothing where it gives none."""
    found = {}
    for key in ("base_resistance", "collector_resistance"):
        limits = part.law_limits(key, "ohm")
        if limits is not None:
            found[key] = next(v for v in (limits.typical, limits.min, limits.max) if v is not None)
    return found
