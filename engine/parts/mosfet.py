"""Field-effect transistors with an insulated gate: a channel, the body diode across it, and the charges of the gate.

The channel is the square law of Shichman and Hodges (IEEE J. Solid-State Circuits SC-3 (1968) 285). All figures are
written positive, for both polarities. The threshold and the on-resistance each vary on their own; the transconductance
is what gives the on-resistance in every lane. With temperature the threshold falls and the mobility goes as T^-1.5
(Vadasz, Grove, IEEE Trans. Electron Devices ED-13 (1966) 863; the coefficients are from memory), at the temperature of
the surroundings: what the part heats itself is not fed back.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from ..errors import CircuitError
from ..primitives.builder import constant
from .figures import figure, needed, typical
from .kind import TEXT, THERMAL, Entry, Kind
from .leakage import kelvin_per_doubling, leakage_entries
from .physics import REFERENCE, ZERO_CELSIUS, doubling, saturation_factor, saturation_from, thermal_voltage

if TYPE_CHECKING:
    from ..design.document import Part
    from ..kernel.layout import Floats
    from ..primitives.builder import Builder, Law, Laws
    from ..primitives.columns import Lanes

MOBILITY = 1.5  # falls as this power of the absolute temperature
THRESHOLD_FALL = 2e-3  # V/K
THRESHOLD_CURRENT = 250e-6  # A at which a threshold is measured, gate joined to drain; common practice, from memory
GATE_VOLTAGE = 10.0  # V of an on-resistance where none is written; common practice, from memory
BODY_DROP, BODY_CURRENT = 0.75, 0.1  # V, A of a body diode where none is written, from memory
GRADING, BUILT_IN = 0.5, 0.75  # abrupt junction, textbook value; V, from memory
BETWEEN = ("gate_source", "gate_drain", "drain_source")
BREAKDOWN_SLOPE, BREAKDOWN_CURRENT = 0.2, 250e-6  # V per e-fold, A at the breakdown voltage, from memory
ROUNDS = 40


def channel_of(
    threshold: Floats, resistance: Floats, gate: float, drain_current: float = 0.0, measured: float = THRESHOLD_CURRENT
) -> tuple[Floats, Floats]:
    """V_T in V and K in A/V2 of the square law from figures at 25 C, lane by lane.

    ``resistance`` is v_DS / i_D at gate voltage ``gate`` and ``drain_current`` (0: at a small v_DS): K [(v_GS - V_T) -
    v_DS/2] = 1/R. ``threshold`` is v_GS of the current ``measured`` with the gate joined to the drain, which lies
    sqrt(2 i/K) above V_T. NaN where no such channel conducts.
    """
    across = drain_current * resistance
    level = np.asarray(threshold, dtype=float)
    for _ in range(ROUNDS):
        lift = gate - level - 0.5 * across
        k = 1.0 / (resistance * np.where((lift > 0.0) & (gate - level >= across), lift, np.nan))
        level = threshold - np.sqrt(2.0 * measured / k)
    return level, k


def gate_capacitances(part: Part) -> dict[str, float]:
    """C_GS, C_GD, C_DS in farad, the last at 0 V; nothing where neither charges nor capacitances are given.

    From charges (linear capacitances that take as much): C_GD = Q_GD / V_DD, C_GS + C_GD = (Q_G - Q_GD) / V_G: turning
    on the gate takes Q_GD while the drain falls by V_DD and the rest while it rises itself by V_G. From capacitances at
    a drain voltage: C_GD = C_rss, C_GS = C_iss - C_rss; a capacitance at 25 V misses most of the charge at low voltage,
    so that charges come first. C_DS = C_oss - C_rss, brought to 0 V by the depletion law.
    """
    found = dict.fromkeys(BETWEEN, 0.0)
    total, miller = figure(part, "gate_charge", "C"), figure(part, "gate_drain_charge", "C")
    rss = typical(part, "c_rss", "F", 0.0)
    if total is not None and miller is not None:
        found["gate_drain"] = miller.typical / needed(part, "gate_charge_drain", "V", "30 V").typical
        both = (total.typical - miller.typical) / typical(part, "gate_charge_voltage", "V", GATE_VOLTAGE)
        found["gate_source"] = both - found["gate_drain"]
        if found["gate_source"] < 0.0:
            raise CircuitError(f"part {part.ref}, gate_charge: too little beside gate_drain_charge; write a larger one")
    else:
        iss = typical(part, "c_iss", "F", rss)
        if iss < rss:
            raise CircuitError(f"part {part.ref}, c_iss: it must not lie below c_rss; write a larger one")
        found["gate_drain"], found["gate_source"] = rss, iss - rss
    oss = typical(part, "c_oss", "F", rss)
    if oss < rss:
        raise CircuitError(f"part {part.ref}, c_oss: it must not lie below c_rss; write a larger one")
    found["drain_source"] = (oss - rss) * (1.0 + typical(part, "c_bias", "V", 25.0) / BUILT_IN) ** GRADING
    return found


def _gate(part: Part, build: Builder) -> Law:
    """How far the capacitances of the gate lie from the typical ones: all are those of one oxide."""
    key, unit = ("gate_charge", "C") if figure(part, "gate_drain_charge", "C") is not None else ("c_iss", "F")
    found = figure(part, key, unit)
    if found is None or found.typical == 0.0:
        return constant(1.0)
    column = build.column(part.ref, key, *found.limits)
    return lambda lanes: lanes[column] / found.typical


def _scaled(farad: float, scale: Law) -> Law:
    return lambda lanes: farad * np.asarray(scale(lanes))


def _own(part: Part, key: str, unit: str) -> float | None:
    found = part.law_limits(key, unit)
    return None if found is None else next(v for v in (found.typical, found.min, found.max) if v is not None)


def _own_law(part: Part, build: Builder) -> tuple[Laws, Laws | None, dict[str, float]]:
    """The law that the document gives directly: nothing is added to it."""
    for key, example in (("threshold", "2 V"), ("transconductance", "0.5 A/V2")):
        if key not in part.law:
            raise CircuitError(f'part {part.ref}, law {key}: missing; write it like "{key}": "{example}"')
    threshold = build.column(part.ref, "threshold", _own(part, "threshold", "V") or 0.0)
    k = build.column(part.ref, "transconductance", _own(part, "transconductance", "A/V2") or 0.0)
    early = _own(part, "early_voltage", "V")
    channel: Laws = {
        "threshold": lambda lanes: lanes[threshold],
        "transconductance": lambda lanes: lanes[k],
        "modulation": constant(0.0 if early is None else 1.0 / early),
    }
    farads = {key: _own(part, f"{key}_capacitance", "F") or 0.0 for key in BETWEEN}
    saturation = _own(part, "body_saturation_current", "A")
    if saturation is None:
        return channel, None, farads
    ideality = _own(part, "body_ideality", "") or 1.0
    return channel, _body(constant(saturation), ideality, farads.pop("drain_source")), farads


def _body(saturation: Law, ideality: float, farads: float) -> Laws:
    return {
        "saturation": lambda lanes: np.asarray(saturation(lanes)) * saturation_factor(lanes.ambient, ideality),
        "slope": lambda lanes: ideality * thermal_voltage(lanes.ambient),
        "capacitance": constant(farads),
        "potential": constant(BUILT_IN),
        "grading": constant(GRADING),
    }


def _from_figures(part: Part, build: Builder) -> tuple[Laws, Laws | None, dict[str, float]]:
    threshold, resistance = needed(part, "threshold", "V", "2 V"), needed(part, "resistance_on", "ohm", "2 ohm")
    gate = typical(part, "resistance_on_gate", "V", GATE_VOLTAGE)
    current = typical(part, "resistance_on_current", "A", 0.0)
    measured = typical(part, "threshold_current", "A", THRESHOLD_CURRENT)
    worst = channel_of(np.array([threshold.high]), np.array([resistance.high]), gate, current, measured)
    if not np.isfinite(worst).all():
        raise CircuitError(
            f"part {part.ref}, resistance_on: {gate:g} V at the gate do not switch on a channel of threshold "
            f"{threshold.high:g} V at this current; write the gate voltage of the figure as resistance_on_gate"
        )
    volts = build.column(part.ref, "threshold", *threshold.limits)
    ohms = build.column(part.ref, "resistance_on", *resistance.limits, logarithmic=True)
    fall = typical(part, "threshold_tempco", "V/K", -THRESHOLD_FALL)
    early = figure(part, "early_voltage", "V")

    def at_reference(lanes: Lanes) -> tuple[Floats, Floats]:
        return channel_of(lanes[volts], lanes[ohms], gate, current, measured)

    def mobility(lanes: Lanes) -> Floats:
        return np.asarray(((lanes.ambient + ZERO_CELSIUS) / (REFERENCE + ZERO_CELSIUS)) ** -MOBILITY)

    channel: Laws = {
        "threshold": lambda lanes: at_reference(lanes)[0] + fall * (lanes.ambient - REFERENCE),
        "transconductance": lambda lanes: at_reference(lanes)[1] * mobility(lanes),
        "modulation": constant(0.0 if early is None else 1.0 / early.typical),
    }
    farads = gate_capacitances(part)
    drop = typical(part, "body_diode", "V", BODY_DROP), typical(part, "body_diode_current", "A", BODY_CURRENT)
    body = _body(constant(saturation_from(*drop)), 1.0, farads.pop("drain_source"))
    leak = figure(part, "i_dss", "A")
    if leak is not None:
        key = build.column(part.ref, "i_dss", *leak.limits, logarithmic=True)
        step = kelvin_per_doubling(part, "i_dss", leak)
        body["leakage"] = lambda lanes: lanes[key] * doubling(lanes.ambient, step)
    breakdown = figure(part, "drain_source_breakdown", "V")
    if breakdown is not None:
        body |= {
            "breakdown": constant(breakdown.typical),
            "breakdown_slope": constant(BREAKDOWN_SLOPE),
            "breakdown_current": constant(BREAKDOWN_CURRENT),
        }
    return channel, body, farads


def _expand(polarity: int) -> Callable[[Part, Builder], None]:
    def expand(part: Part, build: Builder) -> None:
        drain, gate, source = (part.pins[pin] for pin in PINS)
        laws, body, farads = _own_law(part, build) if part.law else _from_figures(part, build)
        handle = build.channel(drain, gate, source, polarity, laws)
        current, power = handle.current, handle.power
        if body is not None:
            diode = build.junction(*((source, drain) if polarity > 0 else (drain, source)), body)
            current += diode.current.scaled(-polarity)
            power += diode.power
        gate_scale = constant(1.0) if part.law else _gate(part, build)
        for between, farad in farads.items():
            if farad > 0.0:
                one, other = between.split("_")
                build.capacitance(part.pins[one], part.pins[other], _scaled(farad, gate_scale))
        bench = build.bench(part.ref)
        bench.currents["drain"] = current
        bench.currents["source"] = current.scaled(-1.0)
        bench.power = power

        def lets_through(lanes: Lanes, gate_source: Floats) -> Floats:
            above = np.maximum(0.0, gate_source - laws["threshold"](lanes))
            return np.asarray(0.5 * laws["transconductance"](lanes) * above**2)

        bench.lets_through = lets_through

    return expand


PINS = ("drain", "gate", "source")
FIELDS = {"class": Entry(TEXT, about="generic class")}
DATA = {
    "threshold": Entry("V", about="gate voltage at threshold_current, gate joined to drain"),
    "threshold_current": Entry("A", about="drain current of the threshold; 250 uA where none is written"),
    "threshold_tempco": Entry("V/K", about="-2 mV/K where none is written"),
    "resistance_on": Entry("ohm", about="drain to source at resistance_on_gate"),
    "resistance_on_gate": Entry("V", about="gate voltage of the resistance_on figure; 10 V where none is written"),
    "resistance_on_current": Entry("A", about="drain current of the resistance_on figure"),
    "early_voltage": Entry("V", about="how flat the saturated current is; quite flat where none is written"),
    "gate_charge": Entry("C", about="in all, up to gate_charge_voltage"),
    "gate_charge_voltage": Entry("V", about="10 V where none is written"),
    "gate_drain_charge": Entry("C", about="the part of it that the falling drain takes"),
    "gate_charge_drain": Entry("V", about="drain voltage of the charge figures"),
    "c_iss": Entry("F", about="gate to the rest at c_bias; the charges count where they are written too"),
    "c_oss": Entry("F", about="drain to the rest at c_bias"),
    "c_rss": Entry("F", about="gate to drain at c_bias"),
    "c_bias": Entry("V", about="drain voltage of the capacitances; 25 V where none is written"),
    "body_diode": Entry("V", about="forward voltage at body_diode_current"),
    "body_diode_current": Entry("A"),
    "i_dss": Entry("A", about="leakage of the channel that is off, at 25 C"),
    **leakage_entries("i_dss"),
    "drain_source_breakdown": Entry("V", about="typical breakdown, not the rating"),
    "v_dss": Entry("V", about="rated drain-source voltage"),
    "v_gss": Entry("V", about="rated gate-source voltage, of either sign"),
    "i_d_max": Entry("A", about="rated drain current"),
    "power": Entry("W", about="rated power at 25 C"),
    **THERMAL,
}
LAW = {
    "threshold": Entry("V", needed=True),
    "transconductance": Entry("A/V2", needed=True, about="K of the square law i = K/2 (v_GS - V_T)^2"),
    "early_voltage": Entry("V"),
    "gate_source_capacitance": Entry("F"),
    "gate_drain_capacitance": Entry("F"),
    "drain_source_capacitance": Entry("F", about="with a body diode its depletion capacitance at zero bias"),
    "body_saturation_current": Entry("A", about="no body diode where none is written"),
    "body_ideality": Entry(""),
}
KINDS = tuple(
    Kind(
        name=name,
        letters=("Q", "T"),
        pins=(PINS,),
        paths=(("drain", "source"),),
        expand=_expand(polarity),
        fields=FIELDS,
        data=DATA,
        law=LAW,
    )
    for name, polarity in (("mosfet_n", 1), ("mosfet_p", -1))
)
