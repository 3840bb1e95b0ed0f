"""Generic classes of transistors, common practice written down from memory."""

from __future__ import annotations

from collections.abc import Mapping

from .class_figure import ClassPoints, Figures, at_least, at_most, spread, where

# Why corners keep the typical value.
_SATURATED = "what is above it is ohmic: none at 0.4 of the current"
_BASE_CHARGE = "the base swings by 0.7 V: a fifth of c_ob's charge"
_TRANSIT = "a few ns, where what is timed lasts 1 us and more"
_BROKEN_DOWN = "v_ebo lies below it, and check 7 keeps to v_ebo"
_EARLY = "it bends the current by less than the gain spreads"
_BODY = "it conducts only where a load drives the drain back"
_GATE = "the same oxide: it goes along with the gate's"

_JUNCTION_TO_AIR = "junction to still air"
_DOUBLING = at_least("14.9 K", "along the limits, 25 to 150 C")

_SMALL: Figures = {
    "gain": spread("200", "300", "450", "2 mA, 5 V"),
    "gain_current": where("gain", "2 mA"),
    "v_be": spread("0.58 V", "0.64 V", "0.70 V", "2 mA, 25 C"),
    "v_be_current": where("v_be", "2 mA"),
    "v_ce_sat": spread("0.05 V", "0.1 V", "0.25 V", "10 mA / 0.5 mA", held=_SATURATED),
    "saturation_current_at": where("v_ce_sat", "10 mA"),
    "forced_gain": where("v_ce_sat", "20"),
    "v_ceo": at_most("45 V", "base open, 25 C"),
    "v_ebo": at_most("5 V", "collector open, 25 C"),
    "i_c_max": at_most("100 mA", "lasting, 25 C"),
    "c_ob": spread("3 pF", "3.5 pF", "4.5 pF", "10 V, 1 MHz"),
    "c_ob_bias": where("c_ob", "10 V"),
    "c_ib": spread("8 pF", "10 pF", "12 pF", "0.5 V, 1 MHz", held=_BASE_CHARGE),
    "c_ib_bias": where("c_ib", "0.5 V"),
    "f_t": spread("150 MHz", "200 MHz", "300 MHz", "10 mA, 5 V", held=_TRANSIT),
    "f_t_current": where("f_t", "10 mA"),
    "i_cbo": spread("0.2 nA", "1 nA", "15 nA", "30 V, 25 C"),
    "i_cbo_doubling": _DOUBLING,
    "thermal_resistance": at_most("200 K/W", _JUNCTION_TO_AIR),
    "power": at_most("0.5 W", "still air, 25 C"),
    "base_emitter_breakdown": spread("6 V", "8 V", "9.5 V", "10 uA, 25 C", held=_BROKEN_DOWN),
    "early_voltage": spread("50 V", "80 V", "150 V", "2 mA, 25 C", held=_EARLY),
}
_DRIVER: Figures = {
    **_SMALL,
    "gain": spread("100", "200", "400", "100 mA, 1 V"),
    "gain_current": where("gain", "100 mA"),
    "v_be": spread("0.60 V", "0.66 V", "0.72 V", "10 mA, 25 C"),
    "v_be_current": where("v_be", "10 mA"),
    "v_ce_sat": spread("0.15 V", "0.3 V", "0.7 V", "500 mA / 50 mA", held=_SATURATED),
    "saturation_current_at": where("v_ce_sat", "500 mA"),
    "forced_gain": where("v_ce_sat", "10"),
    "i_c_max": at_most("500 mA", "lasting, 25 C"),
    "c_ob": spread("10 pF", "12 pF", "15 pF", "10 V, 1 MHz"),
    "c_ib": spread("40 pF", "50 pF", "60 pF", "0.5 V, 1 MHz", held=_BASE_CHARGE),
    "f_t": spread("100 MHz", "150 MHz", "200 MHz", "10 mA, 5 V", held=_TRANSIT),
    "i_cbo": spread("1 nA", "5 nA", "100 nA", "30 V, 25 C"),
    "early_voltage": spread("50 V", "80 V", "150 V", "10 mA, 25 C", held=_EARLY),
}
_TWO_AMPERE: Figures = {
    **_DRIVER,
    "gain": spread("40", "100", "250", "1 A, 2 V"),
    "gain_current": where("gain", "1 A"),
    "v_ce_sat": spread("0.1 V", "0.2 V", "0.5 V", "1 A / 0.1 A", held=_SATURATED),
    "saturation_current_at": where("v_ce_sat", "1 A"),
    "v_ceo": at_most("60 V", "base open, 25 C"),
    "i_c_max": at_most("2 A", "lasting, 25 C"),
    "c_ob": spread("20 pF", "30 pF", "40 pF", "10 V, 1 MHz"),
    "f_t": spread("50 MHz", "100 MHz", "150 MHz", "50 mA, 5 V", held=_TRANSIT),
    "f_t_current": where("f_t", "50 mA"),
    "thermal_resistance": at_most("125 K/W", _JUNCTION_TO_AIR),
    "power": at_most("1 W", "still air, 25 C"),
}
_DARLINGTON: Figures = {
    # Those of the driver stand for each of the two transistors, the gain for the pair.
    **_DRIVER,
    "gain": spread("750", "2000", "10000", "3 A, 3 V"),
    "gain_current": where("gain", "3 A"),
    "v_ceo": at_most("80 V", "base open, 25 C"),
    "i_c_max": at_most("8 A", "lasting, 25 C"),
    "first_base_resistor": spread("5 kohm", "8 kohm", "10 kohm", "25 C"),
    "second_base_resistor": spread("100 ohm", "150 ohm", "200 ohm", "25 C"),
    "thermal_resistance": at_most("62 K/W", _JUNCTION_TO_AIR),
    "power": at_most("2 W", "still air, 25 C"),
}
_SMALL_N_CHANNEL: Figures = {
    "threshold": spread("0.8 V", "1.6 V", "2.5 V", "250 uA, 25 C"),
    "resistance_on": spread("0.8 ohm", "1.2 ohm", "2 ohm", "10 V at the gate"),
    "c_iss": spread("30 pF", "40 pF", "50 pF", "25 V, 1 MHz"),
    "c_oss": spread("10 pF", "15 pF", "25 pF", "25 V, 1 MHz", held=_GATE),
    "c_rss": spread("3 pF", "5 pF", "10 pF", "25 V, 1 MHz", held=_GATE),
    "c_bias": where("c_iss", "25 V"),
    "body_diode": spread("0.65 V", "0.75 V", "1.2 V", "100 mA, 25 C", held=_BODY),
    "body_diode_current": where("body_diode", "100 mA"),
    "i_dss": spread("0.1 nA", "1 nA", "1 uA", "60 V, 25 C"),
    "v_dss": at_most("60 V", "gate at source, 25 C"),
    "v_gss": at_most("20 V", "either sign, 25 C"),
    "i_d_max": at_most("300 mA", "lasting, 25 C"),
    "thermal_resistance": at_most("350 K/W", _JUNCTION_TO_AIR),
    "power": at_most("0.35 W", "still air, 25 C"),
}
_P_CHANNEL_SWITCH: Figures = {
    **_SMALL_N_CHANNEL,
    "threshold": spread("2 V", "3 V", "4 V", "250 uA, 25 C"),
    "resistance_on": spread("0.06 ohm", "0.08 ohm", "0.1 ohm", "10 V at the gate"),
    "gate_charge": spread("17 nC", "20 nC", "30 nC", "10 V, 48 V"),
    "gate_drain_charge": spread("6 nC", "8 nC", "12 nC", "48 V, 25 C", held=_GATE),
    "gate_charge_drain": where("gate_charge", "48 V"),
    "c_iss": spread("700 pF", "900 pF", "1.2 nF", "25 V, 1 MHz", held="gate_charge counts instead"),
    "c_oss": spread("200 pF", "300 pF", "400 pF", "25 V, 1 MHz", held=_GATE),
    "c_rss": spread("70 pF", "100 pF", "150 pF", "25 V, 1 MHz", held=_GATE),
    "body_diode": spread("0.7 V", "0.8 V", "1.3 V", "1 A, 25 C", held=_BODY),
    "body_diode_current": where("body_diode", "1 A"),
    "i_d_max": at_most("2 A", "lasting, 25 C"),
    "thermal_resistance": at_most("125 K/W", _JUNCTION_TO_AIR),
    "power": at_most("1 W", "still air, 25 C"),
}

TRANSISTORS: Mapping[str, Mapping[str, Figures]] = {
    "npn": {"small npn": _SMALL, "0.5 A driver npn": _DRIVER},
    "pnp": {"small pnp": _SMALL, "0.5 A driver pnp": _DRIVER, "2 A pnp": _TWO_AMPERE},
    "darlington_npn": {"power Darlington": _DARLINGTON},
    "darlington_pnp": {"power Darlington": _DARLINGTON},
    "mosfet_n": {"small n-channel": _SMALL_N_CHANNEL},
    "mosfet_p": {"p-channel switch": _P_CHANNEL_SWITCH},
}
GAIN_POINTS: Mapping[str, Mapping[str, ClassPoints]] = {
    name: {"gain_points": ClassPoints((("300 mA", "60"),), "least, 25 C")}
    for name in ("0.5 A driver npn", "0.5 A driver pnp")
}
