"""Generic classes of parts. All figures are common practice written down from memory: (min, typical, max) or one text.

They stand in until the user replaces them by figures of the part at hand; whatever is made of them says ``class``.
"""

from __future__ import annotations

from collections.abc import Mapping

Figures = Mapping[str, str | tuple[str, str, str]]

_SMALL_TRANSISTOR: Figures = {
    "gain": ("200", "300", "450"),
    "v_be": ("0.58 V", "0.64 V", "0.70 V"),
    "v_be_current": "2 mA",
    "v_ce_sat": ("0.1 V", "0.1 V", "0.25 V"),
    "saturation_current_at": "10 mA",
    "forced_gain": "20",
    "v_ceo": "45 V",
    "v_ebo": "5 V",
    "i_c_max": "100 mA",
    "c_ob": ("3 pF", "3.5 pF", "4.5 pF"),
    "c_ob_bias": "10 V",
    "c_ib": ("8 pF", "10 pF", "12 pF"),
    "c_ib_bias": "0.5 V",
    "f_t": "200 MHz",
    "f_t_current": "10 mA",
    "i_cbo": ("0.2 nA", "1 nA", "15 nA"),
    "i_cbo_doubling": "14.9 K",
    "thermal_resistance": "200 K/W",
    "power": "0.5 W",
    "base_emitter_breakdown": "8 V",
    "early_voltage": "80 V",
}
_DRIVER_TRANSISTOR: Figures = {
    **_SMALL_TRANSISTOR,
    "gain": ("60", "160", "400"),
    "v_be": ("0.60 V", "0.66 V", "0.72 V"),
    "v_be_current": "10 mA",
    "v_ce_sat": ("0.3 V", "0.3 V", "0.7 V"),
    "saturation_current_at": "500 mA",
    "forced_gain": "10",
    "i_c_max": "500 mA",
    "c_ob": ("10 pF", "12 pF", "15 pF"),
    "c_ib": ("40 pF", "50 pF", "60 pF"),
    "f_t": "150 MHz",
    "i_cbo": ("1 nA", "5 nA", "100 nA"),
}
_DARLINGTON: Figures = {
    **_DRIVER_TRANSISTOR,
    "gain": ("750", "2000", "10000"),
    "v_ceo": "80 V",
    "i_c_max": "8 A",
    "first_base_resistor": "8 kohm",
    "second_base_resistor": "150 ohm",
    "thermal_resistance": "62 K/W",
    "power": "2 W",
}
_CLAMP: Figures = {
    "standoff_current": "5 uA",
    "pulse_power": "600 W",
    "forward_low": "0.7 V",
    "forward_low_current": "10 mA",
    "capacitance": "3 nF",
}
_SIGNAL_DIODE: Figures = {
    "forward_low": "0.60 V",
    "forward_low_current": "1 mA",
    "forward_high": "0.72 V",
    "forward_high_current": "10 mA",
    "reverse_current": ("1 nA", "5 nA", "25 nA"),
    "reverse_doubling": "10 K",
    "capacitance": "4 pF",
    "transit_time": "6 ns",
    "v_rrm": "75 V",
    "i_f_max": "150 mA",
}

CLASSES: Mapping[str, Mapping[str, Figures]] = {
    "npn": {"small npn": _SMALL_TRANSISTOR, "0.5 A driver npn": _DRIVER_TRANSISTOR},
    "pnp": {"small pnp": _SMALL_TRANSISTOR, "0.5 A driver pnp": _DRIVER_TRANSISTOR},
    "darlington_npn": {"power Darlington": _DARLINGTON},
    "darlington_pnp": {"power Darlington": _DARLINGTON},
    "diode": {
        "signal diode": _SIGNAL_DIODE,
        "1 A rectifier": {
            **_SIGNAL_DIODE,
            "forward_low": "0.65 V",
            "forward_low_current": "10 mA",
            "forward_high": "0.95 V",
            "forward_high_current": "1 A",
            "reverse_current": ("10 nA", "50 nA", "5 uA"),
            "capacitance": "15 pF",
            "transit_time": "3 us",
            "v_rrm": "100 V",
            "i_f_max": "1 A",
        },
    },
    "zener": {
        "zener 0.5 W": {
            **_SIGNAL_DIODE,
            "test_current": "5 mA",
            "slope_resistance": ("5 ohm", "10 ohm", "20 ohm"),
            "capacitance": "100 pF",
            "power": "0.5 W",
        }
    },
    "schottky": {
        "1 A Schottky": {
            "forward_low": "0.26 V",
            "forward_low_current": "10 mA",
            "forward_high": "0.50 V",
            "forward_high_current": "1 A",
            "series_resistance": "110 mohm",
            "reverse_current": ("20 uA", "100 uA", "0.5 mA"),
            "reverse_doubling": "15 K",
            "capacitance": "200 pF",
            "v_rrm": "40 V",
            "i_f_max": "1 A",
        }
    },
    "led": {
        "red": {
            "forward_low": "1.80 V",
            "forward_low_current": "1 mA",
            "forward_high": "2.0 V",
            "forward_high_current": "10 mA",
            "series_resistance": "9 ohm",
            "reverse_current": "10 nA",
            "capacitance": "20 pF",
            "band_gap": "2.15 V",
            "v_rrm": "5 V",
            "i_f_max": "30 mA",
        }
    },
    "clamp": {"15 V surge clamp": {**_CLAMP, "value": "15 V"}, "24 V surge clamp": {**_CLAMP, "value": "24 V"}},
    "battery": {
        "9 V block": {
            "capacity": "500 mAh",
            "resistance": "2 ohm",
            "aged_resistance": "10 ohm",
            "cold_resistance": "6 ohm",
            "age": ("0 %", "0 %", "100 %"),
        },
        "AA cell": {
            "capacity": "2.5 Ah",
            "resistance": "0.15 ohm",
            "aged_resistance": "0.6 ohm",
            "cold_resistance": "0.5 ohm",
            "age": ("0 %", "0 %", "100 %"),
        },
        "lead-acid 7 Ah": {
            "capacity": "7 Ah",
            "resistance": "30 mohm",
            "aged_resistance": "90 mohm",
            "cold_resistance": "60 mohm",
            "age": ("0 %", "0 %", "100 %"),
        },
    },
    "thermistor": {"ntc": {"beta": "3950 K"}},
    "light_resistor": {"ldr": {"gamma": "0.7"}},
    "inductor": {"choke": {"inductance": "1 mH", "resistance": "1.5 ohm", "i_max": "0.5 A"}},
    "capacitor": {
        "electrolytic": {"leakage_per_cv": "0.01", "leakage_least": "3 uA", "tolerance": "20 %"},
        "timing capacitor, low drift": {
            "leakage_per_cv": "0.002",
            "leakage_least": "1 uA",
            "drift": ("-5 %", "0 %", "5 %"),
        },
        "film": {},
        "ceramic": {},
    },
    "resistor": {"film": {"rating": "0.25 W"}},
}
