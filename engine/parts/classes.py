"""Generic classes of parts. All figures are common practice written down from memory.

A figure is one text, (min, typical, max), or these with the test condition. They stand in until the user replaces them
by figures of the part at hand; whatever is made of them says ``memory`` on the screen until then.
"""

from __future__ import annotations

from collections.abc import Mapping

ClassFigure = str | tuple[str, str, str] | tuple[str, str, str, str]
Figures = Mapping[str, ClassFigure]
SOURCE = "memory"
"""Who says the figures of every class."""

_SMALL_TRANSISTOR: Figures = {
    "gain": ("200", "300", "450", "2 mA"),
    "gain_current": "2 mA",
    "v_be": ("0.58 V", "0.64 V", "0.70 V", "2 mA"),
    "v_be_current": "2 mA",
    "v_ce_sat": ("0.1 V", "0.1 V", "0.25 V", "10 mA / 0.5 mA"),
    "saturation_current_at": "10 mA",
    "forced_gain": "20",
    "v_ceo": "45 V",
    "v_ebo": "5 V",
    "i_c_max": "100 mA",
    "c_ob": ("3 pF", "3.5 pF", "4.5 pF", "10 V"),
    "c_ob_bias": "10 V",
    "c_ib": ("8 pF", "10 pF", "12 pF", "0.5 V"),
    "c_ib_bias": "0.5 V",
    "f_t": ("150 MHz", "200 MHz", "300 MHz", "10 mA"),
    "f_t_current": "10 mA",
    "i_cbo": ("0.2 nA", "1 nA", "15 nA", "25 C"),
    "i_cbo_doubling": ("14.9 K", "14.9 K", "14.9 K", "15 nA at 25 C to 5 uA at 150 C"),
    "thermal_resistance": ("200 K/W", "200 K/W", "200 K/W", "junction to ambient"),
    "power": ("0.5 W", "0.5 W", "0.5 W", "25 C"),
    "base_emitter_breakdown": "8 V",
    "early_voltage": "80 V",
}
_DRIVER_TRANSISTOR: Figures = {
    **_SMALL_TRANSISTOR,
    "gain": ("100", "200", "400", "100 mA"),
    "gain_current": "100 mA",
    "v_be": ("0.60 V", "0.66 V", "0.72 V", "10 mA"),
    "v_be_current": "10 mA",
    "v_ce_sat": ("0.3 V", "0.3 V", "0.7 V", "500 mA / 50 mA"),
    "saturation_current_at": "500 mA",
    "forced_gain": "10",
    "i_c_max": "500 mA",
    "c_ob": ("10 pF", "12 pF", "15 pF", "10 V"),
    "c_ib": ("40 pF", "50 pF", "60 pF", "0.5 V"),
    "f_t": ("100 MHz", "150 MHz", "200 MHz", "10 mA"),
    "i_cbo": ("1 nA", "5 nA", "100 nA", "25 C"),
}
_TWO_AMPERE_TRANSISTOR: Figures = {
    **_DRIVER_TRANSISTOR,
    "gain": ("40", "100", "250", "1 A"),
    "gain_current": "1 A",
    "v_ce_sat": ("0.2 V", "0.2 V", "0.5 V", "1 A / 0.1 A"),
    "saturation_current_at": "1 A",
    "v_ceo": "60 V",
    "i_c_max": "2 A",
    "c_ob": ("20 pF", "30 pF", "40 pF", "10 V"),
    "f_t": ("50 MHz", "100 MHz", "150 MHz", "50 mA"),
    "f_t_current": "50 mA",
    "thermal_resistance": ("125 K/W", "125 K/W", "125 K/W", "junction to ambient"),
    "power": ("1 W", "1 W", "1 W", "25 C"),
}
_DARLINGTON: Figures = {
    **_DRIVER_TRANSISTOR,
    "gain": ("750", "2000", "10000", "3 A"),
    "gain_current": "3 A",
    "v_ceo": "80 V",
    "i_c_max": "8 A",
    "first_base_resistor": "8 kohm",
    "second_base_resistor": "150 ohm",
    "thermal_resistance": "62 K/W",
    "power": "2 W",
}
_SMALL_N_CHANNEL: Figures = {
    "threshold": ("0.8 V", "1.6 V", "2.5 V", "250 uA"),
    "resistance_on": ("0.8 ohm", "1.2 ohm", "2 ohm", "10 V at the gate"),
    "c_iss": "40 pF",
    "c_oss": "15 pF",
    "c_rss": "5 pF",
    "c_bias": "25 V",
    "body_diode": "0.75 V",
    "body_diode_current": "100 mA",
    "i_dss": ("0.1 nA", "1 nA", "1 uA", "60 V, 25 C"),
    "v_dss": "60 V",
    "v_gss": "20 V",
    "i_d_max": "300 mA",
    "thermal_resistance": ("350 K/W", "350 K/W", "350 K/W", "junction to ambient"),
    "power": ("0.35 W", "0.35 W", "0.35 W", "25 C"),
}
_P_CHANNEL_SWITCH: Figures = {
    **_SMALL_N_CHANNEL,
    "threshold": ("2 V", "3 V", "4 V", "250 uA"),
    "resistance_on": ("0.06 ohm", "0.08 ohm", "0.1 ohm", "10 V at the gate"),
    "gate_charge": ("20 nC", "20 nC", "30 nC", "10 V, 48 V"),
    "gate_drain_charge": "8 nC",
    "gate_charge_drain": "48 V",
    "c_iss": "900 pF",
    "c_oss": "300 pF",
    "c_rss": "100 pF",
    "body_diode": "0.8 V",
    "body_diode_current": "1 A",
    "i_d_max": "2 A",
    "thermal_resistance": ("125 K/W", "125 K/W", "125 K/W", "junction to ambient"),
    "power": ("1 W", "1 W", "1 W", "25 C"),
}
_CLAMP: Figures = {
    "standoff_current": "5 uA",
    "pulse_power": "600 W",
    "forward_low": "0.7 V",
    "forward_low_current": "10 mA",
    "capacitance": "3 nF",
}
_FILM_RESISTOR: Figures = {"rating": ("0.25 W", "0.25 W", "0.25 W", "up to 70 C")}
_LAMP: Figures = {"cold_ratio": ("10", "12", "14", "hot / cold resistance"), "inrush_time": "20 ms"}
_SIGNAL_DIODE: Figures = {
    "forward_low": "0.60 V",
    "forward_low_current": "1 mA",
    "forward_high": ("0.68 V", "0.72 V", "1 V", "10 mA"),
    "forward_high_current": "10 mA",
    "reverse_current": ("1 nA", "5 nA", "25 nA", "20 V, 25 C"),
    "reverse_doubling": "10 K",
    "capacitance": "4 pF",
    "transit_time": "6 ns",
    "v_rrm": "75 V",
    "i_f_max": "150 mA",
}

Points = tuple[tuple[str, str], ...]
POINTS: Mapping[str, Mapping[str, Points]] = {
    "0.5 A driver npn": {"gain_points": (("300 mA", "60"),)},
    "0.5 A driver pnp": {"gain_points": (("300 mA", "60"),)},
}
"""What a class gives at several points, by the names of classes."""

CLASSES: Mapping[str, Mapping[str, Figures]] = {
    "npn": {"small npn": _SMALL_TRANSISTOR, "0.5 A driver npn": _DRIVER_TRANSISTOR},
    "pnp": {
        "small pnp": _SMALL_TRANSISTOR,
        "0.5 A driver pnp": _DRIVER_TRANSISTOR,
        "2 A pnp": _TWO_AMPERE_TRANSISTOR,
    },
    "darlington_npn": {"power Darlington": _DARLINGTON},
    "darlington_pnp": {"power Darlington": _DARLINGTON},
    "mosfet_n": {"small n-channel": _SMALL_N_CHANNEL},
    "mosfet_p": {"p-channel switch": _P_CHANNEL_SWITCH},
    "diode": {
        "signal diode": _SIGNAL_DIODE,
        "1 A rectifier": {
            **_SIGNAL_DIODE,
            "forward_low": "0.65 V",
            "forward_low_current": "10 mA",
            "forward_high": ("0.90 V", "0.95 V", "1.1 V", "1 A"),
            "forward_high_current": "1 A",
            "reverse_current": ("10 nA", "50 nA", "5 uA", "rated voltage, 25 C"),
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
            "slope_resistance": ("5 ohm", "10 ohm", "20 ohm", "5 mA"),
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
            "reverse_current": ("20 uA", "100 uA", "0.5 mA", "40 V, 25 C"),
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
            "self_discharge": "3 %/month",
        },
    },
    "fuse": {"1 A slow": {"rated_current": "1 A", "melting": "2 A2s", "resistance": "0.1 ohm"}},
    "lamp": {
        "12 V 2 W lamp": {**_LAMP, "current": ("150 mA", "167 mA", "185 mA", "12 V"), "rated_voltage": "12 V"},
        "24 V 10 W lamp": {**_LAMP, "current": ("375 mA", "417 mA", "460 mA", "24 V"), "rated_voltage": "24 V"},
    },
    "thermistor": {"ntc": {"beta": "3950 K"}},
    "light_resistor": {"ldr": {"gamma": "0.7"}},
    "inductor": {"choke": {"inductance": "1 mH", "resistance": "1.5 ohm", "i_max": "0.5 A"}},
    "capacitor": {
        "electrolytic": {"leakage_per_cv": "0.01", "leakage_least": "3 uA", "tolerance": "20 %"},
        "timing capacitor, low drift": {
            "leakage_per_cv": "0.002",
            "leakage_least": "1 uA",
            "drift": ("-5 %", "0 %", "5 %", "over temperature"),
        },
        "film": {"tolerance": "10 %"},
        "ceramic": {},
        "X7R": {"tolerance": "10 %", "drift": ("-50 %", "0 %", "0 %", "0 V .. rated voltage")},
        "C0G": {"tolerance": "5 %"},
    },
    "resistor": {
        "film": {"rating": "0.25 W"},
        "film 1 %": {**_FILM_RESISTOR, "tolerance": "1 %", "tempco": ("-50 ppm/K", "0 ppm/K", "50 ppm/K")},
        "film 5 %": {**_FILM_RESISTOR, "tolerance": "5 %", "tempco": ("-200 ppm/K", "0 ppm/K", "200 ppm/K")},
    },
    "coil": {
        "relay 12 V": {
            "resistance": ("360 ohm", "400 ohm", "440 ohm", "20 C"),
            "inductance": ("0.8 H", "1 H", "1.2 H"),
            "pick_up": ("6 V", "7.8 V", "9 V", "20 C"),
            "drop_out": ("1.2 V", "2.4 V", "4 V", "20 C"),
            "armature_delay": ("3 ms", "5 ms", "8 ms"),
        },
    },
    "contact": {
        "gold contact": {"resistance": ("0.1 ohm", "0.1 ohm", "10 ohm"), "minimum_current": "10 uA"},
        "silver contact": {"resistance": ("0.1 ohm", "0.1 ohm", "10 ohm"), "minimum_current": "1 mA"},
    },
    "sounder": {
        "siren 12 V": {
            "current": ("0.2 A", "0.5 A", "1 A", "12 V"),
            "rated_voltage": "12 V",
            "operating_minimum": "6 V",
            "surge": ("2 A", "2 A", "2 A", "12 V"),
            "surge_time": "30 ms",
        },
    },
    "piezo": {
        "piezo 12 V": {
            "current": ("5 mA", "12 mA", "20 mA", "12 V"),
            "rated_voltage": "12 V",
            "operating_minimum": "3 V",
            "sound_level": ("85 dB", "95 dB", "105 dB", "1 m"),
        },
    },
}
