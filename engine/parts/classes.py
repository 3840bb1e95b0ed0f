"""Generic classes of parts. All figures are common practice written down from memory.

They stand in until the user replaces them by figures of the part at hand; whatever is made of them says ``memory`` on
the screen until then.
"""

from __future__ import annotations

from collections.abc import Mapping

from .class_figure import ClassPoints, Figures, at_least, at_most, spread, where
from .diode_classes import DIODES
from .transistor_classes import GAIN_POINTS, TRANSISTORS

# Why corners keep the typical value.
_COLD_CELL = "it goes along with resistance, which corners move"
_CONTACT = "a film gives way at 0.1 V: 10 ohm bear 10 mA (Holm)"

_LIFE = spread("0 %", "0 %", "100 %", "over its life")
_CHARGED_20_C = "charged, 20 C"
_RATED_20_C = "rated voltage, 20 C"


def _lamp(volts: str, low: str, typical: str, high: str) -> Figures:
    return {
        "cold_ratio": spread("10", "12", "14", f"hot at {volts}, 25 C"),
        "inrush_time": spread("15 ms", "20 ms", "30 ms", f"{volts}, from 25 C"),
        "current": spread(low, typical, high, f"{volts}, hot"),
        "rated_voltage": where("current", volts),
    }


def _film(tolerance: str, per_kelvin: str) -> Figures:
    return {
        "rating": at_most("0.25 W", "up to 70 C"),
        "tolerance": at_most(tolerance, "20 C"),
        "tempco": spread(f"-{per_kelvin}", "0 ppm/K", per_kelvin, "-55 to 125 C"),
    }


def _contact(least: str, at: str) -> Figures:
    return {
        "resistance": spread("0.05 ohm", "0.1 ohm", "10 ohm", "at its least current", held=_CONTACT),
        "minimum_current": at_least(least, at),
    }


CLASSES: Mapping[str, Mapping[str, Figures]] = {
    **TRANSISTORS,
    **DIODES,
    "battery": {
        "9 V block": {
            "capacity": spread("400 mAh", "500 mAh", "550 mAh", "10 mA, 20 C"),
            "resistance": spread("1.5 ohm", "2 ohm", "3 ohm", "fresh, 25 C"),
            "aged_resistance": at_most("10 ohm", "worn, 25 C"),
            "cold_resistance": spread("4 ohm", "6 ohm", "9 ohm", "fresh, -20 C", held=_COLD_CELL),
            "age": _LIFE,
        },
        "AA cell": {
            "capacity": spread("2.2 Ah", "2.5 Ah", "2.8 Ah", "25 mA, 20 C"),
            "resistance": spread("0.12 ohm", "0.15 ohm", "0.2 ohm", "fresh, 25 C"),
            "aged_resistance": at_most("0.6 ohm", "worn, 25 C"),
            "cold_resistance": spread("0.35 ohm", "0.5 ohm", "0.7 ohm", "fresh, -20 C", held=_COLD_CELL),
            "age": _LIFE,
        },
        "lead-acid 7 Ah": {
            "capacity": spread("6.5 Ah", "7 Ah", "7.5 Ah", "0.35 A, 20 C"),
            "resistance": spread("25 mohm", "30 mohm", "40 mohm", "charged, 25 C"),
            "aged_resistance": at_most("90 mohm", "worn, 25 C"),
            "cold_resistance": spread("45 mohm", "60 mohm", "80 mohm", "charged, -20 C", held=_COLD_CELL),
            "age": _LIFE,
            "self_discharge": spread("2 %/month", "3 %/month", "4 %/month", _CHARGED_20_C),
        },
    },
    "fuse": {
        "1 A slow": {
            "rated_current": at_most("1 A", "lasting, 25 C"),
            "melting": spread("1.5 A2s", "2 A2s", "3 A2s", "10 A, 25 C"),
            "resistance": spread("80 mohm", "0.1 ohm", "0.13 ohm", "cold, 25 C"),
        }
    },
    "lamp": {
        "12 V 2 W lamp": _lamp("12 V", "150 mA", "167 mA", "185 mA"),
        "24 V 10 W lamp": _lamp("24 V", "375 mA", "417 mA", "460 mA"),
    },
    "thermistor": {"ntc": {"beta": spread("3910 K", "3950 K", "3990 K", "25 and 85 C")}},
    "light_resistor": {"ldr": {"gamma": spread("0.6", "0.7", "0.8", "10 to 100 lx")}},
    "inductor": {
        "choke": {
            "inductance": spread("0.8 mH", "1 mH", "1.2 mH", "1 kHz, no bias"),
            "resistance": spread("1.2 ohm", "1.5 ohm", "1.8 ohm", "20 C"),
            "i_max": at_most("0.5 A", "lasting, 40 C"),
        }
    },
    "capacitor": {
        "electrolytic": {
            "leakage_per_cv": at_most("0.01", _RATED_20_C),
            "leakage_least": at_most("3 uA", _RATED_20_C),
            "tolerance": at_most("20 %", "100 Hz, 20 C"),
        },
        "timing capacitor, low drift": {
            "leakage_per_cv": at_most("0.002", _RATED_20_C),
            "leakage_least": at_most("1 uA", _RATED_20_C),
            "drift": spread("-5 %", "0 %", "5 %", "over temperature"),
        },
        "film": {"tolerance": at_most("10 %", "1 kHz, 20 C")},
        "ceramic": {},
        "X7R": {
            "tolerance": at_most("10 %", "1 kHz, 20 C"),
            "drift": spread("-50 %", "0 %", "0 %", "0 V to rated voltage"),
        },
        "C0G": {"tolerance": at_most("5 %", "1 MHz, 20 C")},
    },
    "resistor": {
        "film": {"rating": at_most("0.25 W", "up to 70 C")},
        "film 1 %": _film("1 %", "50 ppm/K"),
        "film 5 %": _film("5 %", "200 ppm/K"),
    },
    "coil": {
        "relay 12 V": {
            "resistance": spread("360 ohm", "400 ohm", "440 ohm", "20 C"),
            "inductance": spread("0.8 H", "1 H", "1.2 H", "pulled in, 100 Hz"),
            "pick_up": spread("6 V", "7.8 V", "9 V", "20 C"),
            "drop_out": spread("1.2 V", "2.4 V", "4 V", "20 C"),
            "armature_delay": spread("3 ms", "5 ms", "8 ms", "12 V, 20 C"),
        },
    },
    "contact": {
        "gold contact": _contact("10 uA", "10 mV or more"),
        "silver contact": _contact("1 mA", "6 V or more"),
    },
    "sounder": {
        "siren 12 V": {
            "current": spread("0.2 A", "0.5 A", "1 A", "12 V, 25 C"),
            "rated_voltage": where("current", "12 V"),
            "operating_minimum": at_most("6 V", "-10 to 50 C"),
            "surge": at_most("2 A", "12 V, at rest"),
            "surge_time": spread("20 ms", "30 ms", "50 ms", "12 V, at rest"),
        },
    },
    "piezo": {
        "piezo 12 V": {
            "current": spread("5 mA", "12 mA", "20 mA", "12 V, 25 C"),
            "rated_voltage": where("current", "12 V"),
            "operating_minimum": at_most("3 V", "-10 to 50 C"),
            "sound_level": spread("85 dB", "95 dB", "105 dB", "12 V, 1 m"),
        },
    },
}
POINTS: Mapping[str, Mapping[str, ClassPoints]] = {
    **GAIN_POINTS,
    "9 V block": {
        "voltage": ClassPoints(
            (("0 %", "6 V"), ("10 %", "7 V"), ("50 %", "8.1 V"), ("90 %", "9 V"), ("100 %", "9.5 V")), "no load, 20 C"
        )
    },
    "AA cell": {
        "voltage": ClassPoints(
            (("0 %", "0.9 V"), ("10 %", "1.1 V"), ("50 %", "1.25 V"), ("90 %", "1.45 V"), ("100 %", "1.58 V")),
            "no load, 20 C",
        )
    },
    "lead-acid 7 Ah": {
        "voltage": ClassPoints(
            (("0 %", "11.6 V"), ("25 %", "12 V"), ("50 %", "12.3 V"), ("75 %", "12.5 V"), ("100 %", "12.8 V")),
            "at rest, 20 C",
        )
    },
}
"""What a class gives at several points, by the names of classes."""


def is_condition(kind: str, key: str) -> bool:
    """Whether a datum of a kind is the test condition of another one."""
    return any(key in figures and figures[key].of is not None for figures in CLASSES.get(kind, {}).values())
