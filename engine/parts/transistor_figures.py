"""A transistor's law made of datasheet or class figures, each by a published method.

Saturation: Ebers, Moll, Proc. IRE 42 (1954) 1761. Gain at both ends: ``gain.py``. The forward transit time is 1/(2 pi
f_T) less the charging time of the junctions (textbook form), taken with their capacitances at no bias: f_T comes back
within 12 %. Capacitances are brought from their bias to none by the depletion law of an abrupt junction.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import constant
from ..primitives.columns import Group
from .curve import points_of
from .figures import figure, needed, typical
from .gain import GainLaw, gain_law
from .leakage import kelvin_per_doubling
from .physics import REFERENCE, doubling, gain_factor, saturation_factor, thermal_voltage
from .points import forward_law, saturation_law
from .transistor_law import COLLECTOR_GRADING, EMITTER_GRADING, RECOMBINATION, breaking_down

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Laws
    from ..primitives.columns import Lanes

BUILT_IN = 0.75  # V, from memory
REVERSE_TRANSIT = 20.0  # times the forward transit time, from memory
GAIN_EXAMPLE = '[["0.1 mA", "100"], ["100 mA", "80"]]'


def reverse_gain_from(drop: float, forced: float, forward: float) -> float:
    """Reverse gain from one saturation point: V_CE = V_T ln[(1 + (b + 1)/B_R) / (1 - b/B_F)] (Ebers, Moll 1954).

    ``drop`` in V at forced gain ``forced``; the resistive part of the drop is taken as none.
    """
    if forced >= forward:
        raise ValueError("the forced gain must be below the forward gain")
    inner = math.exp(min(drop / float(thermal_voltage(REFERENCE)), 60.0)) * (1.0 - forced / forward)
    return (forced + 1.0) / max(inner - 1.0, 1e-6)


def at_zero_bias(capacitance: float, reverse: float, grading: float) -> float:
    """Zero-bias depletion capacitance from its value at a reverse voltage."""
    return capacitance * float((1.0 + reverse / BUILT_IN) ** grading)


def law_of_figures(part: Part, build: Builder, ref: str, share: float) -> Laws:
    """The law made of datasheet or class figures; ``share`` is the exponent of the gain (0.5 in a pair)."""
    gain = needed(part, "gain", "", "200")
    gain_key = build.column(
        ref, "gain", gain.typical**share, gain.low**share, gain.high**share, group=Group.GAIN, logarithmic=True
    )
    forward = gain.typical**share
    falls = _fall_off(part) if share == 1.0 else None
    drop = needed(part, "v_be", "V", "0.64 V")
    drop_key = build.column(ref, "v_be", *drop.limits)
    drop_current = typical(part, "v_be_current", "A", 2e-3)
    # What of the figure drops on the way to the junction, in the base resistance.
    at_drop, at_saturation = forward, forward
    boosted = drop_current
    if falls is not None:
        at_drop *= float(falls.share(drop_current))
        at_saturation *= float(falls.share(typical(part, "saturation_current_at", "A", 10e-3)))
        boosted *= 1.0 + drop_current * falls.per_knee
    before = drop_current / at_drop * resistances(part, share).get("base_resistance", 0.0)
    if before >= drop.low:
        raise CircuitError(f"part {part.ref}, base_resistance: it alone drops more than v_be; write a smaller one")
    forced = min(typical(part, "forced_gain", "", 20.0), 0.5 * at_saturation)
    saturated = _saturation(part, share)
    reverse = (
        reverse_gain_from(typical(part, "v_ce_sat", "V", 0.1), forced, at_saturation)
        if saturated is None
        else saturated[0]
    )
    early = typical(part, "early_voltage", "V", 80.0)
    ob = figure(part, "c_ob", "F")
    ib = figure(part, "c_ib", "F")
    per_ob = at_zero_bias(1.0, typical(part, "c_ob_bias", "V", 10.0), COLLECTOR_GRADING)
    collector_c = 0.0 if ob is None else per_ob * ob.typical
    emitter_c = 0.0 if ib is None else at_zero_bias(ib.typical, typical(part, "c_ib_bias", "V", 0.5), EMITTER_GRADING)
    ob_key = None if ob is None else build.column(ref, "c_ob", *ob.limits)
    transition = typical(part, "f_t", "Hz", 0.0)
    forward_transit = 0.0
    if transition > 0.0:
        total = 1.0 / (2.0 * math.pi * transition)
        at = typical(part, "f_t_current", "A", 10e-3)
        forward_transit = max(0.2 * total, total - (emitter_c + collector_c) * float(thermal_voltage(REFERENCE)) / at)
    leak = figure(part, "i_cbo", "A")

    def per_gain(lanes: Lanes) -> Floats:
        return np.asarray(1.0 / (lanes[gain_key] * gain_factor(lanes.ambient)))

    laws: Laws = {
        "per_forward_gain": per_gain if falls is None else lambda lanes: falls.mid * per_gain(lanes),
        "per_reverse_gain": lambda lanes: 1.0 / reverse,
        "per_early_voltage": lambda lanes: 1.0 / early,
        "collector_junction": lambda lanes: 1.0,
    }
    for side in ("emitter", "collector"):
        laws[f"{side}_saturation"] = lambda lanes: (
            boosted
            / np.expm1((lanes[drop_key] - before) / thermal_voltage(REFERENCE))
            * saturation_factor(lanes.ambient)
        )
        laws[f"{side}_slope"] = lambda lanes: thermal_voltage(lanes.ambient)
        laws[f"{side}_potential"] = lambda lanes: BUILT_IN
    laws |= {
        "emitter_capacitance": lambda lanes: emitter_c,
        "emitter_grading": lambda lanes: EMITTER_GRADING,
        "emitter_transit": lambda lanes: forward_transit,
        "collector_capacitance": constant(0.0) if ob_key is None else lambda lanes: per_ob * lanes[ob_key],
        "collector_grading": lambda lanes: COLLECTOR_GRADING,
        "collector_transit": lambda lanes: REVERSE_TRANSIT * forward_transit,
    }
    if falls is not None:
        saturation = laws["emitter_saturation"]
        laws |= {
            "gain_current": constant(falls.at),
            "per_knee_current": constant(falls.per_knee),
            "recombination_saturation": lambda lanes: (
                falls.recombination * per_gain(lanes) * np.sqrt(np.asarray(saturation(lanes)))
            ),
            "recombination_slope": lambda lanes: RECOMBINATION * thermal_voltage(lanes.ambient),
        }
    if leak is not None:
        leak_key = build.column(ref, "i_cbo", *leak.limits, logarithmic=True)
        step = kelvin_per_doubling(part, "i_cbo", leak)
        laws["collector_leakage"] = lambda lanes: lanes[leak_key] * doubling(lanes.ambient, step)
    breakdown = figure(part, "base_emitter_breakdown", "V")
    if breakdown is not None:
        laws |= breaking_down(breakdown.typical)
    return laws


def _fall_off(part: Part) -> GainLaw | None:
    """How the gain falls off at both ends, where the part gives it at several currents."""
    points = points_of(part, "gain_points", ("A", ""), GAIN_EXAMPLE)
    if points is None:
        return None
    at = needed(part, "gain_current", "A", "2 mA").typical
    least = needed(part, "gain", "", "200").low
    try:
        return gain_law([*(point for point in points if point[0] != at), (at, least)], at)
    except CircuitError as refusal:
        raise CircuitError(f'part {part.ref}, gain_points: {refusal}; write "gain_points": {GAIN_EXAMPLE}') from refusal


def resistances(part: Part, share: float) -> dict[str, float]:
    """Base and collector resistance in ohm: as written, else from a second base-emitter or saturation point."""
    found = {}
    second = figure(part, "v_be_high", "V")
    if part.entry("base_resistance") is not None:
        found["base_resistance"] = typical(part, "base_resistance", "ohm", 0.0)
    elif second is not None:
        low = needed(part, "v_be", "V", "0.64 V").typical, typical(part, "v_be_current", "A", 2e-3)
        high = second.typical, needed(part, "v_be_high_current", "A", "100 mA").typical
        try:
            series = forward_law(low, high).series
        except CircuitError as refusal:
            raise CircuitError(f"part {part.ref}, v_be_high: {refusal}") from refusal
        # The points are given at collector currents; what drops on the way to the junction is the base current.
        found["base_resistance"] = series * float(needed(part, "gain", "", "200").typical ** share)
    saturated = _saturation(part, share)
    if saturated is not None and saturated[1] > 0.0:
        found["collector_resistance"] = saturated[1]
    return found


def _saturation(part: Part, share: float) -> tuple[float, float] | None:
    """Reverse gain and collector resistance where the part gives two saturation points."""
    second = figure(part, "v_ce_sat_high", "V")
    if second is None:
        return None
    forced = typical(part, "forced_gain", "", 20.0)
    low = typical(part, "v_ce_sat", "V", 0.1), typical(part, "saturation_current_at", "A", 10e-3), forced
    current = needed(part, "saturation_current_high", "A", "100 mA").typical
    try:
        return saturation_law(
            low,
            (second.typical, current, typical(part, "forced_gain_high", "", forced)),
            needed(part, "gain", "", "200").typical ** share,
        )
    except CircuitError as refusal:
        raise CircuitError(f"part {part.ref}, v_ce_sat_high: {refusal}") from refusal


def gain_given(part: Part) -> tuple[float, float] | None:
    """The least and the largest collector current in A at which the gain is given; None where none is written."""
    at = figure(part, "gain_current", "A")
    if part.law or at is None:
        return None
    points = points_of(part, "gain_points", ("A", ""), GAIN_EXAMPLE) if "darlington" not in part.kind else None
    currents = [at.typical, *(current for current, _ in points or ())]
    return min(currents), max(currents)
