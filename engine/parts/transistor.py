"""Bipolar transistors: one transport element, its law given or made of datasheet figures."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from ..primitives.builder import constant
from .kind import FLAG, TEXT, THERMAL, Entry, Kind
from .leakage import leakage_entries
from .transistor_figures import gain_given, law_of_figures, resistances
from .transistor_law import given_law, given_resistances

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Bench, Builder, Laws
    from ..primitives.columns import Lanes
    from ..primitives.signals import Signal


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
    laws = given_law(part, build, ref) if part.law else law_of_figures(part, build, ref, share)
    ohms = given_resistances(part) if part.law else resistances(part, share)
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
    **leakage_entries("i_cbo"),
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
