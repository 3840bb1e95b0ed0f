"""Rows of the catalogue as an engineer would ask for them: every kind of stage, 3 V to 30 V, 1 s to 10 min.

They are the project's own inventions. All of them hold every margin that they are judged by.
"""

from __future__ import annotations

from collections.abc import Mapping

from stagebook.engine.design.document import Design
from stagebook.engine.stages.making import new_design
from stagebook.engine.stages.row import Choice

from ..circuits import Json
from .made import choice

Row = tuple[Choice, ...]
Supply = tuple[str, str, str]
_12V, _24V = ("10.5 V", "12 V", "14.4 V"), ("21 V", "24 V", "28 V")
_BLOCK = {"min": "2R", "nominal": "3R", "max": "10R"}
_STIFF = {"min": "0R1", "nominal": "0R2", "max": "0R5"}
ENTRY, CALL = choice("entry"), choice("contact_no")
LATCH, SNAP = choice("complementary_latch"), choice("schmitt_trigger")
LAMP = choice("darlington_driver", load="none")

ROWS: Mapping[str, tuple[Supply, Row]] = {
    "start_delay": (_12V, (ENTRY, choice("long_timer", time="60 s"), choice("low_side_driver", heard="80 dB"))),
    "delay_10min": (_12V, (ENTRY, choice("long_timer", time="600 s"), choice("low_side_driver"))),
    "lamp_60s": (
        _12V,
        (ENTRY, CALL, choice("debounce"), LATCH, choice("long_timer", mode="reset"), LAMP, choice("lamp", power="2 W")),
    ),
    "edge_siren": (
        _24V,
        (
            ENTRY,
            choice("contact_nc", lead="6 m"),
            choice("differentiator"),
            LATCH,
            choice("long_timer", mode="reset"),
            choice("high_side_driver", current="150 mA"),
        ),
    ),
    "pulse_4_cells": (
        ("4.8 V", "6 V", "6.6 V"),
        (CALL, choice("monostable", time="2 s"), choice("low_side_driver", load="piezo", current="12 mA")),
    ),
    "latch_2_cells": (
        ("2.4 V", "3 V", "3.3 V"),
        (CALL, LATCH, choice("low_side_driver", load="piezo", current="10 mA")),
    ),
    "dark_relay": (
        _12V,
        (ENTRY, choice("light_front_end"), SNAP, choice("bistable"), choice("relay_driver", pick_up="62 %")),
    ),
    "loop_fail_safe": (
        _24V,
        (
            choice("end_of_line_loop"),
            choice("long_timer", time="30 s"),
            LATCH,
            choice(
                "relay_driver",
                coil="1440R",
                rated="24 V",
                mode="fail-safe",
                pick_up="70 %",
                clamp="zener",
                release="20 ms",
            ),
        ),
    ),
    "frost_flasher": (
        _12V,
        (ENTRY, choice("temperature_front_end"), SNAP, choice("astable"), LAMP, choice("lamp", power="1 W")),
    ),
    "water_90s": (
        ("6.5 V", "9 V", "9.6 V"),
        (
            choice("water_front_end"),
            SNAP,
            choice("long_timer", mode="interval", time="90 s"),
            choice("low_side_driver", load="piezo", current="12 mA"),
        ),
    ),
    "backed_up": (
        ("15 V", "15.5 V", "16 V"),
        (choice("battery_backup"), choice("rc_filter"), CALL, choice("bistable"), choice("p_channel_driver")),
    ),
    "quiet_pulse": (
        _12V,
        (
            ENTRY,
            choice("lc_filter"),
            CALL,
            choice("schmitt_trigger", "snap"),
            choice("monostable", time="10 s"),
            choice("mosfet_driver", load="none"),
            choice("piezo"),
        ),
    ),
    "relay_5min": (
        _12V,
        (ENTRY, CALL, LATCH, choice("long_timer", mode="reset", time="300 s"), choice("relay_driver", pick_up="62 %")),
    ),
    "delay_5v": (
        ("4.75 V", "5 V", "5.25 V"),
        (
            choice("contact_nc"),
            choice("debounce"),
            choice("long_timer", time="20 s"),
            choice("low_side_driver", load="none"),
            choice("sounder", current="40 mA"),
        ),
    ),
    "entry_and_exit": (
        _12V,
        (
            ENTRY,
            CALL,
            choice("long_timer", "delay", time="30 s"),
            LATCH,
            choice("long_timer", "run", mode="reset", time="180 s", window="45 %"),
            choice("darlington_driver", current="0.8 A"),
        ),
    ),
    "stairs_lamp": (
        _24V,
        (
            ENTRY,
            choice("contact_no", lead="10 m"),
            choice("schmitt_trigger", "snap"),
            choice("monostable", time="60 s"),
            LAMP,
            choice("lamp", power="8 W"),
        ),
    ),
}


def conditions(name: str) -> Json:
    """Those of the row of this name."""
    supply = ROWS[name][0]
    return {
        "supply": dict(zip(("min", "nominal", "max"), supply, strict=True)),
        "ambient": {"min": "0 C", "nominal": "25 C", "max": "45 C"},
        "source_resistance": _BLOCK if name == "water_90s" else _STIFF,
        "leakage": ["conditioned", "specified"],
    }


def made_row(name: str) -> Design:
    """The design of the row of this name."""
    return new_design(name, "a row of the catalogue", conditions(name), ROWS[name][1])
