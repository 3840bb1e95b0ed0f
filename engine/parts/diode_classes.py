"""Generic classes of diodes, common practice written down from memory."""

from __future__ import annotations

from collections.abc import Mapping

from .class_figure import Figures, at_least, at_most, spread, where

# Why corners keep the typical value.
_ALONG = "it goes along with forward_low: one law for both"
_SERIES = "a part of forward_high"
_AT_LIMITER = "behind some ohm of the source it takes 0.1 us"

_SIGNAL: Figures = {
    # Diodes of one type: half as much and half more saturation current, 1.8 V_T ln 1.5.
    "forward_low": spread("0.58 V", "0.60 V", "0.62 V", "1 mA, 25 C"),
    "forward_low_current": where("forward_low", "1 mA"),
    "forward_high": spread("0.68 V", "0.72 V", "1 V", "10 mA, 25 C", held=_ALONG),
    "forward_high_current": where("forward_high", "10 mA"),
    "reverse_current": spread("1 nA", "5 nA", "25 nA", "20 V, 25 C"),
    "reverse_doubling": at_least("10 K", "25 to 125 C"),
    "capacitance": at_most("4 pF", "0 V, 1 MHz"),
    "transit_time": at_most("6 ns", "10 mA, 25 C"),
    "v_rrm": at_most("75 V", "25 C"),
    "i_f_max": at_most("150 mA", "lasting, 25 C"),
}
_RECTIFIER: Figures = {
    **_SIGNAL,
    "forward_low": spread("0.60 V", "0.65 V", "0.70 V", "10 mA, 25 C"),
    "forward_low_current": where("forward_low", "10 mA"),
    "forward_high": spread("0.90 V", "0.95 V", "1.1 V", "1 A, 25 C", held=_ALONG),
    "forward_high_current": where("forward_high", "1 A"),
    "reverse_current": spread("10 nA", "50 nA", "5 uA", "rated voltage, 25 C"),
    "capacitance": at_most("15 pF", "0 V, 1 MHz"),
    "transit_time": at_most("3 us", "0.5 A, 25 C"),
    "v_rrm": at_most("100 V", "25 C"),
    "i_f_max": at_most("1 A", "lasting, 75 C"),
}
_ZENER: Figures = {
    **_SIGNAL,
    "test_current": where("slope_resistance", "5 mA"),
    "slope_resistance": spread("5 ohm", "10 ohm", "20 ohm", "5 mA, 1 kHz"),
    "capacitance": at_most("100 pF", "0 V, 1 MHz"),
    "power": at_most("0.5 W", "still air, 25 C"),
}
_SCHOTTKY: Figures = {
    "forward_low": spread("0.22 V", "0.26 V", "0.30 V", "10 mA, 25 C"),
    "forward_low_current": where("forward_low", "10 mA"),
    "forward_high": spread("0.42 V", "0.50 V", "0.55 V", "1 A, 25 C", held=_ALONG),
    "forward_high_current": where("forward_high", "1 A"),
    "series_resistance": spread("80 mohm", "110 mohm", "140 mohm", "1 A, 25 C", held=_SERIES),
    "reverse_current": spread("20 uA", "100 uA", "0.5 mA", "40 V, 25 C"),
    "reverse_doubling": at_least("15 K", "25 to 100 C"),
    "capacitance": at_most("200 pF", "0 V, 1 MHz"),
    "v_rrm": at_most("40 V", "25 C"),
    "i_f_max": at_most("1 A", "lasting, 75 C"),
}
_RED: Figures = {
    "forward_low": spread("1.70 V", "1.80 V", "1.95 V", "1 mA, 25 C"),
    "forward_low_current": where("forward_low", "1 mA"),
    "forward_high": spread("1.8 V", "2.0 V", "2.4 V", "10 mA, 25 C", held=_ALONG),
    "forward_high_current": where("forward_high", "10 mA"),
    "series_resistance": spread("5 ohm", "9 ohm", "15 ohm", "10 mA, 25 C", held=_SERIES),
    "reverse_current": spread("1 nA", "10 nA", "10 uA", "5 V, 25 C"),
    "capacitance": spread("10 pF", "20 pF", "50 pF", "0 V, 1 MHz", held="its resistor charges it in 0.1 us"),
    "band_gap": spread("2.05 V", "2.15 V", "2.25 V", "at 0 K", held="it moves how the drop falls, by 0.3 mV/K"),
    "v_rrm": at_most("5 V", "25 C"),
    "i_f_max": at_most("30 mA", "lasting, 25 C"),
}
_CLAMP: Figures = {
    "standoff_current": at_most("5 uA", "stand-off, 25 C"),
    "pulse_power": at_most("600 W", "1 ms, 25 C"),
    "forward_low": spread("0.65 V", "0.7 V", "0.8 V", "10 mA, 25 C"),
    "forward_low_current": where("forward_low", "10 mA"),
    "capacitance": spread("2 nF", "3 nF", "4 nF", "0 V, 1 MHz", held=_AT_LIMITER),
}

DIODES: Mapping[str, Mapping[str, Figures]] = {
    "diode": {"signal diode": _SIGNAL, "1 A rectifier": _RECTIFIER},
    "zener": {"zener 0.5 W": _ZENER},
    "schottky": {"1 A Schottky": _SCHOTTKY},
    "led": {"red": _RED},
    "clamp": {
        f"{volts} V surge clamp": {**_CLAMP, "value": at_most(f"{volts} V", "stand-off, 25 C")} for volts in (15, 24)
    },
}
