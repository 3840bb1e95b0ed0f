"""Bipolar transistors: from datasheet figures or a given transport law to one transport element.

Transport law after Ebers, Moll, Proc. IRE 42 (1954) 1761, with the Early effect (Early, Proc. IRE 40 (1952) 1401).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import constant
from ..primitives.columns import Group
from .curve import points_of
from .figures import figure, needed, typical
from .gain import GainLaw, gain_law
from .kind import FLAG, TEXT, THERMAL, Entry, Kind
from .physics import REFERENCE, doubling, gain_factor, saturation_factor, thermal_voltage
from .points import forward_law, saturation_law

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Bench, Builder, Laws
    from ..primitives.columns import Lanes
    from ..primitives.signals import Signal

BUILT_IN = 0.75  # V, from memory
EMITTER_GRADING, COLLECTOR_GRADING = 0.5, 0.5  # abrupt junctions, textbook value
REVERSE_TRANSIT = 20.0  # times the forward transit time, from memory
RECOMBINATION = 2.0  # ideality of the base current at the low end (Sah, Noyce, Shockley, Proc. IRE 45 (1957) 1228)
BREAKDOWN_SLOPE = 0.05  # V per e-fold of the emitter junction's breakdown, from memory
BREAKDOWN_CURRENT = 10e-6  # A at the breakdown voltage

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


def _own_law(part: Part, build: Builder, ref: str) -> Laws:
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
        laws |= _breakdown(breakdown[0])
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


def _breakdown(volts: float) -> Laws:
    return {
        "emitter_breakdown": lambda lanes: volts,
        "emitter_breakdown_slope": lambda lanes: BREAKDOWN_SLOPE,
        "emitter_breakdown_current": lambda lanes: BREAKDOWN_CURRENT,
    }


def _from_figures(part: Part, build: Builder, ref: str, share: float) -> Laws:
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
    before = drop_current / at_drop * _resistances(part, share).get("base_resistance", 0.0)
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
    collector_c = (
        0.0 if ob is None else at_zero_bias(ob.typical, typical(part, "c_ob_bias", "V", 10.0), COLLECTOR_GRADING)
    )
    emitter_c = 0.0 if ib is None else at_zero_bias(ib.typical, typical(part, "c_ib_bias", "V", 0.5), EMITTER_GRADING)
    c_scale = build.column(
        ref,
        "c_ob",
        1.0,
        1.0 if ob is None else ob.low / ob.typical,
        1.0 if ob is None else ob.high / ob.typical,
    )
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
        "collector_capacitance": lambda lanes: collector_c * lanes[c_scale],
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
        step = typical(part, "i_cbo_doubling", "K", 10.0)
        laws["collector_leakage"] = lambda lanes: lanes[leak_key] * doubling(lanes.ambient, step)
    breakdown = figure(part, "base_emitter_breakdown", "V")
    if breakdown is not None:
        laws |= _breakdown(breakdown.typical)
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


def _own_resistances(part: Part) -> dict[str, float]:
    """Base and collector resistance in ohm that the law gives; nothing where it gives none."""
    found = {}
    for key in ("base_resistance", "collector_resistance"):
        limits = part.law_limits(key, "ohm")
        if limits is not None:
            found[key] = next(v for v in (limits.typical, limits.min, limits.max) if v is not None)
    return found


def _resistances(part: Part, share: float) -> dict[str, float]:
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


@dataclass(frozen=True, slots=True)
class Placed:
    """A transistor that was added: collector and base current, all it turns to heat, and its laws."""

    collector: Signal
    base: Signal
    power: Signal
    laws: Laws


def add_transistor(
    part: Part, build: Builder, ref: str, collector: str, base: str, emitter: str, polarity: int, share: float = 1.0
) -> Placed:
    """Add one transistor of a part; ``ref`` names its columns (a pair has two)."""
    laws = _own_law(part, build, ref) if part.law else _from_figures(part, build, ref, share)
    ohms = _own_resistances(part) if part.law else _resistances(part, share)
    inner = {"collector": collector, "base": base}
    powers = []
    for pin, net in inner.items():
        if ohms.get(f"{pin}_resistance", 0.0) > 0.0:
            inner[pin] = f"{ref}/{pin}"
            handle = build.conductance(net, inner[pin], constant(1.0 / ohms[f"{pin}_resistance"]))
            powers.append(handle.power)
    laws["base_resistance"] = constant(ohms.get("base_resistance", 0.0))
    handle = build.transport(inner["collector"], inner["base"], emitter, polarity, laws)
    power, into_base = handle.power, handle.base_current
    for each in powers:
        power += each
    if "recombination_saturation" in laws:
        ends = (inner["base"], emitter) if polarity > 0 else (emitter, inner["base"])
        recombination = {key: laws[f"recombination_{key}"] for key in ("saturation", "slope")}
        junction = build.junction(*ends, recombination)
        power += junction.power
        into_base += junction.current.scaled(polarity)
    return Placed(handle.current, into_base, power, laws)


def note_laws(bench: Bench, laws: Laws) -> None:
    """Keep gain, base-emitter voltage and leakage of a transistor for the hand formulas of checks.

    The gain is that at the current of its figure, ``gain_at`` that at a collector current, with its fall-off.
    """
    per_gain, saturation, slope = laws["per_forward_gain"], laws["emitter_saturation"], laws["emitter_slope"]
    series, per_knee = laws["base_resistance"], laws.get("per_knee_current", constant(0.0))
    recombination = laws.get("recombination_saturation")

    def forward(lanes: Lanes, current: Floats | float) -> Floats:
        return np.asarray(current * (1.0 + current * np.asarray(per_knee(lanes))))

    def per_gain_at(lanes: Lanes, current: Floats | float) -> Floats:
        falling = np.asarray(per_gain(lanes)) * (1.0 + current * np.asarray(per_knee(lanes)))
        if recombination is not None:
            power = np.asarray(slope(lanes)) / np.asarray(laws["recombination_slope"](lanes))
            rise = (1.0 + forward(lanes, current) / np.asarray(saturation(lanes))) ** power - 1.0
            falling = falling + np.asarray(recombination(lanes)) * rise / np.maximum(current, 1e-15)
        return np.asarray(falling)

    stated = laws.get("gain_current")
    bench.gain = lambda lanes: (
        1.0 / np.asarray(per_gain(lanes) if stated is None else per_gain_at(lanes, stated(lanes)))
    )
    bench.gain_at = lambda lanes, current: 1.0 / per_gain_at(lanes, current)
    bench.base_voltage = lambda lanes, current: (
        np.asarray(slope(lanes)) * np.log1p(forward(lanes, current) / np.asarray(saturation(lanes)))
        + current * per_gain_at(lanes, current) * series(lanes)
    )
    bench.leakage = laws.get("collector_leakage")


def _expand(polarity: int) -> Callable[[Part, Builder], None]:
    def expand(part: Part, build: Builder) -> None:
        placed = add_transistor(
            part, build, part.ref, part.pins["collector"], part.pins["base"], part.pins["emitter"], polarity
        )
        bench = build.bench(part.ref)
        bench.currents["collector"] = placed.collector
        bench.currents["base"] = placed.base
        bench.currents["emitter"] = (placed.collector + placed.base).scaled(-1.0)
        bench.power = placed.power
        note_laws(bench, placed.laws)
        bench.gain_given = gain_given(part)

    return expand


FIELDS = {"class": Entry(TEXT, about="generic class")}
DATA = {
    "gain": Entry("", about="current gain: min at the working current, typical, max"),
    "gain_current": Entry("A", about="collector current of the gain figure, needed beside gain_points"),
    "v_be": Entry("V", about="base-emitter voltage at v_be_current"),
    "v_be_current": Entry("A", about="collector current of the v_be figure"),
    "v_be_high": Entry("V", about="a second point, at v_be_high_current: gives the base resistance"),
    "v_be_high_current": Entry("A", about="collector current of the v_be_high figure"),
    "base_resistance": Entry("ohm", about="instead of a second base-emitter point"),
    "v_ce_sat": Entry("V", about="saturation voltage at forced_gain"),
    "saturation_current_at": Entry("A", about="collector current of the v_ce_sat figure"),
    "forced_gain": Entry("", about="collector over base current of the v_ce_sat figure"),
    "v_ce_sat_high": Entry("V", about="a second point, at saturation_current_high: gives the collector resistance"),
    "saturation_current_high": Entry("A", about="collector current of the v_ce_sat_high figure"),
    "forced_gain_high": Entry("", about="of the v_ce_sat_high figure; that of the first where none is written"),
    "v_ceo": Entry("V", about="rated collector-emitter voltage"),
    "v_ebo": Entry("V", about="rated reverse base-emitter voltage"),
    "i_c_max": Entry("A", about="rated collector current"),
    "i_cm": Entry("A", about="rated peak collector current"),
    "c_ob": Entry("F", about="collector-base capacitance at c_ob_bias"),
    "c_ob_bias": Entry("V", about="reverse voltage of the c_ob figure"),
    "c_ib": Entry("F", about="base-emitter capacitance at c_ib_bias"),
    "c_ib_bias": Entry("V", about="reverse voltage of the c_ib figure"),
    "f_t": Entry("Hz", about="transition frequency at f_t_current"),
    "f_t_current": Entry("A", about="collector current of the f_t figure"),
    "i_cbo": Entry("A", about="collector-base leakage at 25 C"),
    "i_cbo_doubling": Entry("K", about="kelvin per doubling of the leakage"),
    "power": Entry("W", about="rated power at 25 C"),
    **THERMAL,
    "base_emitter_breakdown": Entry("V", about="typical breakdown, not the rating"),
    "early_voltage": Entry("V", about="Early voltage"),
}
GAIN_DATA = {
    "gain_points": Entry(TEXT, about="guaranteed gain at other collector currents, [current, gain] each"),
}
LAW = {
    "saturation_current": Entry("A", needed=True),
    "forward_gain": Entry("", needed=True),
    "reverse_gain": Entry(""),
    "ideality": Entry(""),
    "early_voltage": Entry("V"),
    "base_emitter_capacitance": Entry("F", about="at zero bias"),
    "base_collector_capacitance": Entry("F", about="at zero bias"),
    "forward_transit_time": Entry("s"),
    "reverse_transit_time": Entry("s"),
    "base_emitter_breakdown": Entry("V", about="typical breakdown, not the rating"),
    "knee_current": Entry("A", about="where the gain has fallen to half at high currents"),
    "recombination_current": Entry("A", about="saturation current of the base current at the low end"),
    "recombination_ideality": Entry("", about="2 where none is written"),
    "base_resistance": Entry("ohm"),
    "collector_resistance": Entry("ohm"),
    "collector_junction": Entry(FLAG, about="false: a one-sided law without a collector junction"),
    "thermal_voltage": Entry("V", about="instead of kT/q"),
}
PINS = ("collector", "base", "emitter")
KINDS = tuple(
    Kind(
        name=name,
        letters=("Q",),
        pins=(PINS,),
        paths=(("collector", "emitter"), ("base", "emitter")),
        expand=_expand(polarity),
        fields=FIELDS,
        data={**DATA, **GAIN_DATA},
        law=LAW,
    )
    for name, polarity in (("npn", 1), ("pnp", -1))
)
